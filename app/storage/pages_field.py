"""Read statements of the Field page and of a day's working."""

from collections.abc import Sequence
from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import case, func, select
from sqlalchemy.orm import Session

from app.storage.scope import Farms, of_farms
from app.storage.tables import (
    Advice,
    Block,
    Contribution,
    Event,
    Farm,
    Field,
    Intake,
    IrrigationSystem,
    LedgerDay,
    Season,
    Soil,
    StationDay,
)


class BlockRow(NamedTuple):
    """A block with the field, farm, soil and system it belongs to."""

    id: int
    key: str
    name: str
    area_ha: float
    field_id: int
    field_key: str
    field_name: str
    field_area_ha: float
    managed_by: str
    field_details: dict[str, Any]
    farm_key: str
    farm_name: str
    soil_name: str
    soil: dict[str, Any]
    system_name: str
    system: dict[str, Any]


def field_blocks(session: Session, key: str, farms: Farms = None) -> list[BlockRow]:
    """The blocks of a field, none when there is no such field (or it is another farm's)."""
    statement = (
        select(
            Block.id,
            Block.key,
            Block.name,
            Block.area_ha,
            Field.id,
            Field.key,
            Field.name,
            Field.area_ha,
            Field.managed_by,
            Field.details,
            Farm.key,
            Farm.name,
            Soil.name,
            Soil.details,
            IrrigationSystem.name,
            IrrigationSystem.details,
        )
        .join(Field, Field.id == Block.field_id)
        .join(Farm, Farm.id == Field.farm_id)
        .join(Soil, Soil.id == Block.soil_id)
        .join(IrrigationSystem, IrrigationSystem.id == Block.system_id)
        .where(Field.key == key)
        .order_by(Block.id)
    )
    return [BlockRow._make(row) for row in session.execute(of_farms(statement, farms))]


class SeasonRow(NamedTuple):
    """A season of a block."""

    id: int
    crop: str
    planting: date
    details: dict[str, Any]


def season_at(session: Session, block: int, day: date) -> SeasonRow | None:
    """The last season planted at most on a day."""
    row = session.execute(
        select(Season.id, Season.crop, Season.planting, Season.details)
        .where(Season.block_id == block, Season.planting <= day)
        .order_by(Season.planting.desc())
        .limit(1)
    ).first()
    return None if row is None else SeasonRow._make(row)


def seasons_of_block(session: Session, block: int) -> list[SeasonRow]:
    """Every season of a block, last planted first."""
    rows = session.execute(
        select(Season.id, Season.crop, Season.planting, Season.details)
        .where(Season.block_id == block)
        .order_by(Season.planting.desc())
    )
    return [SeasonRow._make(row) for row in rows]


LEDGER = tuple(column.name for column in LedgerDay.__table__.columns)


class SeasonSums(NamedTuple):
    """A season's ledger so far, in all [mm], and the days that closed past the limit."""

    days: int
    rain_mm: float
    gross_mm: float
    net_mm: float
    et_mm: float
    etc_mm: float
    percolation_mm: float
    runoff_mm: float
    late_days: int


def season_sums(session: Session, season: int) -> SeasonSums | None:
    """Sums over a season's ledger from planting on; None before its first day."""
    row = session.execute(
        select(
            func.count(),
            func.sum(LedgerDay.rain_mm),
            func.sum(LedgerDay.irrigation_gross_mm),
            func.sum(LedgerDay.irrigation_net_mm),
            func.sum(LedgerDay.et_actual_mm),
            func.sum(LedgerDay.etc_potential_mm),
            func.sum(LedgerDay.deep_percolation_mm),
            func.sum(LedgerDay.runoff_mm),
            func.sum(case((LedgerDay.depletion_mm > LedgerDay.limit_mm, 1), else_=0)),
        )
        .join(Season, Season.id == LedgerDay.season_id)
        .where(LedgerDay.season_id == season, LedgerDay.day >= Season.planting)
    ).one()
    return SeasonSums._make(row) if row[0] else None


