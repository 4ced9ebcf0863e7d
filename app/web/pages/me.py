"""My account: password, one-time codes, sign-ins and tokens."""

from datetime import UTC, datetime
from typing import Annotated

import pyotp
import segno
from fastapi import APIRouter, Form, HTTPException, Request, Response
from fastapi.responses import RedirectResponse
from markupsafe import Markup
from sqlalchemy.orm import Session

from app.storage import people as store
from app.storage.book import note_change
from app.storage.database import Database
from app.storage.tables_people import Account
from app.web.access import AsViewer, Viewer
from app.web.needs import AsDatabase, AsNumber, Clean
from app.web.render import page
from app.workflows import people, tokens
from app.workflows.passwords import PasswordError, check_chosen, hashed, is_right
from app.workflows.sign_in import step_of

router = APIRouter()
Text = Annotated[Clean, Form(max_length=400)]
NO_ACCOUNT = "This way in has no account; sign in with one."


def own_account(session: Session, viewer: Viewer) -> Account:
    """The viewer's account; 404 for a way in without one."""
    account = session.get(Account, viewer.account) if viewer.account is not None else None
    if account is None:
        raise HTTPException(404, NO_ACCOUNT)
    return account


@router.get("/me")
def me(request: Request, db: AsDatabase, viewer: AsViewer) -> Response:
    """The account of whoever looks."""
    return _me(request, db, viewer)


def _me(
    request: Request,
    db: Database,
    viewer: Viewer,
    error: str = "",
    shown: str = "",
    code_secret: str = "",
) -> Response:
    with db.read() as session:
        account = own_account(session, viewer)
        sign_ins = store.sign_ins(session, account.id, datetime.now(UTC))
        held = store.tokens(session, account.id)
    return page(
        request,
        "pages/me.html",
        422 if error else 200,
        account=account,
        sign_ins=sign_ins,
        tokens=held,
        shown=shown,
        code_secret=code_secret,
        picture=code_picture(code_secret, account.address) if code_secret else "",
        may_codes=viewer.may("POST", "/me/codes"),
        error=error,
    )


def code_picture(secret: str, address: str) -> Markup:
    """The key of one-time codes as a square to be photographed, drawn in SVG."""
    uri = pyotp.TOTP(secret).provisioning_uri(name=address, issuer_name="Rillbook")
    drawn = segno.make(uri, error="m").svg_inline(scale=4, border=2, light="#fff")
    return Markup(drawn)


@router.post("/me/password")
def password(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    old: Text = "",
    password: Text = "",
    again: Text = "",
) -> Response:
    """Change the password; other browsers are signed out."""
    settings = request.app.state.settings
    with db.read() as session:
        account = own_account(session, viewer)
        kept, about = account.password, people.about(account)
    if not is_right(kept, old, settings):
        return _me(request, db, viewer, "The present password is not right.")
    try:
        check_chosen(password, again, about)
    except PasswordError as error:
        return _me(request, db, viewer, str(error))
    new = hashed(password, settings)
    with db.write() as session:
        account = own_account(session, viewer)
        account.password = new
        store.end_sign_ins(session, account.id, but=viewer.sign_in)
        store.use_links(session, account.id, datetime.now(UTC))
        said = {"done": "password changed"}
        note_change(session, viewer.who, "account", account.address, None, said)
    return RedirectResponse("/me", status_code=303)


@router.post("/me/codes")
def codes(request: Request, db: AsDatabase, viewer: AsViewer) -> Response:
    """Show a new key for one-time codes; it counts once a code of it has been typed."""
    return _me(request, db, viewer, code_secret=pyotp.random_base32())


@router.post("/me/codes/on")
def codes_on(
    request: Request, db: AsDatabase, viewer: AsViewer, secret: Text = "", code: Text = ""
) -> Response:
    """Switch one-time codes on, with a first code that shows they work."""
    if not (secret.isalnum() and secret.isascii() and secret.isupper() and len(secret) == 32):
        return _me(request, db, viewer, "Begin again: the key was not whole.")
    step = step_of(secret, code, datetime.now(UTC))
    if step is None:
        return _me(request, db, viewer, "This code is not right; try the next.", code_secret=secret)
    _set_codes(db, viewer, secret, step)
    return RedirectResponse("/me", status_code=303)


@router.post("/me/codes/off")
def codes_off(request: Request, db: AsDatabase, viewer: AsViewer, old: Text = "") -> Response:
    """Switch one-time codes off; asks for the password."""
    with db.read() as session:
        kept = own_account(session, viewer).password
    if not is_right(kept, old, request.app.state.settings):
        return _me(request, db, viewer, "The present password is not right.")
    _set_codes(db, viewer, None, None)
    return RedirectResponse("/me", status_code=303)


def _set_codes(db: Database, viewer: Viewer, secret: str | None, step: int | None) -> None:
    with db.write() as session:
        account = own_account(session, viewer)
        before = {"codes": account.code_secret is not None}
        account.code_secret, account.code_step = secret, step
        after = {"codes": secret is not None}
        note_change(session, viewer.who, "account", account.address, before, after)


@router.post("/me/sign-ins/{number}/end")
def end(db: AsDatabase, viewer: AsViewer, number: AsNumber) -> Response:
    """Sign another browser out."""
    with db.write() as session:
        account = own_account(session, viewer)
        if not store.end_sign_ins(session, account.id, one=number):
            raise HTTPException(404, "There is no such sign-in.")
    return RedirectResponse("/me", status_code=303)


@router.post("/me/tokens")
def make(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    name: Text = "",
) -> Response:
    """A new token to read the API with; shown once."""
    with db.write() as session:
        account = own_account(session, viewer)
        secret = tokens.make_token(session, "read", name, viewer.who, account.id)
    return _me(request, db, viewer, shown=secret)


@router.post("/me/tokens/{number}/revoke")
def revoke(db: AsDatabase, viewer: AsViewer, number: AsNumber) -> Response:
    """A token no longer opens anything."""
    with db.write() as session:
        account = own_account(session, viewer)
        if not tokens.revoke_token(session, number, viewer.who, account=account.id):
            raise HTTPException(404, "There is no such token.")
    return RedirectResponse("/me", status_code=303)
