"""Statements for ledgers: the blocks with all they rest on, and the ledger rows."""

from collections.abc import Iterable, Mapping, Sequence
from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import delete, func, insert, or_, select, update
from sqlalchemy.orm import Session

from app.storage.tables import (
    Advice,
    Block,
    Farm,
    Field,
    IrrigationSystem,
    LedgerDay,
    ReadingTaken,
    Season,
    Soil,
    Source,
    Station,
    StationDay,
)


class BlockRow(NamedTuple):
    """A block with the book's parts it rests on."""

    block_id: int
    block_key: str
    field_id: int
    field_key: str
    area_ha: float
    dirty_from: date | None
    soil: dict[str, Any]
    system: dict[str, Any]
    field: dict[str, Any]


class SeasonRow(NamedTuple):
    """A season of a block."""

    season_id: int
    block_id: int
    crop: str
    planting: date
    details: dict[str, Any]


class SourceRow(NamedTuple):
    """Which station feeds a variable of a field since when."""

    field_id: int
    variable: str
    since: date
    station_id: int


def read_blocks(session: Session, blocks: Sequence[int] | None = None) -> list[BlockRow]:
    """Blocks (all when None), by number."""
    wanted = (
        select(
            Block.id,
            Block.key,
            Field.id,
            Field.key,
            Block.area_ha,
            Block.dirty_from,
            Soil.details,
            IrrigationSystem.details,
            Field.details,
        )
        .join(Field, Field.id == Block.field_id)
        .join(Soil, Soil.id == Block.soil_id)
        .join(IrrigationSystem, IrrigationSystem.id == Block.system_id)
        .order_by(Block.id)
    )
    if blocks is not None:
        wanted = wanted.where(Block.id.in_(blocks))
    return [BlockRow(*row) for row in session.execute(wanted)]


def read_seasons(session: Session, blocks: Sequence[int]) -> list[SeasonRow]:
    """Seasons of blocks, by block and planting."""
    return [
        SeasonRow(*row)
        for row in session.execute(
            select(Season.id, Season.block_id, Season.crop, Season.planting, Season.details)
            .where(Season.block_id.in_(blocks))
            .order_by(Season.block_id, Season.planting)
        )
    ]


def read_sources(session: Session, fields: Sequence[int]) -> list[SourceRow]:
    """Sources of fields, oldest first."""
    return [
        SourceRow(*row)
        for row in session.execute(
            select(Source.field_id, Source.variable, Source.since, Source.station_id)
            .where(Source.field_id.in_(fields))
            .order_by(Source.field_id, Source.variable, Source.since)
        )
    ]


def station_details(session: Session, stations: Sequence[int]) -> dict[int, dict[str, Any]]:
    """The book's part of each station."""
    return {
        number: details
        for number, details in session.execute(
            select(Station.id, Station.details).where(Station.id.in_(stations))
        )
    }


def every_station(session: Session) -> dict[int, dict[str, Any]]:
    """The book's part of every station, by number."""
    rows = session.execute(select(Station.id, Station.details))
    return {number: details for number, details in rows}


CLOSE = (
    LedgerDay.root_depth_m,
    LedgerDay.depletion_mm,
    LedgerDay.subsoil_depletion_mm,
    func.coalesce(LedgerDay.evaporation_layer_depletion_mm, 0.0),
    func.coalesce(LedgerDay.depletion_p10_mm, LedgerDay.depletion_mm),
    func.coalesce(LedgerDay.depletion_p90_mm, LedgerDay.depletion_mm),
)


def read_closes(session: Session, days: Mapping[int, date]) -> dict[int, tuple[float, ...]]:
    """What the ledger of each block closed with on its day: root depth [m], depletion of root
    zone, subsoil and evaporation layer, p10 and p90 of the first [mm]; blocks without are left
    out."""
    found = {}
    for day, blocks in _by_day(days).items():
        for block, *values in session.execute(
            select(LedgerDay.block_id, *CLOSE).where(
                LedgerDay.day == day, LedgerDay.block_id.in_(blocks)
            )
        ):
            found[block] = tuple(float(value) for value in values)
    return found


