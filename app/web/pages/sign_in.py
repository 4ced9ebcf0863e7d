"""Signing in and out, and choosing a password by a one-time link."""

from datetime import UTC, datetime
from typing import Annotated

from fastapi import APIRouter, BackgroundTasks, Form, Query, Request, Response
from fastapi.responses import RedirectResponse

from app.storage import people as store
from app.web.access import AsViewer, set_sign_in
from app.web.needs import AsDatabase, Clean
from app.web.render import page
from app.workflows import people
from app.workflows.passwords import PasswordError
from app.workflows.sign_in import SignInError, open_sign_in, sign_in

router = APIRouter()
Short = Annotated[Clean, Form(max_length=400)]


def own_path(to: str) -> str:
    """A path of these pages to go on to; what leads elsewhere leads to the Rounds."""
    plain = to.startswith("/") and not to.startswith(("//", "/\\")) and to.isprintable()
    return to if plain else "/"


@router.get("/sign-in")
def door(request: Request, to: Annotated[str, Query(max_length=400)] = "/") -> Response:
    """The form."""
    return page(request, "pages/sign_in.html", to=own_path(to), address="", error="")


@router.post("/sign-in")
def enter(
    request: Request,
    db: AsDatabase,
    address: Short = "",
    password: Short = "",
    code: Short = "",
    to: Short = "/",
) -> Response:
    """Sign in, or say that something was not right."""
    settings = request.app.state.settings
    client = request.client.host if request.client else "unknown"
    browser = request.headers.get("user-agent", "")
    now = datetime.now(UTC)
    try:
        secret = sign_in(db, settings, address, password, code, browser, client, now)
    except SignInError as error:
        return page(
            request, "pages/sign_in.html", 422, to=own_path(to), address=address, error=str(error)
        )
    answer = RedirectResponse(own_path(to), status_code=303)
    set_sign_in(answer, secret, settings.mail.base_url)
    return answer


@router.post("/sign-out")
def leave(request: Request, db: AsDatabase, viewer: AsViewer) -> Response:
    """End this browser's sign-in."""
    if viewer.account is not None and viewer.sign_in is not None:
        with db.write() as session:
            store.end_sign_ins(session, viewer.account, one=viewer.sign_in)
    answer = RedirectResponse("/sign-in", status_code=303)
    set_sign_in(answer, None, request.app.state.settings.mail.base_url)
    return answer


@router.get("/forgot")
def forgot(request: Request) -> Response:
    """Ask for a link to choose a new password."""
    return page(request, "pages/forgot.html", asked="")


@router.post("/forgot")
def ask(request: Request, db: AsDatabase, later: BackgroundTasks, address: Short = "") -> Response:
    """The same answer whether or not there is such an account, and as quick."""
    later.add_task(ask_quietly, request, address)
    return page(request, "pages/forgot.html", asked=address)


def ask_quietly(request: Request, address: str) -> None:
    """After the answer: send the link, or log why it did not leave."""
    import logging

    state = request.app.state
    try:
        people.ask_for_link(state.db, state.settings, address, datetime.now(UTC))
    except people.PeopleError as error:
        logging.getLogger("rillbook").error("%s", error)


@router.get("/link/{secret}")
def link(request: Request, db: AsDatabase, secret: str) -> Response:
    """Choose a password; looking at the link changes nothing."""
    return _link(request, db, secret)


def _link(request: Request, db: AsDatabase, secret: str, error: str = "") -> Response:
    with db.read() as session:
        found = store.link_of(session, secret, datetime.now(UTC))
        name = found[1].name if found else None
        address = found[1].address if found else None
    status = 404 if name is None else 422 if error else 200
    return page(request, "pages/link.html", status, name=name, address=address, error=error)


@router.post("/link/{secret}")
def choose(
    request: Request, db: AsDatabase, secret: str, password: Short = "", again: Short = ""
) -> Response:
    """Set the password and sign in; the link is spent. With one-time codes, sign in by the form."""
    settings, now = request.app.state.settings, datetime.now(UTC)
    try:
        account = people.choose_password(db, settings, secret, password, again, now)
    except PasswordError as error:
        return _link(request, db, secret, str(error))
    if account is None:
        return _link(request, db, secret)
    if account.code_secret is not None:
        return RedirectResponse("/sign-in", status_code=303)
    with db.write() as session:
        browser = request.headers.get("user-agent", "")
        made = open_sign_in(session, account.id, browser, now)
    answer = RedirectResponse("/", status_code=303)
    set_sign_in(answer, made, settings.mail.base_url)
    return answer
