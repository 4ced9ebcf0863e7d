"""Statements for what people say of a station's sensors: marks on spans, and the sensor log."""

from datetime import date, datetime
from typing import NamedTuple, TypeVar

from sqlalchemy import exists, select
from sqlalchemy.orm import Session, aliased

from app.storage.tables import SensorEntry, SpanMark

VOID = "void"
Judged = TypeVar("Judged", SpanMark, SensorEntry)


class Mark(NamedTuple):
    """A mark that stands."""

    id: int
    quantity: str
    first: datetime
    last: datetime
    verdict: str
    why: str
    who: str
    entered: datetime


class LogEntry(NamedTuple):
    """A line of the sensor log that stands."""

    id: int
    quantity: str | None
    day: date
    kind: str
    factor: float | None
    note: str
    who: str
    entered: datetime


def marks(session: Session, station: int) -> list[Mark]:
    """Marks of a station that stand, in the order of entry."""
    later = aliased(SpanMark)
    rows = session.execute(
        select(
            SpanMark.id,
            SpanMark.quantity,
            SpanMark.first,
            SpanMark.last,
            SpanMark.verdict,
            SpanMark.why,
            SpanMark.who,
            SpanMark.entered,
        )
        .where(SpanMark.station_id == station, SpanMark.verdict != VOID)
        .where(~exists().where(later.supersedes == SpanMark.id))
        .order_by(SpanMark.id)
    )
    return [Mark(*row) for row in rows]


def sensor_log(session: Session, station: int) -> list[LogEntry]:
    """Entries of a station's sensor log that stand, by day and order of entry."""
    later = aliased(SensorEntry)
    rows = session.execute(
        select(
            SensorEntry.id,
            SensorEntry.quantity,
            SensorEntry.day,
            SensorEntry.kind,
            SensorEntry.factor,
            SensorEntry.note,
            SensorEntry.who,
            SensorEntry.entered,
        )
        .where(SensorEntry.station_id == station, SensorEntry.kind != VOID)
        .where(~exists().where(later.supersedes == SensorEntry.id))
        .order_by(SensorEntry.day, SensorEntry.id)
    )
    return [LogEntry(*row) for row in rows]


def superseded(session: Session, row: Judged) -> bool:
    """Whether a later row takes the place of this one."""
    table = type(row)
    return session.scalar(select(table.id).where(table.supersedes == row.id)) is not None


def said_of_station(
    session: Session, table: type[SpanMark] | type[SensorEntry], number: int
) -> int | None:
    """The station a mark or entry was made of; None when there is none, or it takes one back."""
    if table is SpanMark:
        return session.scalar(
            select(SpanMark.station_id).where(SpanMark.id == number, SpanMark.verdict != VOID)
        )
    return session.scalar(
        select(SensorEntry.station_id).where(SensorEntry.id == number, SensorEntry.kind != VOID)
    )
