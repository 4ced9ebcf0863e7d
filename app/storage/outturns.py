"""Statements for how advice turned out: past advice, and the ledgers since."""

from collections.abc import Sequence
from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.storage.scope import Farms, of_farms
from app.storage.tables import Advice, Block, Farm, Field, LedgerDay


class PastAdvice(NamedTuple):
    """An advice, whether it stands, and the field and farm it was for."""

    number: int
    stands: bool
    issued_on: date
    block_id: int
    block_name: str
    field_key: str
    field_name: str
    farm_key: str
    farm_name: str
    farm: dict[str, Any]
    standing: str
    day: date | None
    net_mm: float
    hours: float
    depletion_mm: float
    outlook: dict[str, Any]


def past_advice(
    session: Session, first: date, last: date, farms: Farms = None, farm: str | None = None
) -> list[PastAdvice]:
    """Every advice of the mornings `first` to `last`, by morning, field and number."""
    statement = (
        select(
            Advice.number, Advice.stands, Advice.issued_on, Advice.block_id, Block.name,
            Field.key, Field.name, Farm.key, Farm.name, Farm.details,
            Advice.standing, Advice.day, Advice.net_mm, Advice.hours, Advice.depletion_mm,
            Advice.outlook,
        )
        .join(Block, Block.id == Advice.block_id)
        .join(Field, Field.id == Block.field_id)
        .join(Farm, Farm.id == Field.farm_id)
        .where(Advice.issued_on.between(first, last))
        .order_by(Advice.issued_on, Field.name, Block.id, Advice.number)
    )  # fmt: skip
    if farm is not None:
        statement = statement.where(Farm.key == farm)
    return [PastAdvice(*row) for row in session.execute(of_farms(statement, farms))]


class Known(NamedTuple):
    """A ledger day as it is known now [mm]."""

    depletion_mm: float
    limit_mm: float
    irrigation_net_mm: float
    et_actual_mm: float


def known_days(
    session: Session, blocks: Sequence[int], first: date, last: date
) -> dict[tuple[int, date], Known]:
    """Ledger days of blocks, by block and day."""
    return {
        (block, day): Known(*values)
        for block, day, *values in session.execute(
            select(
                LedgerDay.block_id,
                LedgerDay.day,
                LedgerDay.depletion_mm,
                LedgerDay.limit_mm,
                LedgerDay.irrigation_net_mm,
                LedgerDay.et_actual_mm,
            ).where(LedgerDay.block_id.in_(blocks), LedgerDay.day.between(first, last))
        )
    }
