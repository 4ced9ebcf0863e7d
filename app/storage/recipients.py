"""Statements for who gets letters, and who covers for whom."""

from collections.abc import Sequence
from datetime import UTC, date, datetime
from typing import Any, NamedTuple

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.storage.book import note_change
from app.storage.scope import Farms, of_farms
from app.storage.tables import Farm, Field, Source, Station
from app.storage.tables_letters import Cover, Recipient

CHANGED = ("name", "address", "language", "units", "weekday", "hour", "paused")


def put_recipient(session: Session, farm_id: int, values: dict[str, Any], who: str) -> Recipient:
    """Add a recipient, or change the one at this farm's address; what changed is kept."""
    row = session.scalar(
        select(Recipient).where(
            Recipient.farm_id == farm_id, Recipient.address == values["address"]
        )
    )
    before = None if row is None else kept(row)
    if row is None:
        row = Recipient(farm_id=farm_id, stopped_at=None)
        session.add(row)
    change_recipient(session, row, values, who, before)
    return row


def change_recipient(
    session: Session,
    row: Recipient,
    values: dict[str, Any],
    who: str,
    before: dict[str, Any] | None,
) -> None:
    """Change a recipient, and keep who changed what; nothing where nothing differs."""
    for name, value in values.items():
        setattr(row, name, value)
    session.flush()
    if before != (after := kept(row)):
        note_change(session, who, "recipient", str(row.id), before, after)


def kept(row: Recipient) -> dict[str, Any]:
    """A recipient as the record of changes keeps it."""
    return {"farm_id": row.farm_id, **{name: getattr(row, name) for name in CHANGED}}


class RecipientRow(NamedTuple):
    """A recipient with the farm it belongs to."""

    id: int
    farm_id: int
    farm_key: str
    farm_name: str
    farm: dict[str, Any]
    name: str
    address: str
    language: str
    units: str
    weekday: int
    hour: int
    paused: bool
    stopped_at: datetime | None


def recipients(session: Session, farms: Farms = None, one: int | None = None) -> list[RecipientRow]:
    """Every recipient, of some farms if given, or the one of a number; by farm and name."""
    statement = (
        select(
            Recipient.id, Farm.id, Farm.key, Farm.name, Farm.details,
            Recipient.name, Recipient.address, Recipient.language, Recipient.units,
            Recipient.weekday, Recipient.hour, Recipient.paused, Recipient.stopped_at,
        )
        .join(Farm, Farm.id == Recipient.farm_id)
        .order_by(Farm.name, Recipient.name, Recipient.id)
    )  # fmt: skip
    statement = of_farms(statement, farms)
    if one is not None:
        statement = statement.where(Recipient.id == one)
    return [RecipientRow._make(row) for row in session.execute(statement)]


def farm_offsets(session: Session) -> dict[int, float]:
    """The fixed offset [h] of the station that feeds each farm's fields."""
    rows = session.execute(
        select(Field.farm_id, Station.details)
        .join(Source, Source.field_id == Field.id)
        .join(Station, Station.id == Source.station_id)
        .where(Source.variable == "temperature")
        .order_by(Source.since, Field.id.desc())
    )
    return {farm: details["utc_offset_h"] for farm, details in rows}


def covers(session: Session, on: date, farms: Sequence[int] | None = None) -> dict[int, Cover]:
    """The cover in force on a day, by farm; the last one entered counts."""
    statement = (
        select(Cover)
        .where(Cover.first <= on, Cover.last >= on, Cover.ended.is_(None))
        .order_by(Cover.id)
    )
    if farms is not None:
        statement = statement.where(Cover.farm_id.in_(farms))
    return {row.farm_id: row for row in session.scalars(statement)}


def covers_to_come(session: Session, on: date, farms: Farms = None) -> list[tuple[Cover, str]]:
    """Covers that are in force on a day or later, with the farm's name, by date."""
    statement = (
        select(Cover, Farm.name)
        .join(Farm, Farm.id == Cover.farm_id)
        .where(Cover.last >= on, Cover.ended.is_(None))
        .order_by(Cover.first, Farm.name)
    )
    return [(row[0], row[1]) for row in session.execute(of_farms(statement, farms))]


def end_cover(session: Session, number: int, farms: Farms = None) -> bool:
    """End a cover of some farms; whether there was one."""
    row = session.scalar(
        of_farms(select(Cover).join(Farm, Farm.id == Cover.farm_id), farms).where(
            Cover.id == number
        )
    )
    if row is None or row.ended is not None:
        return False
    row.ended = datetime.now(UTC)
    return True
