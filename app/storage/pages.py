"""Read statements of the Rounds: plain rows, no joins in loops."""

from collections.abc import Sequence
from datetime import date, timedelta
from typing import Any, NamedTuple

from sqlalchemy import Text, and_, cast, exists, func, select
from sqlalchemy.orm import Session, aliased

from app.science.energy.ladder import USUAL
from app.storage.decisions import Decided, standing_decisions
from app.storage.scope import Farms, of_farms
from app.storage.tables import (
    Advice,
    Block,
    Event,
    Farm,
    Field,
    IrrigationSystem,
    Season,
    Source,
    Station,
    StationDay,
)


class RoundsRow(NamedTuple):
    """One block with the advice of the morning; the advice's columns are None without one.

    `stage_days` and `figures` are JSON text, for most rows are never asked for them.
    """

    field_id: int
    field_key: str
    field_name: str
    managed_by: str
    area_ha: float
    farm_key: str
    farm_name: str
    block_id: int
    block_key: str
    block_name: str
    system_name: str
    crop: str | None
    planting: date | None
    stage_days: str | None
    number: int | None
    issued_on: date | None
    standing: str | None
    unsure: str
    day: date | None
    net_mm: float
    gross_mm: float
    hours: float
    volume_m3: float
    limit_day: date | None
    reason: str
    figures: str
    depletion_mm: float
    depletion_p10_mm: float
    depletion_p90_mm: float
    limit_mm: float
    taw_mm: float
    change_mm: float | None
    rung: int
    data_until: date | None
    decision: Decided | None = None
    """What the advisor decided: day, depths and hours above are then the advisor's."""
    issued: "RoundsRow | None" = None
    """The row with the advice as it was issued, where something was decided."""

    def follow(self, decision: Decided) -> "RoundsRow":
        """The row as the advisor decided."""
        return self._replace(
            decision=decision,
            issued=self,
            day=decision.day,
            net_mm=decision.net_mm,
            gross_mm=decision.gross_mm,
            hours=decision.hours,
            volume_m3=decision.volume_m3,
        )


ADVICE_COLUMNS = (
    Advice.number,
    Advice.issued_on,
    Advice.standing,
    Advice.unsure,
    Advice.day,
    Advice.net_mm,
    Advice.gross_mm,
    Advice.hours,
    Advice.volume_m3,
    Advice.limit_day,
    Advice.reason,
    cast(Advice.figures, Text),
    Advice.depletion_mm,
    Advice.depletion_p10_mm,
    Advice.depletion_p90_mm,
    Advice.limit_mm,
    Advice.taw_mm,
    Advice.change_mm,
    Advice.rung,
    Advice.data_until,
)


def last_morning(session: Session, today: date) -> date | None:
    """The last morning, at most today, on which advice was issued."""
    return session.scalar(select(func.max(Advice.issued_on)).where(Advice.issued_on <= today))


def rounds_rows(
    session: Session, morning: date | None, farms: Farms = None, field: str | None = None
) -> list[RoundsRow]:
    """Every block with its advice of `morning`, of some farms or of one field if given, as the
    advisor decided where something was."""
    statement = (
        select(
            Field.id,
            Field.key,
            Field.name,
            Field.managed_by,
            Field.area_ha,
            Farm.key,
            Farm.name,
            Block.id,
            Block.key,
            Block.name,
            IrrigationSystem.name,
            Season.crop,
            Season.planting,
            Season.details["stage_days"].as_string(),
            *ADVICE_COLUMNS,
        )
        .join(Farm, Farm.id == Field.farm_id)
        .join(Block, Block.field_id == Field.id)
        .join(IrrigationSystem, IrrigationSystem.id == Block.system_id)
        .outerjoin(
            Advice,
            and_(Advice.block_id == Block.id, Advice.issued_on == morning, Advice.stands),
        )
        .outerjoin(Season, Season.id == Advice.season_id)
        .order_by(Field.name, Field.id, Block.id)
    )
    statement = of_farms(statement, farms)
    if field is not None:
        statement = statement.where(Field.key == field)
    rows = [RoundsRow(*tuple(row)) for row in session.execute(statement)]
    decided = standing_decisions(session, morning)
    if not decided:
        return rows
    return [
        row.follow(decided[row.block_id])
        if row.block_id in decided and row.number is not None
        else row
        for row in rows
    ]


class SourceRow(NamedTuple):
    """Which station feeds a variable of a field, from when."""

    field_id: int
    variable: str
    since: date
    station_id: int
    station_key: str
    station_name: str


