"""A block with water that was only presumed, both ways: as if it had run, and as if it had not."""

from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np
from sqlalchemy.orm import Session

from app.science.soil.block import BlockLedger
from app.storage.events import standing_events
from app.workflows import agronomy
from app.workflows.assemble import assemble
from app.workflows.recompute import compute

UNCONFIRMED = "presumed"


@dataclass(frozen=True)
class BothWays:
    """Depletion at yesterday's close [mm] and the first day past the limit (None: not in sight),
    as presumed and with none of what is presumed; the last day presumed, and its event."""

    day: date
    event_id: int
    amount: float
    unit: str
    presumed_mm: float
    without_mm: float
    limit_mm: float
    presumed_passes: date | None
    without_passes: date | None


def both_ways(session: Session, block: int, today: date) -> BothWays | None:
    """Both ways, or None where nothing in the stretch at hand is only presumed."""
    presumed = [
        event
        for event in standing_events(session, [block], ("irrigation",))
        if event.confirmation == UNCONFIRMED
    ]
    if not presumed:
        return None
    through, since = today - timedelta(days=1), {block: today}
    told = assemble(session, since, through)
    not_run = assemble(session, since, through, agronomy.COUNTED - {UNCONFIRMED})
    if not told or not not_run or not told[-1].past:
        return None
    subject = told[-1]
    first = agronomy.as_date(subject.plan.start)
    inside = [event for event in presumed if first <= event.day <= through]
    if not inside:
        return None
    last = max(inside, key=lambda event: (event.day, event.event_id))
    as_presumed, without = (one.ledger for one in compute([subject, not_run[-1]]))
    eve = subject.past - 1

    return BothWays(
        last.day,
        last.event_id,
        last.amount,
        last.unit,
        float(as_presumed.depletion_mm[eve]),
        float(without.depletion_mm[eve]),
        float(as_presumed.limit_mm[eve]),
        _passes(as_presumed, subject.past),
        _passes(without, subject.past),
    )


def _passes(ledger: BlockLedger, past: int) -> date | None:
    late = np.flatnonzero(ledger.depletion_mm[past:] > ledger.limit_mm[past:])
    return agronomy.as_date(ledger.date[past + late[0]]) if late.size else None
