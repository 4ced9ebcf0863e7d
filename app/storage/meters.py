"""Statements for water meters: their readings that stand, and the irrigations of their fields."""

from collections.abc import Sequence
from datetime import date
from typing import Any, NamedTuple

from sqlalchemy import exists, select
from sqlalchemy.orm import Session, aliased

from app.storage.events import standing_events
from app.storage.scope import Farms, of_farms
from app.storage.tables import Block, Event, Farm, Field, IrrigationSystem
from app.storage.tables_meters import Meter, MeterField, MeterReading


class FedBlock(NamedTuple):
    """A block that a meter feeds."""

    block_id: int
    block_key: str
    field_key: str
    field_name: str
    area_ha: float
    system: dict[str, Any]


class Drawn(NamedTuple):
    """An irrigation that stands, and as it was entered before a meter had its say."""

    event_id: int
    block_id: int
    day: date
    purpose: str
    amount: float
    unit: str
    details: dict[str, Any]
    entered_amount: float
    entered_unit: str


def meters(session: Session, farms: Farms) -> list[tuple[Meter, str]]:
    """Every meter of some farms by name, with its farm's name."""
    wanted = select(Meter, Farm.name).join(Farm, Farm.id == Meter.farm_id)
    return [
        (row[0], row[1]) for row in session.execute(of_farms(wanted, farms).order_by(Meter.name))
    ]


def meter_of(session: Session, key: str, farms: Farms) -> Meter | None:
    """The meter of a key, if it is of some farms."""
    wanted = select(Meter).join(Farm, Farm.id == Meter.farm_id).where(Meter.key == key)
    return session.scalar(of_farms(wanted, farms))


def fed_blocks(session: Session, meter_id: int) -> list[FedBlock]:
    """Blocks of the fields a meter feeds."""
    rows = session.execute(
        select(Block.id, Block.key, Field.key, Field.name, Block.area_ha, IrrigationSystem.details)
        .join(Field, Field.id == Block.field_id)
        .join(IrrigationSystem, IrrigationSystem.id == Block.system_id)
        .join(MeterField, MeterField.field_id == Field.id)
        .where(MeterField.meter_id == meter_id)
        .order_by(Field.name, Block.id)
    )
    return [FedBlock._make(row) for row in rows]


def standing_readings(session: Session, meter_id: int) -> list[MeterReading]:
    """Readings that stand, by day."""
    later = aliased(MeterReading)
    return list(
        session.scalars(
            select(MeterReading)
            .where(MeterReading.meter_id == meter_id, MeterReading.kind == "reading")
            .where(~exists().where(later.supersedes == MeterReading.id))
            .order_by(MeterReading.day)
        )
    )


def drawn(
    session: Session, blocks: Sequence[int], counted: Sequence[str], meter: str
) -> list[Drawn]:
    """Irrigations of blocks that stand and count, by day; each also as entered before `meter`."""
    found = []
    for event in standing_events(session, blocks, ("irrigation",)):
        if event.confirmation not in counted:
            continue
        amount, unit = event.amount, event.unit
        if event.details.get("meter") == meter:
            amount, unit = _before_meter(session, event.event_id)
        found.append(
            Drawn(
                event.event_id, event.block_id, event.day, event.purpose, event.amount,
                event.unit, event.details, amount, unit,
            )
        )  # fmt: skip
    return sorted(found, key=lambda one: (one.day, one.event_id))


def _before_meter(session: Session, event_id: int) -> tuple[float, str]:
    event = session.get(Event, event_id)
    assert event is not None
    while "meter" in (event.details or {}) and event.supersedes is not None:
        before = session.get(Event, event.supersedes)
        assert before is not None
        event = before
    return event.amount, event.unit


def unmetered_fields(session: Session, farms: Farms) -> list[tuple[str, str, str]]:
    """Key, name and farm's name of the fields that no meter feeds."""
    wanted = (
        select(Field.key, Field.name, Farm.name)
        .join(Farm, Farm.id == Field.farm_id)
        .where(~exists().where(MeterField.field_id == Field.id))
        .order_by(Farm.name, Field.name)
    )
    return [(row[0], row[1], row[2]) for row in session.execute(of_farms(wanted, farms))]


def farm_of_field(session: Session, key: str, farms: Farms) -> str | None:
    """The key of the farm of a field, if it is one of some farms."""
    wanted = select(Farm.key).join(Field, Field.farm_id == Farm.id).where(Field.key == key)
    return session.scalar(of_farms(wanted, farms))
