"""Who changed what: the record of the book, and every fact a person entered, in one list."""

from datetime import datetime
from typing import Any, NamedTuple

from sqlalchemy import select
from sqlalchemy.orm import InstrumentedAttribute, Session, aliased

from app.storage.tables import (
    Block,
    BookChange,
    Event,
    Field,
    Intake,
    SensorEntry,
    SpanMark,
    Station,
)
from app.storage.tables_decisions import Decision
from app.storage.tables_meters import Meter, MeterReading

MOST = 100


class Change(NamedTuple):
    """One change: when, who, of what kind, of which thing, and what stood before and after."""

    at: datetime
    who: str
    kind: str
    key: str
    before: dict[str, Any] | None
    after: dict[str, Any] | None


def changes(session: Session, before: datetime | None = None) -> list[Change]:
    """The last changes before an instant, newest first."""
    found = [
        *_book(session, before),
        *_events(session, before),
        *_decisions(session, before),
        *_meter_readings(session, before),
        *_intakes(session, before),
        *_words(session, before, SpanMark, "mark", ("quantity", "first", "last", "verdict", "why")),
        *_words(session, before, SensorEntry, "sensor log", ("kind", "day", "quantity", "note")),
    ]
    return sorted(found, key=lambda change: change.at, reverse=True)[:MOST]


def _last(statement: Any, at: InstrumentedAttribute[Any], before: datetime | None) -> Any:
    if before is not None:
        statement = statement.where(at < before)
    return statement.order_by(at.desc()).limit(MOST)


def _book(session: Session, before: datetime | None) -> list[Change]:
    statement = select(
        BookChange.at, BookChange.who, BookChange.kind, BookChange.key, BookChange.before,
        BookChange.after,
    )  # fmt: skip
    return [Change._make(row) for row in session.execute(_last(statement, BookChange.at, before))]


EVENT = ("kind", "day", "amount", "unit", "purpose", "note")


def _events(session: Session, before: datetime | None) -> list[Change]:
    old = aliased(Event)
    statement = (
        select(Event, old, Field.key)
        .join(Block, Block.id == Event.block_id)
        .join(Field, Field.id == Block.field_id)
        .outerjoin(old, old.id == Event.supersedes)
    )
    return [
        Change(row.entered, row.who, "entry", key, _said(was, EVENT), _said(row, EVENT))
        for row, was, key in session.execute(_last(statement, Event.entered, before))
    ]


METER = ("kind", "day", "register", "restarts", "note")


def _meter_readings(session: Session, before: datetime | None) -> list[Change]:
    old = aliased(MeterReading)
    statement = (
        select(MeterReading, old, Meter.key)
        .join(Meter, Meter.id == MeterReading.meter_id)
        .outerjoin(old, old.id == MeterReading.supersedes)
    )
    return [
        Change(row.entered, row.who, "meter reading", key, _said(was, METER), _said(row, METER))
        for row, was, key in session.execute(_last(statement, MeterReading.entered, before))
    ]


DECISION = ("number", "verdict", "day", "hours", "until", "note")


def _decisions(session: Session, before: datetime | None) -> list[Change]:
    statement = (
        select(Decision, Field.key)
        .join(Block, Block.id == Decision.block_id)
        .join(Field, Field.id == Block.field_id)
    )
    return [
        Change(row.entered, row.who, "decision", key, None, _said(row, DECISION))
        for row, key in session.execute(_last(statement, Decision.entered, before))
    ]


def _intakes(session: Session, before: datetime | None) -> list[Change]:
    statement = select(Intake, Station.key).join(Station, Station.id == Intake.station_id)
    names = ("file_name", "state", "rows")
    return [
        Change(row.at, row.who, "intake", key, None, _said(row, names))
        for row, key in session.execute(_last(statement, Intake.at, before))
    ]


def _words(
    session: Session,
    before: datetime | None,
    table: type[SpanMark] | type[SensorEntry],
    kind: str,
    names: tuple[str, ...],
) -> list[Change]:
    old: Any = aliased(table)
    statement = (
        select(table, old, Station.key)
        .join(Station, Station.id == table.station_id)
        .outerjoin(old, old.id == table.supersedes)
    )
    return [
        Change(row.entered, row.who, kind, key, _said(was, names), _said(row, names))
        for row, was, key in session.execute(_last(statement, table.entered, before))
    ]


def _said(row: Any, names: tuple[str, ...]) -> dict[str, Any] | None:
    if row is None:
        return None
    return {name: value for name in names if (value := getattr(row, name)) is not None}