def last_ledger_days(session: Session) -> dict[int, date]:
    """The last ledger day of each season that has one."""
    return {
        season: day
        for season, day in session.execute(
            select(LedgerDay.season_id, func.max(LedgerDay.day)).group_by(LedgerDay.season_id)
        )
    }


def first_energy_days(session: Session) -> dict[int, date]:
    """The first day with reference ET at a station that feeds a block energy, by block."""
    first = (
        select(StationDay.station_id, func.min(StationDay.day).label("day"))
        .where(StationDay.eto.is_not(None))
        .group_by(StationDay.station_id)
        .subquery()
    )
    return {
        block: day
        for block, day in session.execute(
            select(Block.id, func.min(first.c.day))
            .join(Source, Source.field_id == Block.field_id)
            .join(first, first.c.station_id == Source.station_id)
            .where(Source.variable == "energy")
            .group_by(Block.id)
        )
    }


def replace_readings(
    session: Session, since: Mapping[int, date], rows: Sequence[dict[str, Any]]
) -> None:
    """Put what readings did in place of what was kept of each block from its day of `since` on."""
    for day, blocks in _by_day(since).items():
        session.execute(
            delete(ReadingTaken).where(ReadingTaken.block_id.in_(blocks), ReadingTaken.close >= day)
        )
    if rows:
        session.execute(insert(ReadingTaken), rows)


def _by_day(since: Mapping[int, date]) -> dict[date, list[int]]:
    by_day: dict[date, list[int]] = {}
    for block, day in since.items():
        by_day.setdefault(day, []).append(block)
    return by_day


class Advised(NamedTuple):
    """Water that an advice asked for on its own morning."""

    number: int
    block_id: int
    gross_mm: float


def advised_for(session: Session, day: date) -> list[Advised]:
    """Advice that stands, issued on the morning of `day` for that day, on farms that presume."""
    rows = session.execute(
        select(Advice.number, Advice.block_id, Advice.gross_mm, Farm.details)
        .join(Block, Block.id == Advice.block_id)
        .join(Field, Field.id == Block.field_id)
        .join(Farm, Farm.id == Field.farm_id)
        .where(Advice.issued_on == day, Advice.day == day, Advice.stands.is_(True))
        .where(Advice.gross_mm > 0)
        .order_by(Advice.block_id)
    )
    return [Advised(*row[:3]) for row in rows if (row[3] or {}).get("presume")]


def replace_ledger_days(
    session: Session, since: Mapping[int, date], rows: Iterable[dict[str, Any]]
) -> int:
    """Put ledger rows in place of each block's rows from its day of `since` on."""
    for day, blocks in _by_day(since).items():
        session.execute(
            delete(LedgerDay).where(LedgerDay.block_id.in_(blocks), LedgerDay.day >= day)
        )
    many = list(rows)
    if many:
        session.execute(insert(LedgerDay), many)
    return len(many)


def clear_dirty(session: Session, blocks: Sequence[int]) -> None:
    """The ledgers of these blocks are up to date."""
    session.execute(update(Block).where(Block.id.in_(blocks)).values(dirty_from=None))


def dirty_block_ids(session: Session) -> list[int]:
    """Blocks whose ledger is to be recomputed."""
    return list(session.scalars(select(Block.id).where(Block.dirty_from.is_not(None))))


def depletion_before(
    session: Session, blocks: Sequence[int], days: Sequence[date]
) -> dict[tuple[int, date], float]:
    """Closing depletion of blocks on days, by (block, day)."""
    return {
        (block, day): value
        for block, day, value in session.execute(
            select(LedgerDay.block_id, LedgerDay.day, LedgerDay.depletion_mm)
            .where(LedgerDay.block_id.in_(blocks))
            .where(or_(*(LedgerDay.day == day for day in days)))
        )
    }
