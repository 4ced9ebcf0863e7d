"""Read statements of the station and intake pages."""

from datetime import date, datetime
from typing import Any, NamedTuple

from sqlalchemy import case, func, select
from sqlalchemy.orm import Session

from app.storage.intakes import PUSHED
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


def intakes(
    session: Session,
    most: int = 100,
    station: str | None = None,
    before: int | None = None,
    pushed_for: date | None = None,
    own: frozenset[str] | None = None,
) -> list[IntakeRow]:
    """The last uploaded files, newest first; of one station, or numbered before one, if given.

    With `pushed_for`, the pushes alone whose first row is of that day; with `own`, of the stations
    of these keys.
    """
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
    if own is not None:
        statement = statement.where(Station.key.in_(sorted(own)))
    if before is not None:
        statement = statement.where(Intake.id < before)
    if pushed_for is not None:
        statement = statement.where(Intake.first_day == pushed_for, _PUSHED)
    return [IntakeRow._make(row) for row in session.execute(statement)]


_PUSHED = Intake.file_name.startswith(PUSHED, autoescape=True)
NEAR = 20_000
"""Intakes looked through on either side of a place in the list: bounds the work of one page."""


class ReceivedRow(NamedTuple):
    """A line of the list of files: one file, or the pushes of one station day in one state.

    `id`, `file_name`, `who` and `at` are those of the newest; `rows` and days of all.
    `message`: what is wrong with the file as a whole, or "".
    """

    id: int
    station_key: str
    station_name: str
    file_name: str
    who: str
    at: datetime
    state: str
    files: int
    rows: int
    first_day: date | None
    last_day: date | None
    message: str


def station_of(session: Session, intake: int) -> str | None:
    """The key of the station a file is of."""
    statement = select(Station.key).join(Intake, Intake.station_id == Station.id)
    return session.scalar(statement.where(Intake.id == intake))


def received(
    session: Session,
    most: int,
    station: str | None = None,
    before: int | None = None,
    own: frozenset[str] | None = None,
) -> list[ReceivedRow]:
    """Files newest first, pushes gathered by station, first day and state; before a number, and of
    the stations of some keys, if given."""
    place = before or (session.scalar(select(func.max(Intake.id))) or 0) + 1
    alone = case((_PUSHED, 0), else_=Intake.id)
    newest = func.max(Intake.id)
    chosen = (
        select(
            newest.label("id"),
            func.count().label("files"),
            func.sum(Intake.rows).label("rows"),
            func.max(Intake.last_day).label("last_day"),
        )
        .where(Intake.id.between(place - NEAR, place + NEAR))
        .group_by(Intake.station_id, Intake.state, Intake.first_day, alone)
        .having(newest < place)
    )
    if station is not None or own is not None:
        chosen = chosen.join(Station)
    if station is not None:
        chosen = chosen.where(Station.key == station)
    if own is not None:
        chosen = chosen.where(Station.key.in_(sorted(own)))
    lines = chosen.order_by(newest.desc()).limit(most).subquery()
    statement = (
        select(
            Intake.id,
            Station.key,
            Station.name,
            Intake.file_name,
            Intake.who,
            Intake.at,
            Intake.state,
            lines.c.files,
            lines.c.rows,
            Intake.first_day,
            lines.c.last_day,
            Intake.summary,
        )
        .join(lines, lines.c.id == Intake.id)
        .join(Station, Station.id == Intake.station_id)
        .order_by(Intake.id.desc())
    )
    return [
        ReceivedRow._make((*row[:-1], row[-1].get("message", "")))
        for row in session.execute(statement)
    ]
