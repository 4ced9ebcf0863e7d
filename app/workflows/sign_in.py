"""Signing in and out, and one-time codes (TOTP, RFC 6238)."""

import secrets
from datetime import datetime, timedelta
from hmac import compare_digest

import pyotp
from sqlalchemy.orm import Session

from app.errors import InputError
from app.settings import Settings
from app.storage import people as store
from app.storage.database import Database
from app.storage.tables_people import Account, SignIn
from app.workflows.passwords import is_right

LASTS = timedelta(days=30)
WINDOW = timedelta(minutes=15)
# Tries within the window (working values): of one address from one client, of one address, and
# from one client. The second is far above the first, or a stranger could lock a person out.
PAIR_TRIES, ADDRESS_TRIES, CLIENT_TRIES = 5, 30, 60
CODE_S = 30
BROWSER_SIGNS = 120


class SignInError(InputError):
    """Not signed in; the message does not say which part was wrong."""


def sign_in(
    db: Database,
    settings: Settings,
    address: str,
    password: str,
    code: str,
    browser: str,
    client: str,
    now: datetime,
) -> str:
    """The secret of a new sign-in; raises SignInError."""
    pair = f"{address.strip().lower()[:200]} {client}"
    limits = {pair: PAIR_TRIES, address.strip().lower()[:200]: ADDRESS_TRIES, client: CLIENT_TRIES}
    with db.write() as session:
        full = store.count_try(session, _subjects(limits), now - WINDOW, now)
    if full is not None:
        minutes = WINDOW.seconds // 60
        raise SignInError(f"Too many tries. Wait {minutes} minutes, or ask for a new password.")
    with db.read() as session:
        account = store.account_at(session, address)
        kept = account.password if account is not None and account.stopped is None else None
    right = is_right(kept, password, settings)
    with db.write() as session:
        account = store.account_at(session, address)
        if not right or account is None or not takes_code(account, code, now):
            raise SignInError("The address, the password or the one-time code is not right.")
        store.forget_tries(session, store.digest(pair))
        return open_sign_in(session, account.id, browser, now)


def _subjects(limits: dict[str, int]) -> dict[str, int]:
    return {store.digest(subject): most for subject, most in limits.items()}


def open_sign_in(session: Session, account: int, browser: str, now: datetime) -> str:
    """A sign-in of an account; returns its secret, of which only the hash is kept."""
    secret = secrets.token_urlsafe(32)
    session.add(
        SignIn(
            secret=store.digest(secret),
            account_id=account,
            browser=browser[:BROWSER_SIGNS],
            since=now,
            ends=now + LASTS,
        )
    )
    return secret


def takes_code(account: Account, code: str, now: datetime) -> bool:
    """Whether a code is right now, the one before or after too; each counts once."""
    if account.code_secret is None:
        return True
    step = step_of(account.code_secret, code, now)
    if step is None or (account.code_step is not None and step <= account.code_step):
        return False
    account.code_step = step
    return True


def step_of(secret: str, code: str, now: datetime) -> int | None:
    """The step of time, of three around now, whose code this is."""
    typed = "".join(code.split()).encode("utf-8", "replace")
    maker = pyotp.TOTP(secret, interval=CODE_S)
    current = int(now.timestamp()) // CODE_S
    for step in (current, current - 1, current + 1):
        if compare_digest(maker.generate_otp(step).encode(), typed):
            return step
    return None
