"""People, for the admin: accounts, invitations, farms given; and the record of changes."""

from datetime import UTC, datetime
from typing import Annotated, Any

from fastapi import APIRouter, Form, HTTPException, Query, Request, Response
from fastapi.responses import RedirectResponse

from app.storage import audit as store_audit
from app.storage import pages as store_pages
from app.storage import people as store
from app.storage.database import Database
from app.storage.tables_people import Account
from app.web.access import AsViewer
from app.web.audit_view import audit_rows
from app.web.needs import AsDatabase, AsNumber, Clean
from app.web.render import page
from app.workflows import people
from app.workflows.people import PeopleError, Person

router = APIRouter()
Text = Annotated[Clean, Form(max_length=200)]
Farms = Annotated[list[Clean], Form(max_length=20_000)]
NO_ONE = "There is no such account."


@router.get("/people")
def everyone(request: Request, db: AsDatabase) -> Response:
    """Every account, and the form that invites."""
    return _everyone(request, db)


def _everyone(
    request: Request, db: Database, error: str = "", said: str = "", typed: Person | None = None
) -> Response:
    with db.read() as session:
        rows = store.accounts(session)
        farms = store_pages.farms(session)
        members = store.members(session)
    return page(
        request,
        "pages/people.html",
        422 if error else 200,
        rows=rows,
        members=members,
        farms=farms,
        mail=request.app.state.settings.mail,
        typed=typed or Person("", "", "grower"),
        error=error,
        said=said,
    )


@router.post("/people")
def invite(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    address: Text = "",
    name: Text = "",
    role: Text = "",
    language: Text = "en",
    farm: Farms = [],  # noqa: B006 (a form without the field)
) -> Response:
    """Open an account and send its one-time link."""
    person = Person(address, name, role, people.farms_chosen(farm), language)
    try:
        with db.write() as session:
            account = people.add_account(session, person, viewer.who)
            secret = people.make_link(session, account, "invite", datetime.now(UTC))
            session.flush()
            session.expunge(account)
    except PeopleError as error:
        return _everyone(request, db, str(error), typed=person)
    return _posted(request, db, account, "invite", secret, viewer.who)


def _posted(
    request: Request, db: Database, account: Account, purpose: str, secret: str, who: str
) -> Response:
    try:
        went = people.post_link(db, request.app.state.settings, account, purpose, secret, who)
    except PeopleError as error:
        return _everyone(request, db, f"{error} The account stands; send the link again later.")
    return _everyone(request, db, said=f"The link for {account.name} was {went}.")


@router.get("/people/{number}")
def person(request: Request, db: AsDatabase, number: AsNumber) -> Response:
    """One account."""
    return _person(request, db, number)


def _person(request: Request, db: Database, number: int, error: str = "") -> Response:
    with db.read() as session:
        account = session.get(Account, number)
        if account is None:
            raise HTTPException(404, NO_ONE)
        given = store.farms_of(session, number)
        farms = store_pages.farms(session)
        sign_ins = store.sign_ins(session, number, datetime.now(UTC))
        tokens = store.tokens(session, number)
    return page(
        request,
        "pages/person.html",
        422 if error else 200,
        account=account,
        given=given,
        farms=farms,
        sign_ins=sign_ins,
        tokens=tokens,
        error=error,
    )


@router.post("/people/{number}")
def change(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    number: AsNumber,
    name: Text = "",
    role: Text = "",
    language: Text = "en",
    farm: Farms = [],  # noqa: B006 (a form without the field)
) -> Response:
    """Change name, role, language and farms."""

    def work(session: Any, account: Account) -> None:
        given = Person(account.address, name, role, people.farms_chosen(farm), language)
        people.change_account(session, account, given, viewer.who)

    return _changed(request, db, number, work)


@router.post("/people/{number}/stop")
def stop(request: Request, db: AsDatabase, viewer: AsViewer, number: AsNumber) -> Response:
    """Stop an account, everywhere and at once."""
    return _changed(
        request, db, number, lambda s, a: people.stop_account(s, a, viewer.who, stop=True)
    )


@router.post("/people/{number}/open")
def open_again(request: Request, db: AsDatabase, viewer: AsViewer, number: AsNumber) -> Response:
    """Open a stopped account again."""
    return _changed(
        request, db, number, lambda s, a: people.stop_account(s, a, viewer.who, stop=False)
    )


def _changed(request: Request, db: Database, number: int, work: Any) -> Response:
    try:
        with db.write() as session:
            account = session.get(Account, number)
            if account is None:
                raise HTTPException(404, NO_ONE)
            work(session, account)
    except PeopleError as error:
        return _person(request, db, number, str(error))
    return RedirectResponse(f"/people/{number}", status_code=303)


@router.post("/people/{number}/link")
def link(request: Request, db: AsDatabase, viewer: AsViewer, number: AsNumber) -> Response:
    """Send a new one-time link; the ones before no longer work."""
    with db.write() as session:
        account = session.get(Account, number)
        if account is None or account.stopped is not None:
            raise HTTPException(404, NO_ONE)
        purpose = "invite" if account.password is None else "reset"
        secret = people.make_link(session, account, purpose, datetime.now(UTC))
        session.flush()
        session.expunge(account)
    return _posted(request, db, account, purpose, secret, viewer.who)


@router.get("/audit")
def audit(
    request: Request, db: AsDatabase, before: Annotated[str, Query(max_length=40)] = ""
) -> Response:
    """Who changed what, before and after, newest first."""
    try:
        until = datetime.fromisoformat(before) if before else None
    except ValueError:
        until = None
    if until is not None and until.tzinfo is None:
        until = until.replace(tzinfo=UTC)
    with db.read() as session:
        found = store_audit.changes(session, until)
    return page(
        request,
        "pages/audit.html",
        rows=audit_rows(found),
        last=found[-1].at if len(found) == store_audit.MOST else None,
    )
