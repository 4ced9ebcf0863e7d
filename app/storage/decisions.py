"""Statements for the advisor's decisions on advice."""

from collections.abc import Sequence
from datetime import date
from typing import NamedTuple

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from app.storage.events import standing_events
from app.storage.tables_decisions import Decision

TAKE_BACK = "take_back"


class Decided(NamedTuple):
    """A decision that stands, with the day and running time the advice had."""

    number: int
    verdict: str
    made_on: date
    until: date
    day: date | None
    net_mm: float
    gross_mm: float
    hours: float
    volume_m3: float
    note: str
    who: str


def decided_on(session: Session, numbers: Sequence[int]) -> dict[int, Decided]:
    """The last decision on each of the advices, by number; none that was taken back."""
    last = select(func.max(Decision.id)).where(Decision.number.in_(numbers))
    return {
        row.number: Decided(*(getattr(row, name) for name in Decided._fields))
        for row in session.scalars(
            select(Decision).where(
                Decision.id.in_(last.group_by(Decision.number)), Decision.verdict != TAKE_BACK
            )
        )
    }


def standing_decisions(
    session: Session, morning: date | None, blocks: Sequence[int] | None = None
) -> dict[int, Decided]:
    """The decision that stands for each block on a morning: its last, until its time has run out
    or the block was watered since."""
    if morning is None:
        return {}
    last = select(func.max(Decision.id)).where(Decision.made_on <= morning)
    if blocks is not None:
        last = last.where(Decision.block_id.in_(blocks))
    found = {
        row.block_id: Decided(*(getattr(row, name) for name in Decided._fields))
        for row in session.scalars(
            select(Decision).where(
                Decision.id.in_(last.group_by(Decision.block_id)),
                Decision.until >= morning,
                Decision.verdict != TAKE_BACK,
            )
        )
    }
    for event in standing_events(session, sorted(found), ("irrigation",)):
        decided = found.get(event.block_id)
        if decided is not None and decided.made_on <= event.day <= morning:
            del found[event.block_id]
    return found
