"""Read statements of the station and intake pages."""

from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from app.storage.scope import Farms, of_farms
from app.storage.tables import (
    Farm,
    Field,
    Intake,
    Source,
    Station,
    StationDay,
)


class Span(NamedTuple):
    """First and last day a station has rows for, and how many."""

    first: date
    last: date
    days: int


def spans(session: Session) -> dict[int, Span]:
    """The span of each station that has days."""
    statement = select(
        StationDay.station_id,
        func.min(StationDay.day),
        func.max(StationDay.day),
        func.count(),
    ).group_by(StationDay.station_id)
    return {row[0]: Span(row[1], row[2], row[3]) for row in session.execute(statement)}


def rung_counts(session: Session, since: date) -> dict[int, dict[int, int]]:
    """For each station the days of each rung since a day."""
    found: dict[int, dict[int, int]] = {}
    for station, rung, count in session.execute(
        select(StationDay.station_id, StationDay.rung, func.count())
        .where(StationDay.day >= since)
        .group_by(StationDay.station_id, StationDay.rung)
    ):
        found.setdefault(station, {})[rung] = count
    return found


class Fed(NamedTuple):
    """A field that hangs on a station for its energy."""

    key: str
    name: str
    farm: str
    area_ha: float
    variables: tuple[str, ...]


def fed_fields(session: Session, station: int, today: date, farms: Farms = None) -> list[Fed]:
    """The fields a station feeds today, with the variables it gives."""
    statement = (
        select(Field.id, Field.key, Field.name, Farm.name, Field.area_ha, Source.variable)
        .join(Source, Source.field_id == Field.id)
        .join(Farm, Farm.id == Field.farm_id)
        .where(Source.since <= today)
        .add_columns(Source.station_id)
        .order_by(Field.name, Field.id, Source.variable, Source.since)
    )
    newest: dict[tuple[int, str], tuple[Any, ...]] = {}
    for found in session.execute(of_farms(statement, farms)):
        newest[found[0], found[5]] = tuple(found)
    by_field: dict[int, list[tuple[Any, ...]]] = {}
    for row in newest.values():
        if row[6] == station:
            by_field.setdefault(row[0], []).append(row)
    return [
        Fed(rows[0][1], rows[0][2], rows[0][3], rows[0][4], tuple(row[5] for row in rows))
        for rows in by_field.values()
    ]


class IntakeRow(NamedTuple):
    """An uploaded file."""

    id: int
    station_key: str
    station_name: str
    file_name: str
    who: str
    at: Any
    state: str
    applied_at: Any
    rows: int
    first_day: date | None
    last_day: date | None
    summary: dict[str, Any]


def intakes(session: Session, most: int = 100, station: str | None = None) -> list[IntakeRow]:
    """The last uploaded files, newest first; of one station if given."""
    statement = (
        select(
            Intake.id,
            Station.key,
            Station.name,
            Intake.file_name,
            Intake.who,
            Intake.at,
            Intake.state,
            Intake.applied_at,
            Intake.rows,
            Intake.first_day,
            Intake.last_day,
            Intake.summary,
        )
        .join(Station, Station.id == Intake.station_id)
        .order_by(Intake.id.desc())
        .limit(most)
    )
    if station is not None:
        statement = statement.where(Station.key == station)
    return [IntakeRow._make(row) for row in session.execute(statement)]