def sources(
    session: Session, today: date, farms: Farms = None, variable: str | None = None
) -> list[SourceRow]:
    """The sources that have begun, oldest first, so that the last of a variable is in force."""
    statement = (
        select(
            Source.field_id, Source.variable, Source.since, Station.id, Station.key, Station.name
        )
        .join(Station, Station.id == Source.station_id)
        .where(Source.since <= today)
        .order_by(Source.field_id, Source.variable, Source.since)
    )
    if variable is not None:
        statement = statement.where(Source.variable == variable)
    if farms is not None:
        statement = of_farms(
            statement.join(Field, Field.id == Source.field_id).join(Farm, Farm.id == Field.farm_id),
            farms,
        )
    return [SourceRow._make(row) for row in session.execute(statement)]


def current(rows: Sequence[SourceRow]) -> dict[tuple[int, str], SourceRow]:
    """The source in force for each field and variable."""
    return {(row.field_id, row.variable): row for row in rows}


class EventRow(NamedTuple):
    """An event that stands."""

    id: int
    block_id: int
    block_key: str
    block_name: str
    kind: str
    day: date
    amount: float
    unit: str
    purpose: str
    confirmation: str
    note: str | None
    who: str
    entered: Any
    supersedes: int | None
    details: dict[str, Any] | None


WATER = ("irrigation", "rain")


def events_since(
    session: Session, since: date, blocks: Sequence[int] | None = None
) -> list[EventRow]:
    """Water and rain that stand from a day on, newest day first; of some blocks if given."""
    later = aliased(Event)
    statement = (
        select(
            Event.id,
            Event.block_id,
            Block.key,
            Block.name,
            Event.kind,
            Event.day,
            Event.amount,
            Event.unit,
            Event.purpose,
            Event.confirmation,
            Event.note,
            Event.who,
            Event.entered,
            Event.supersedes,
            Event.details,
        )
        .join(Block, Block.id == Event.block_id)
        .where(Event.day >= since, Event.kind.in_(WATER))
        .where(~exists().where(later.supersedes == Event.id))
        .order_by(Event.day.desc(), Event.id.desc())
    )
    if blocks is not None:
        statement = statement.where(Event.block_id.in_(blocks))
    return [EventRow._make(row) for row in session.execute(statement)]


class StationRow(NamedTuple):
    """A station of the book."""

    id: int
    key: str
    name: str
    details: dict[str, Any]


def stations(session: Session) -> list[StationRow]:
    """Every station, by name."""
    return [
        StationRow._make(row)
        for row in session.execute(
            select(Station.id, Station.key, Station.name, Station.details).order_by(Station.name)
        )
    ]


class RecentDay(NamedTuple):
    """What the strip of troubles needs of a station's day."""

    station_id: int
    day: date
    rung: int
    why_not: str
    flags: str
    eto_uncertainty: float | None


def recent_days(session: Session, today: date, days: int = 15) -> list[RecentDay]:
    """The last days of every station before today that hold data, oldest first."""
    statement = (
        select(
            StationDay.station_id,
            StationDay.day,
            StationDay.rung,
            StationDay.why_not,
            StationDay.flags,
            StationDay.eto_uncertainty,
        )
        .where(StationDay.day > today - timedelta(days=days), StationDay.day < today)
        .where(StationDay.rung > 0, StationDay.rung < USUAL)
        .order_by(StationDay.station_id, StationDay.day)
    )
    return [RecentDay._make(row) for row in session.execute(statement)]


def last_days(session: Session) -> dict[int, date]:
    """The last day with data of each station."""
    statement = (
        select(StationDay.station_id, func.max(StationDay.day))
        .where(StationDay.rung > 0, StationDay.rung < USUAL)
        .group_by(StationDay.station_id)
    )
    return {row[0]: row[1] for row in session.execute(statement)}


def farms(session: Session, keys: Farms = None) -> list[tuple[str, str]]:
    """Key and name of every farm (or of some), by name."""
    statement = of_farms(select(Farm.key, Farm.name).order_by(Farm.name), keys)
    return [(row[0], row[1]) for row in session.execute(statement)]


def field_keys(session: Session, farms: Farms = None) -> set[str]:
    """The keys of every field, or of some farms'."""
    statement = select(Field.key).join(Farm, Farm.id == Field.farm_id)
    return set(session.scalars(of_farms(statement, farms)))
