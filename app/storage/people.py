"""Statements for accounts, the farms they see, their sign-ins, links and tokens."""

from collections.abc import Iterable
from datetime import datetime, timedelta
from hashlib import sha256
from typing import NamedTuple

from sqlalchemy import delete, exists, func, select, update
from sqlalchemy.orm import Session

from app.storage.tables import Farm, Station
from app.storage.tables_people import (
    Account,
    Membership,
    OneTimeLink,
    SignIn,
    SignInTry,
    Token,
)

TRIES_KEPT = timedelta(days=1)


def digest(secret: str) -> str:
    """What is kept of a secret; the secrets are random and long, so one hash is enough."""
    return sha256(secret.encode("utf-8", "surrogatepass")).hexdigest()


def is_guarded(session: Session) -> bool:
    """Whether an admin can sign in, so that everybody has to."""
    return bool(session.scalar(select(exists().where(*_ADMIN))))


_ADMIN = (Account.role == "admin", Account.password.is_not(None), Account.stopped.is_(None))


def other_admins(session: Session, account: int) -> int:
    """How many admins other than this one can sign in."""
    return session.scalar(select(func.count()).where(*_ADMIN, Account.id != account)) or 0


# Accounts


def account_at(session: Session, address: str) -> Account | None:
    """The account of an address, stopped or not."""
    return session.scalar(select(Account).where(Account.address == address.strip().lower()))


def name_taken(session: Session, name: str, but: int | None = None) -> bool:
    """Whether another account has a name."""
    found = session.scalar(select(Account.id).where(func.lower(Account.name) == name.lower()))
    return found is not None and found != but


def accounts(session: Session) -> list[Account]:
    """Every account: admins, advisors, growers, each by name."""
    return list(session.scalars(select(Account).order_by(Account.role, Account.name)))


def farms_of(session: Session, account: int) -> frozenset[str]:
    """The keys of the farms an account was given."""
    statement = select(Farm.key).join(Membership, Membership.farm_id == Farm.id)
    return frozenset(session.scalars(statement.where(Membership.account_id == account)))


def members(session: Session) -> dict[int, list[str]]:
    """The names of the farms each account was given, by name."""
    found: dict[int, list[str]] = {}
    for account, name in session.execute(
        select(Membership.account_id, Farm.name)
        .join(Farm, Farm.id == Membership.farm_id)
        .order_by(Farm.name)
    ):
        found.setdefault(account, []).append(name)
    return found


def give_farms(session: Session, account: int, keys: Iterable[str]) -> None:
    """Give an account exactly these farms; keys of no farm are passed over."""
    session.execute(delete(Membership).where(Membership.account_id == account))
    for farm in session.scalars(select(Farm.id).where(Farm.key.in_(sorted(keys)))):
        session.add(Membership(account_id=account, farm_id=farm))


# Sign-ins


def signed_in(session: Session, secret: str, now: datetime) -> tuple[Account, SignIn] | None:
    """Whose browser a cookie is, while the sign-in and the account stand."""
    row = session.execute(
        select(Account, SignIn)
        .join(SignIn, SignIn.account_id == Account.id)
        .where(SignIn.secret == digest(secret), SignIn.ends > now, Account.stopped.is_(None))
    ).first()
    return None if row is None else (row[0], row[1])


def sign_ins(session: Session, account: int, now: datetime) -> list[SignIn]:
    """The sign-ins of an account that stand, newest first."""
    statement = select(SignIn).where(SignIn.account_id == account, SignIn.ends > now)
    return list(session.scalars(statement.order_by(SignIn.since.desc(), SignIn.id.desc())))


def end_sign_ins(
    session: Session, account: int, one: int | None = None, but: int | None = None
) -> int:
    """End every sign-in of an account, or one, or all but one; how many."""
    statement = delete(SignIn).where(SignIn.account_id == account)
    if one is not None:
        statement = statement.where(SignIn.id == one)
    if but is not None:
        statement = statement.where(SignIn.id != but)
    return len(session.execute(statement.returning(SignIn.id)).all())


def count_try(
    session: Session, subjects: dict[str, int], since: datetime, now: datetime
) -> str | None:
    """Write a try down for each subject; the first that has had as many as it may since, else None.

    In a transaction to write, so that no two processes count past each other.
    """
    session.execute(delete(SignInTry).where(SignInTry.at < now - TRIES_KEPT))
    counted = {
        subject: count
        for subject, count in session.execute(
            select(SignInTry.subject, func.count())
            .where(SignInTry.subject.in_(list(subjects)), SignInTry.at >= since)
            .group_by(SignInTry.subject)
        )
    }
    for subject, most in subjects.items():
        if counted.get(subject, 0) >= most:
            return subject
    session.add_all([SignInTry(subject=subject, at=now) for subject in subjects])
    return None


def forget_tries(session: Session, subject: str) -> None:
    """A right sign-in clears what stood against it."""
    session.execute(delete(SignInTry).where(SignInTry.subject == subject))


# One-time links


def link_of(session: Session, secret: str, now: datetime) -> tuple[OneTimeLink, Account] | None:
    """A link that has not run out or been used, with its account."""
    row = session.execute(
        select(OneTimeLink, Account)
        .join(Account, Account.id == OneTimeLink.account_id)
        .where(OneTimeLink.secret == digest(secret), OneTimeLink.ends > now)
        .where(OneTimeLink.used.is_(None), Account.stopped.is_(None))
    ).first()
    return None if row is None else (row[0], row[1])


def use_links(session: Session, account: int, now: datetime) -> None:
    """No link of an account works any longer."""
    session.execute(
        update(OneTimeLink)
        .where(OneTimeLink.account_id == account, OneTimeLink.used.is_(None))
        .values(used=now)
    )


# Tokens


class Bearer(NamedTuple):
    """What a token opens: a person's reading, a station's pushing."""

    token: Token
    account: Account | None
    station: str | None


def bearer(session: Session, secret: str) -> Bearer | None:
    """The token of a secret, while it and its account stand."""
    row = session.execute(
        select(Token, Account, Station.key)
        .outerjoin(Account, Account.id == Token.account_id)
        .outerjoin(Station, Station.id == Token.station_id)
        .where(Token.secret == digest(secret), Token.revoked.is_(None))
        .where(Account.stopped.is_(None))
    ).first()
    return None if row is None else Bearer(row[0], row[1], row[2])


class TokenRow(NamedTuple):
    """A token that stands, as a page lists it."""

    id: int
    kind: str
    name: str
    who: str
    made: datetime


def tokens(
    session: Session, account: int | None = None, station: str | None = None
) -> list[TokenRow]:
    """The tokens of an account or of a station that stand, newest first."""
    statement = (
        select(Token.id, Token.kind, Token.name, Token.who, Token.made)
        .where(Token.revoked.is_(None))
        .order_by(Token.id.desc())
    )
    if station is not None:
        statement = statement.join(Station, Station.id == Token.station_id).where(
            Station.key == station
        )
    else:
        statement = statement.where(Token.account_id == account)
    return [TokenRow._make(row) for row in session.execute(statement)]
