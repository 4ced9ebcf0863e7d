"""Statements for exports, streamed row by row."""

from collections.abc import Iterator
from datetime import date
from typing import Any

from sqlalchemy import case, func, select
from sqlalchemy.orm import Session

from app.storage.scope import Farms, of_farms
from app.storage.tables import WHOLE, Advice, Block, Farm, Field, LedgerDay, Station, StationDay

LEDGER_COLUMNS = tuple(
    column.name
    for column in LedgerDay.__table__.columns
    if column.name not in {"day", "block_id", "season_id"}
)
STATION_COLUMNS = tuple(
    column.name
    for column in StationDay.__table__.columns
    if column.name not in {"station_id", "day", "notes"}
)
ADVICE_COLUMNS = (
    "number",
    "standing",
    "unsure",
    "day",
    "net_mm",
    "gross_mm",
    "hours",
    "volume_m3",
    "limit_day",
    "reason",
    "depletion_mm",
    "depletion_p10_mm",
    "depletion_p90_mm",
    "limit_mm",
    "taw_mm",
    "change_mm",
    "rung",
    "data_until",
    "program",
    "inputs_hash",
)


def blocks_of(session: Session, field_key: str) -> list[tuple[int, str]]:
    """Number and key of each block of a field; empty when there is no such field."""
    return [
        (number, key)
        for number, key in session.execute(
            select(Block.id, Block.key).join(Field).where(Field.key == field_key).order_by(Block.id)
        )
    ]


def ledger_rows(session: Session, blocks: list[int]) -> Iterator[tuple[Any, ...]]:
    """Block key, day and every ledger column, by block and day."""
    columns = [getattr(LedgerDay, name) for name in LEDGER_COLUMNS]
    yield from _streamed(
        session,
        select(Block.key, LedgerDay.day, *columns)
        .join(Block, Block.id == LedgerDay.block_id)
        .where(LedgerDay.block_id.in_(blocks))
        .order_by(LedgerDay.block_id, LedgerDay.day),
    )


def station_rows(session: Session, station_key: str) -> Iterator[tuple[Any, ...]]:
    """Day and every column of a station's days."""
    columns = [getattr(StationDay, name) for name in STATION_COLUMNS]
    yield from _streamed(
        session,
        select(StationDay.day, *columns)
        .join(Station, Station.id == StationDay.station_id)
        .where(Station.key == station_key)
        .order_by(StationDay.day),
    )


def advice_rows(session: Session, on: date, farms: Farms = None) -> Iterator[tuple[Any, ...]]:
    """Farm, field, its key, block and the advice that stands for a morning, by farm and field."""
    columns = [getattr(Advice, name) for name in ADVICE_COLUMNS]
    named = case((Block.key == WHOLE, ""), else_=Block.name)
    statement = (
        select(Farm.name, Field.name, Field.key, named, *columns)
        .join(Block, Block.id == Advice.block_id)
        .join(Field, Field.id == Block.field_id)
        .join(Farm, Farm.id == Field.farm_id)
        .where(Advice.issued_on == on, Advice.stands.is_(True))
        .order_by(Farm.name, Field.name, Block.id)
    )
    yield from _streamed(session, of_farms(statement, farms))


def _streamed(session: Session, statement: Any) -> Iterator[tuple[Any, ...]]:
    for row in session.execute(statement, execution_options={"yield_per": 1000}):
        yield tuple(row)


def standings(session: Session, on: date) -> dict[str, int]:
    """How many blocks stand where on a morning."""
    counted = select(Advice.standing, func.count()).where(
        Advice.issued_on == on, Advice.stands.is_(True)
    )
    return {
        standing: count for standing, count in session.execute(counted.group_by(Advice.standing))
    }
