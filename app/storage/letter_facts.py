"""Statements for what a letter says: the outlooks of its advice, and the week behind."""

from collections.abc import Sequence
from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from app.storage.tables import Advice, Block, Field, IrrigationSystem, LedgerDay, Season


class Working(NamedTuple):
    """What the days after an advice are worked out from."""

    number: int
    block_id: int
    area_ha: float
    outlook: dict[str, Any]
    depletion_mm: float
    system: dict[str, Any]
    field: dict[str, Any]
    season: dict[str, Any]


def workings(session: Session, numbers: Sequence[int]) -> dict[int, Working]:
    """The outlooks of some advices with their fields' systems, by advice number."""
    rows = session.execute(
        select(
            Advice.number, Block.id, Block.area_ha, Advice.outlook, Advice.depletion_mm,
            IrrigationSystem.details, Field.details, Season.details,
        )
        .join(Block, Block.id == Advice.block_id)
        .join(Field, Field.id == Block.field_id)
        .join(IrrigationSystem, IrrigationSystem.id == Block.system_id)
        .join(Season, Season.id == Advice.season_id)
        .where(Advice.number.in_(numbers))
    )  # fmt: skip
    return {row[0]: Working._make(row) for row in rows}


class Sums(NamedTuple):
    """A block's sums [mm] over some days."""

    rain_mm: float
    used_mm: float
    applied_mm: float


def sums(session: Session, blocks: Sequence[int], first: date, last: date) -> dict[int, Sums]:
    """Rain, actual crop ET and gross irrigation of blocks over some days, by block."""
    rows = session.execute(
        select(
            LedgerDay.block_id,
            func.sum(LedgerDay.rain_mm),
            func.sum(LedgerDay.et_actual_mm),
            func.sum(LedgerDay.irrigation_gross_mm),
        )
        .where(LedgerDay.block_id.in_(blocks), LedgerDay.day.between(first, last))
        .group_by(LedgerDay.block_id)
    )
    return {row[0]: Sums(row[1], row[2], row[3]) for row in rows}


def rungs(
    session: Session, blocks: Sequence[int], first: date, last: date
) -> dict[tuple[int, date], int]:
    """The rung on which each block's days obtained their energy."""
    rows = session.execute(
        select(LedgerDay.block_id, LedgerDay.day, LedgerDay.rung).where(
            LedgerDay.block_id.in_(blocks), LedgerDay.day.between(first, last)
        )
    )
    return {(block, day): rung for block, day, rung in rows}
