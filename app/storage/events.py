"""Statements for events: what stands now, and the chain of corrections behind it."""

from collections.abc import Iterable, Sequence
from datetime import date, timedelta
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


PRESUMED = "presumed/"
"""How the origin of an irrigation begins that was only presumed."""


def presumed_near(session: Session, block: int, day: date) -> Event | None:
    """The irrigation presumed on a block within a day of `day` that still stands, if any."""
    later = aliased(Event)
    return session.scalar(
        select(Event)
        .where(Event.block_id == block, Event.origin.startswith(PRESUMED))
        .where(Event.day.between(day - timedelta(days=1), day + timedelta(days=1)))
        .where(~exists().where(later.supersedes == Event.id))
        .order_by(Event.day.desc())
        .limit(1)
    )


def irrigated_on(session: Session, blocks: Sequence[int], day: date) -> set[int]:
    """Those of the blocks for which an irrigation of the day stands."""
    return {
        event.block_id
        for event in standing_events(session, blocks, ("irrigation",))
        if event.day == day
    }


def origins_taken(session: Session, origins: Sequence[str]) -> set[str]:
    """Those of the origins that an event has."""
    wanted = select(Event.origin).where(Event.origin.in_(origins))
    return {origin for origin in session.scalars(wanted) if origin is not None}


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
