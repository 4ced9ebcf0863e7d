"""Accounts: added, changed, stopped; the links with which people choose their passwords."""

import secrets
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from email.utils import parseaddr
from typing import Any

from sqlalchemy.orm import Session

from app.errors import InputError
from app.letters.deliver import DeliveryError, send
from app.letters.people import link_letter
from app.settings import Settings
from app.storage import people as store
from app.storage.book import note_change
from app.storage.database import Database
from app.storage.tables_people import Account, OneTimeLink
from app.wording.catalogue import LANGUAGES, Language
from app.wording.reader import Reader
from app.workflows.passwords import check_chosen, hashed

ROLES = ("admin", "advisor", "grower")
DAYS = {"invite": 7, "reset": 1}
RESETS, RESET_WINDOW = 3, timedelta(hours=1)
LONGEST_NAME = 80


class PeopleError(InputError):
    """An account that cannot be made or changed so; the message says why."""


@dataclass(frozen=True)
class Person:
    """What is said of an account: who, what they may do, which farms (keys) they see."""

    address: str
    name: str
    role: str
    farms: frozenset[str] = frozenset()
    language: str = "en"


def add_account(session: Session, person: Person, who: str) -> Account:
    """A new account, without a password yet; raises PeopleError."""
    person = _checked(session, person, None)
    if store.account_at(session, person.address) is not None:
        raise PeopleError(f"There is an account at {person.address} already.")
    account = Account(
        address=person.address, name=person.name, role=person.role, language=person.language,
        made=datetime.now(UTC),
    )  # fmt: skip
    session.add(account)
    session.flush()
    store.give_farms(session, account.id, person.farms)
    note_change(session, who, "account", person.address, None, _kept(session, account))
    return account


def change_account(session: Session, account: Account, person: Person, who: str) -> None:
    """Change name, role, farms and language; raises PeopleError."""
    person = _checked(session, person, account.id)
    if account.role == "admin" and person.role != "admin":
        _must_not_be_last(session, account)
    before = _kept(session, account)
    account.name, account.role, account.language = person.name, person.role, person.language
    store.give_farms(session, account.id, person.farms)
    session.flush()
    _note(session, who, account, before)


def stop_account(session: Session, account: Account, who: str, stop: bool) -> None:
    """Stop an account, at once and everywhere, or open it again; raises PeopleError."""
    if stop and account.role == "admin":
        _must_not_be_last(session, account)
    before = _kept(session, account)
    account.stopped = datetime.now(UTC) if stop else None
    store.end_sign_ins(session, account.id)
    store.use_links(session, account.id, datetime.now(UTC))
    session.flush()
    _note(session, who, account, before)


def _must_not_be_last(session: Session, account: Account) -> None:
    if not store.other_admins(session, account.id):
        raise PeopleError("This is the only admin who can sign in. Make another one first.")


def _checked(session: Session, person: Person, account: int | None) -> Person:
    name = " ".join(person.name.split())[:LONGEST_NAME]
    address = person.address.strip().lower()
    local, _, domain = address.rpartition("@")
    if not local or not domain or parseaddr(address)[1] != address or not address.isascii():
        raise PeopleError(f"{address[:80]!r} is no e-mail address; write it as ana@example.org.")
    if not name or not name.isprintable():
        raise PeopleError("A name is needed; it stands beside what the person enters.")
    if store.name_taken(session, name, account):
        raise PeopleError(
            f"There is an account named {name} already. Add an initial, so that the record can "
            "tell them apart."
        )
    if person.role not in ROLES:
        raise PeopleError(f"{person.role!r} is no role; choose admin, advisor or grower.")
    if person.language not in LANGUAGES:
        raise PeopleError(f"{person.language!r} is no language here; choose en or es.")
    return Person(address, name, person.role, person.farms, person.language)


def _kept(session: Session, account: Account) -> dict[str, Any]:
    """An account as the record of changes keeps it: no secrets."""
    return {
        "name": account.name,
        "role": account.role,
        "language": account.language,
        "farms": sorted(store.farms_of(session, account.id)),
        "stopped": account.stopped is not None,
        "codes": account.code_secret is not None,
    }


def _note(session: Session, who: str, account: Account, before: dict[str, Any]) -> None:
    if before != (after := _kept(session, account)):
        note_change(session, who, "account", account.address, before, after)


# Links and passwords


def make_link(session: Session, account: Account, purpose: str, now: datetime) -> str:
    """The secret of a new one-time link; the ones before no longer work."""
    store.use_links(session, account.id, now)
    secret = secrets.token_urlsafe(32)
    session.add(
        OneTimeLink(
            secret=store.digest(secret),
            account_id=account.id,
            purpose=purpose,
            made=now,
            ends=now + timedelta(days=DAYS[purpose]),
        )
    )
    return secret


def post_link(
    db: Database, settings: Settings, account: Account, purpose: str, secret: str, who: str
) -> str:
    """Send a one-time link to its account; returns where it went, or raises PeopleError."""
    language: Language = "es" if account.language == "es" else "en"
    letter = link_letter(
        purpose,
        (account.name, account.address),
        who,
        link_address(settings, secret),
        DAYS[purpose],
        Reader(language),
        settings.mail,
        datetime.now(UTC).replace(microsecond=0),
    )
    try:
        said = send(letter, settings)
    except DeliveryError as error:
        raise PeopleError(f"The letter to {account.address} did not leave: {error}") from error
    return f"sent to {account.address}" if settings.mail.host else f"written to {said}"


def link_address(settings: Settings, secret: str) -> str:
    """Where a one-time link leads."""
    return f"{settings.mail.base_url}/link/{secret}"


def ask_for_link(db: Database, settings: Settings, address: str, now: datetime) -> None:
    """Send a new password's link to an address, if it has an account; silent either way."""
    with db.write() as session:
        subject = store.digest(f"reset {address.strip().lower()}")
        full = store.count_try(session, {subject: RESETS}, now - RESET_WINDOW, now)
        account = store.account_at(session, address)
        if full is not None or account is None or account.stopped is not None:
            return
        purpose = "invite" if account.password is None else "reset"
        secret = make_link(session, account, purpose, now)
        session.flush()
        session.expunge(account)
    post_link(db, settings, account, purpose, secret, account.name)


def choose_password(
    db: Database, settings: Settings, secret: str, password: str, again: str, now: datetime
) -> Account | None:
    """Set the password a link is for, once; every sign-in ends. None where the link is spent."""
    with db.read() as session:
        found = store.link_of(session, secret, now)
        if found is None:
            return None
        account = found[1]
        check_chosen(password, again, about(account))
    kept = hashed(password, settings)
    with db.write() as session:
        found = store.link_of(session, secret, now)
        if found is None:
            return None
        account = found[1]
        set_password(session, account, kept, f"{account.name}, by link", now)
        session.flush()
        session.expunge(account)
        return account


def set_password(session: Session, account: Account, kept: str, who: str, now: datetime) -> None:
    """A new password: links and sign-ins of before no longer count."""
    first = account.password is None
    account.password = kept
    store.use_links(session, account.id, now)
    store.end_sign_ins(session, account.id)
    what = "password chosen" if first else "password changed"
    note_change(session, who, "account", account.address, None, {"done": what})


def about(account: Account) -> tuple[str, ...]:
    """What a password must not hold."""
    return (account.address.partition("@")[0], account.address, account.name)


def farms_chosen(keys: Iterable[str]) -> frozenset[str]:
    """Keys of farms as a form sends them."""
    return frozenset(key for key in keys if key)
