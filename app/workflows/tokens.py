"""Tokens: what a logger or a program shows instead of a sign-in."""

import secrets
from datetime import UTC, datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.storage.book import note_change
from app.storage.people import digest
from app.storage.tables import Station
from app.storage.tables_people import Token

PREFIX = {"push": "rlp_", "read": "rlr_"}
LONGEST_NAME = 80


def make_token(
    session: Session,
    kind: str,
    name: str,
    who: str,
    account: int | None = None,
    station: str | None = None,
) -> str:
    """A new token; its secret is given back once and kept only as a hash."""
    secret = PREFIX[kind] + secrets.token_urlsafe(32)
    session.add(
        Token(
            secret=digest(secret),
            kind=kind,
            name=" ".join(name.split())[:LONGEST_NAME] or kind,
            account_id=account,
            station_id=session.scalar(select(Station.id).where(Station.key == station)),
            who=who,
            made=datetime.now(UTC),
        )
    )
    note_change(session, who, "token", station or who, None, {"kind": kind, "name": name})
    return secret


def revoke_token(
    session: Session, number: int, who: str, account: int | None = None, station: str | None = None
) -> bool:
    """Revoke a token of an account or of a station; whether there was one."""
    statement = select(Token).where(Token.id == number, Token.revoked.is_(None))
    if station is not None:
        statement = statement.join(Station, Station.id == Token.station_id).where(
            Station.key == station
        )
    else:
        statement = statement.where(Token.account_id == account)
    token = session.scalar(statement)
    if token is None:
        return False
    token.revoked = datetime.now(UTC)
    said = {"kind": token.kind, "name": token.name}
    note_change(session, who, "token", station or who, said, {**said, "revoked": True})
    return True
