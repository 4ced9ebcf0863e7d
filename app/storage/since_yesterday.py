"""Statements for what changed since the morning before: yesterday's terms, and what was thought."""

from datetime import UTC, date, datetime, time, timedelta
from typing import NamedTuple

from sqlalchemy import and_, select
from sqlalchemy.orm import Session, aliased

from app.storage.tables import Advice, Event, LedgerDay


class Since(NamedTuple):
    """Yesterday's terms of a block [mm], and the advice of yesterday's morning.

    before_mm: depletion at yesterday's opening as it is known now; thought_mm: as yesterday's
    advice had it, None without one; was_day: the day that advice named. told: an entry of an
    earlier day was made or changed since that morning.
    """

    et_mm: float
    rain_mm: float
    irrigation_mm: float
    correction_mm: float
    before_mm: float
    thought_mm: float | None
    was_day: date | None
    told: bool


def since_yesterday(session: Session, morning: date | None) -> dict[int, Since]:
    """For each block with a ledger of the two days before `morning`."""
    if morning is None:
        return {}
    yesterday, before = morning - timedelta(days=1), aliased(LedgerDay)
    dawn = datetime.combine(yesterday, time(), UTC)
    told = set(
        session.scalars(select(Event.block_id).where(Event.entered >= dawn, Event.day < yesterday))
    )
    rows = session.execute(
        select(
            LedgerDay.block_id,
            LedgerDay.et_actual_mm,
            LedgerDay.rain_mm - LedgerDay.runoff_mm - LedgerDay.rain_outside_roots_mm,
            LedgerDay.irrigation_net_mm,
            LedgerDay.correction_mm,
            before.depletion_mm,
            Advice.depletion_mm,
            Advice.day,
        )
        .join(
            before,
            and_(
                before.block_id == LedgerDay.block_id, before.day == yesterday - timedelta(days=1)
            ),
        )
        .outerjoin(
            Advice,
            and_(
                Advice.block_id == LedgerDay.block_id,
                Advice.issued_on == yesterday,
                Advice.stands.is_(True),
            ),
        )
        .where(LedgerDay.day == yesterday)
    )
    return {
        block: Since(et, rain, water, correction, opening, thought, day, block in told)
        for block, et, rain, water, correction, opening, thought, day in rows
    }