def ledger_days(
    session: Session, block: int, first: date | None = None, last: date | None = None
) -> list[dict[str, Any]]:
    """Days of a block's ledger, oldest first, every column by name."""
    columns = [getattr(LedgerDay, name) for name in LEDGER]
    statement = select(*columns).where(LedgerDay.block_id == block).order_by(LedgerDay.day)
    if first is not None:
        statement = statement.where(LedgerDay.day >= first)
    if last is not None:
        statement = statement.where(LedgerDay.day <= last)
    return [dict(zip(LEDGER, row, strict=True)) for row in session.execute(statement)]


ADVICE = tuple(column.name for column in Advice.__table__.columns)


def last_advice(session: Session, block: int, today: date) -> dict[str, Any] | None:
    """The advice that stands for the last morning of a block, at most today."""
    columns = [getattr(Advice, name) for name in ADVICE]
    row = session.execute(
        select(*columns)
        .where(Advice.block_id == block, Advice.issued_on <= today, Advice.stands)
        .order_by(Advice.issued_on.desc(), Advice.number.desc())
        .limit(1)
    ).first()
    return None if row is None else dict(zip(ADVICE, row, strict=True))


class PastAdvice(NamedTuple):
    """An earlier number of a block."""

    number: int
    issued_on: date
    stands: bool
    standing: str
    day: date | None
    gross_mm: float
    hours: float


def past_advice(session: Session, block: int, today: date, most: int = 12) -> list[PastAdvice]:
    """The last numbers issued for a block, newest first."""
    statement = (
        select(
            Advice.number,
            Advice.issued_on,
            Advice.stands,
            Advice.standing,
            Advice.day,
            Advice.gross_mm,
            Advice.hours,
        )
        .where(Advice.block_id == block, Advice.issued_on <= today)
        .order_by(Advice.issued_on.desc(), Advice.number.desc())
        .limit(most)
    )
    return [PastAdvice._make(row) for row in session.execute(statement)]


class EnergyRow(NamedTuple):
    """A station's day as far as measured against modelled energy goes."""

    day: date
    rung: int
    rn: float | None
    rn_measured: float | None
    rn_modelled: float | None
    eto: float | None


def energy_days(session: Session, station: int, first: date, last: date) -> list[EnergyRow]:
    """Net radiation of a station's days by rung, measured and modelled, oldest first."""
    statement = (
        select(
            StationDay.day,
            StationDay.rung,
            StationDay.rn,
            StationDay.rn_measured,
            StationDay.rn_modelled,
            StationDay.eto,
        )
        .where(StationDay.station_id == station, StationDay.day.between(first, last))
        .order_by(StationDay.day)
    )
    return [EnergyRow._make(row) for row in session.execute(statement)]


STATION = tuple(column.name for column in StationDay.__table__.columns)


def station_days(
    session: Session, stations: Sequence[int], first: date, last: date
) -> list[dict[str, Any]]:
    """Every column of stations' days, oldest first."""
    columns = [getattr(StationDay, name) for name in STATION]
    statement = (
        select(*columns)
        .where(StationDay.station_id.in_(stations), StationDay.day.between(first, last))
        .order_by(StationDay.day)
    )
    return [dict(zip(STATION, row, strict=True)) for row in session.execute(statement)]


class Brought(NamedTuple):
    """An applied intake that brought rows for a station's day."""

    intake_id: int
    file_name: str
    applied_at: Any
    rows: int
    data: bytes


def brought(session: Session, station: int, day: date) -> list[Brought]:
    """The applied intakes that hold rows of a station's day, in the order in which they fold."""
    statement = (
        select(Intake.id, Intake.file_name, Intake.applied_at, Contribution.rows, Contribution.data)
        .join(Contribution, Contribution.intake_id == Intake.id)
        .where(Contribution.station_id == station, Contribution.day == day)
        .where(Intake.state == "applied")
        .order_by(Intake.applied_order)
    )
    return [Brought._make(row) for row in session.execute(statement)]


def event_owner(session: Session, event: int) -> str | None:
    """The key of the field an event belongs to."""
    return session.scalar(
        select(Field.key)
        .join(Block, Block.field_id == Field.id)
        .join(Event, Event.block_id == Block.id)
        .where(Event.id == event)
    )


def superseded_count(session: Session, blocks: Sequence[int]) -> int:
    """How many entries of blocks were corrected or deleted."""
    return (
        session.scalar(
            select(func.count()).where(Event.block_id.in_(blocks), Event.supersedes.is_not(None))
        )
        or 0
    )
