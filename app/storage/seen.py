"""What was seen on a field, as its page and the API show it."""

from collections.abc import Sequence
from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import exists, select
from sqlalchemy.orm import Session, aliased

from app.storage.tables import Block, Event, ReadingTaken

SEEN = ("stage", "cover", "cutting", "reading", "keep_off", "note")


class SeenRow(NamedTuple):
    """Something seen that stands, and for a reading what it did to the ledger."""

    id: int
    block_key: str
    block_name: str
    kind: str
    day: date
    amount: float
    details: dict[str, Any]
    note: str
    who: str
    correction_mm: float | None
    gain: float | None
    before_mm: float | None
    before_spread_mm: float | None
    reading_mm: float | None
    reading_spread_mm: float | None
    after_mm: float | None
    after_spread_mm: float | None
    why: str | None


def seen_since(session: Session, blocks: Sequence[int], since: date) -> list[SeenRow]:
    """What was seen on blocks from a day on, newest first."""
    later = aliased(Event)
    rows = session.execute(
        select(
            Event.id,
            Block.key,
            Block.name,
            Event.kind,
            Event.day,
            Event.amount,
            Event.details,
            Event.note,
            Event.who,
            ReadingTaken.correction_mm,
            ReadingTaken.gain,
            ReadingTaken.before_mm,
            ReadingTaken.before_spread_mm,
            ReadingTaken.reading_mm,
            ReadingTaken.reading_spread_mm,
            ReadingTaken.after_mm,
            ReadingTaken.after_spread_mm,
            ReadingTaken.why,
        )
        .join(Block, Block.id == Event.block_id)
        .outerjoin(ReadingTaken, ReadingTaken.event_id == Event.id)
        .where(Event.block_id.in_(blocks), Event.day >= since, Event.kind.in_(SEEN))
        .where(~exists().where(later.supersedes == Event.id))
        .order_by(Event.day.desc(), Event.id.desc())
    )
    return [SeenRow._make((*row[:6], row[6] or {}, row[7] or "", *row[8:])) for row in rows]
