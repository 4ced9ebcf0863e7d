"""Statements for events: what stands now, and the chain of corrections behind it."""

from collections.abc import Iterable, Sequence
from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import exists, select
from sqlalchemy.orm import Session, aliased

from app.storage.tables import Event

VOID = "void"


class Standing(NamedTuple):
    """An event that stands: not superseded, not deleted."""

    event_id: int
    block_id: int
    day: date
    kind: str
    amount: float
    unit: str
    purpose: str
    confirmation: str
    details: dict[str, Any]


def standing_events(
    session: Session, blocks: Sequence[int], kinds: Sequence[str] = ()
) -> Iterable[Standing]:
    """Events of blocks that stand, of some kinds if given, in the order of entry."""
    later = aliased(Event)
    wanted = (
        select(
            Event.id,
            Event.block_id,
            Event.day,
            Event.kind,
            Event.amount,
            Event.unit,
            Event.purpose,
            Event.confirmation,
            Event.details,
        )
        .where(Event.block_id.in_(blocks))
        .where(Event.kind != VOID)
        .where(~exists().where(later.supersedes == Event.id))
        .order_by(Event.id)
    )
    if kinds:
        wanted = wanted.where(Event.kind.in_(kinds))
    rows = session.execute(wanted)
    return (Standing._make((*row[:-1], row[-1] or {})) for row in rows)


def head_of(session: Session, event: Event) -> Event:
    """The last of an event's corrections."""
    while (later := session.scalar(select(Event).where(Event.supersedes == event.id))) is not None:
        event = later
    return event


def events_by_origin(session: Session, prefix: str) -> dict[str, list[Event]]:
    """Events whose origin begins with `prefix`, by origin without its version, oldest first."""
    found: dict[str, list[Event]] = {}
    for event in session.scalars(
        select(Event).where(Event.origin.startswith(prefix)).order_by(Event.id)
    ):
        assert event.origin is not None
        found.setdefault(event.origin.split("~")[0], []).append(event)
    return found
