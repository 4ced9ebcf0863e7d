"""Water meters: put up, read, compared with what was logged, and shared over the irrigations.

A reading is the register at the end of its day: what passed since the reading before belongs to
the irrigations logged on the days after it. Shared out, each is superseded by its part of the
metered volume, confirmed as metered.
"""

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta

import numpy as np
from sqlalchemy import delete, select
from sqlalchemy.orm import Session

from app.science.metering import passed, shared_out
from app.storage import book
from app.storage import meters as store
from app.storage.database import Database
from app.storage.scope import Farms, of_farms
from app.storage.tables import Event, Farm, Field
from app.storage.tables_meters import Meter, MeterField, MeterReading
from app.workflows.agronomy import COUNTED, gross_and_net
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.once import EntryError, once

UNITS = {
    "m3": 1.0,
    "l": 0.001,
    "ml": 1000.0,
    "gal": 0.003785411784,
    "ft3": 0.028316846592,
    "acre_in": 102.790153129,
    "acre_ft": 1233.48183755,
}
"""Cubic metres in a unit of a register (NIST SP 811, appendix B.8)."""
SAME_M3 = 0.05
"""Shared is what adds up to the metered volume within this [m3]."""


@dataclass(frozen=True)
class Interval:
    """From the day after one reading to the day of the next: metered against logged [m3].

    metered_m3 is NaN where the readings tell nothing. most_m3: what the fields could draw day and
    night. irrigations: how many were logged. shared: they add up to the meter.
    """

    reading: int
    first: date | None
    last: date
    register: float
    restarts: bool
    note: str
    who: str
    metered_m3: float
    logged_m3: float
    most_m3: float
    irrigations: int
    shared: bool

    @property
    def open(self) -> bool:
        """Whether it waits to be shared over the irrigations."""
        return self.metered_m3 > 0 and self.irrigations > 0 and not self.shared

    @property
    def beyond(self) -> bool:
        """Whether more was metered than the fields can draw: a misread register, or a leak."""
        return self.metered_m3 > 1.1 * self.most_m3 > 0


@dataclass(frozen=True, kw_only=True)
class MeterGiven:
    """A meter as stated; raises EntryError."""

    name: str
    farm: str
    fields: tuple[str, ...]
    unit: str = "m3"
    multiplier: float = 1.0
    rolls_over_at: float | None = None

    def __post_init__(self) -> None:
        if not 0 < len(self.name.strip()) <= 80:
            raise EntryError(
                "name is empty or longer than 80 signs; write what stands at the outlet"
            )
        if self.unit not in UNITS:
            raise EntryError(f"unit is {self.unit!r}; choose one of {', '.join(UNITS)}")
        if not 0 < self.multiplier <= 1e6:
            raise EntryError(
                f"multiplier is {self.multiplier:.12g}; give one above 0, such as 1 or 10"
            )
        if self.rolls_over_at is not None and not 10 <= self.rolls_over_at <= 1e12:
            raise EntryError(
                f"rolls_over_at is {self.rolls_over_at:.12g}; give what follows the last number "
                "the register can show, such as 1000000"
            )
        if not self.fields:
            raise EntryError("fields is empty; choose the fields the meter feeds")


def put_meter(
    db: Database, given: MeterGiven, who: str, farms: Farms, key: str | None = None
) -> str:
    """Put up a meter, or change the one of a key; its key. Raises EntryError."""
    with db.write() as session:
        farm = session.scalar(of_farms(select(Farm).where(Farm.key == given.farm), farms))
        if farm is None:
            raise EntryError(f"there is no farm {given.farm!r}")
        meter = store.meter_of(session, key, farms) if key else None
        if key and meter is None:
            raise EntryError(f"there is no meter {key!r}")
        fields = _fields(session, given, farm, meter)
        before = _stated(session, meter) if meter else None
        values = {
            "name": given.name.strip(),
            "farm_id": farm.id,
            "unit": given.unit,
            "multiplier": given.multiplier,
            "rolls_over_at": given.rolls_over_at,
        }
        if meter is None:
            meter = Meter(key=_new_key(session, given.name), **values)
            session.add(meter)
        else:
            for name, value in values.items():
                setattr(meter, name, value)
        session.flush()
        session.execute(delete(MeterField).where(MeterField.meter_id == meter.id))
        session.add_all(MeterField(field_id=field.id, meter_id=meter.id) for field in fields)
        session.flush()
        after = _stated(session, meter)
        if after != before:
            book.note_change(session, who, "meter", meter.key, before, after)
        return meter.key


def _fields(session: Session, given: MeterGiven, farm: Farm, meter: Meter | None) -> list[Field]:
    fields = list(
        session.scalars(select(Field).where(Field.key.in_(given.fields), Field.farm_id == farm.id))
    )
    if missing := set(given.fields) - {field.key for field in fields}:
        raise EntryError(f"there is no field {min(missing)!r} on this farm")
    for field in fields:
        other = session.scalar(
            select(Meter.name)
            .join(MeterField, MeterField.meter_id == Meter.id)
            .where(MeterField.field_id == field.id)
            .where(Meter.id != (meter.id if meter else 0))
        )
        if other is not None:
            raise EntryError(f"field is {field.key!r}; it is fed by the meter {other!r} already")
    return fields


def _stated(session: Session, meter: Meter) -> dict[str, object]:
    fields = sorted({block.field_key for block in store.fed_blocks(session, meter.id)})
    return {
        "name": meter.name, "unit": meter.unit, "multiplier": meter.multiplier,
        "rolls_over_at": meter.rolls_over_at, "fields": fields,
    }  # fmt: skip


def _new_key(session: Session, name: str) -> str:
    stem = re.sub(r"[^a-z0-9]+", "-", name.lower()).strip("-")[:60] or "meter"
    taken = set(session.scalars(select(Meter.key).where(Meter.key.startswith(stem))))
    key, number = stem, 2
    while key in taken:
        key, number = f"{stem}-{number}", number + 1
    return key


def read_meter(
    db: Database,
    key: str,
    day: date,
    register: float,
    who: str,
    token: str,
    today: date,
    farms: Farms = None,
    *,
    restarts: bool = False,
    note: str = "",
) -> int:
    """Keep what a register showed at the end of a day; a second reading of the day takes the
    place of the first. Returns its number; raises EntryError."""
    if day.year < 1980 or day > today:
        raise EntryError(f"day is {day}; give a day from 1980 to {today}")
    with db.write() as session:
        meter = _own(session, key, farms)
        origin = once(token, meter.id)
        already = session.scalar(select(MeterReading.id).where(MeterReading.origin == origin))
        if already is not None:
            return already
        most = math.inf if meter.rolls_over_at is None else meter.rolls_over_at
        if not math.isfinite(register) or not 0 <= register < min(most, 1e12):
            raise EntryError(
                f"register is {register:.12g}; give the number shown, at least 0"
                + (f" and below {most:.12g}" if math.isfinite(most) else "")
            )
        readings = store.standing_readings(session, meter.id)
        replaced = next((one for one in readings if one.day == day), None)
        if meter.rolls_over_at is None:
            _rises(readings, day, register, restarts)
        reading = MeterReading(
            meter_id=meter.id,
            kind="reading",
            day=day,
            register=register,
            restarts=restarts,
            note=note,
            who=who,
            entered=datetime.now(UTC),
            supersedes=None if replaced is None else replaced.id,
            origin=origin,
        )
        session.add(reading)
        session.flush()
        return reading.id


def _rises(readings: Sequence[MeterReading], day: date, register: float, restarts: bool) -> None:
    """EntryError where a register that does not roll over would run backwards."""
    before = [one for one in readings if one.day < day]
    after = [one for one in readings if one.day > day]
    if before and not restarts and register < before[-1].register:
        raise EntryError(
            f"register is {register:.12g}; on {before[-1].day} it showed "
            f"{before[-1].register:.12g}, so say that the meter was changed, "
            "or state at what number it rolls over"
        )
    if after and not after[0].restarts and register > after[0].register:
        raise EntryError(
            f"register is {register:.12g}; on {after[0].day} it showed "
            f"{after[0].register:.12g}, which is less, so look at both again"
        )


def void_reading(
    db: Database, key: str, number: int, who: str, token: str, farms: Farms = None
) -> None:
    """Delete a reading: it stays in the record and no longer counts. Raises EntryError."""
    with db.write() as session:
        meter = _own(session, key, farms)
        origin = once(token, meter.id)
        if session.scalar(select(MeterReading.id).where(MeterReading.origin == origin)):
            return
        old = _reading(session, meter, number)
        session.add(
            MeterReading(
                meter_id=meter.id, kind="void", day=old.day, register=old.register,
                restarts=False, note="", who=who, entered=datetime.now(UTC), supersedes=old.id,
                origin=origin,
            )
        )  # fmt: skip


def intervals(session: Session, meter: Meter) -> list[Interval]:
    """Every reading with what it tells of the time since the one before, by day."""
    blocks = {block.block_id: block for block in store.fed_blocks(session, meter.id)}
    readings = store.standing_readings(session, meter.id)
    water = store.drawn(session, sorted(blocks), sorted(COUNTED), meter.key)
    turned = passed(
        [one.register for one in readings],
        np.array([one.restarts for one in readings], np.bool_),
        meter.rolls_over_at,
    )
    flow = sum(10 * block.area_ha * block.system["rate_mm_h"] for block in blocks.values())
    found = []
    for n, (one, units) in enumerate(zip(readings, turned, strict=True)):
        first = readings[n - 1].day + timedelta(days=1) if n else None
        own = [event for event in water if first is not None and first <= event.day <= one.day]
        volume = float(units) * meter.multiplier * UNITS[meter.unit]
        metered = [event for event in own if event.details.get("meter") == meter.key]
        total = sum(event.amount for event in metered)
        found.append(
            Interval(
                reading=one.id,
                first=first,
                last=one.day,
                register=one.register,
                restarts=one.restarts,
                note=one.note,
                who=one.who,
                metered_m3=volume,
                logged_m3=sum(_volume(event, blocks[event.block_id]) for event in own),
                most_m3=flow * 24 * ((one.day - first).days + 1 if first else 0),
                irrigations=len(own),
                shared=bool(own) and len(metered) == len(own) and abs(total - volume) <= SAME_M3,
            )
        )
    return found


def _volume(event: store.Drawn, block: store.FedBlock) -> float:
    """Water of an irrigation as entered [m3]: hours x flow, depth x area, or the volume."""
    if event.entered_unit == "volume_m3":
        return event.entered_amount
    gross, _ = gross_and_net(
        event.entered_amount, event.entered_unit, event.purpose, block.system, block.area_ha,
        event.details.get("area_share", 1.0),
    )  # fmt: skip
    return 10 * block.area_ha * gross


def share_out(
    db: Database, key: str, number: int, who: str, token: str, today: date, farms: Farms = None
) -> int:
    """Share what passed since the reading before over the irrigations logged then, by hours x
    flow; each is then metered. Returns how many; raises EntryError."""
    with db.write() as session:
        meter = _own(session, key, farms)
        _reading(session, meter, number)
        told = next(one for one in intervals(session, meter) if one.reading == number)
        if told.first is None or not told.metered_m3 > 0:
            raise EntryError(f"the reading of {told.last} tells of no water since one before it")
        if not told.irrigations:
            raise EntryError(
                f"no irrigation is logged from {told.first} to {told.last}; log them first"
            )
        if told.shared:
            return told.irrigations
        blocks = {block.block_id: block for block in store.fed_blocks(session, meter.id)}
        water = [
            event
            for event in store.drawn(session, sorted(blocks), sorted(COUNTED), meter.key)
            if told.first <= event.day <= told.last
        ]
        weights = [_volume(event, blocks[event.block_id]) for event in water]
        for event, volume in zip(water, shared_out(told.metered_m3, weights), strict=True):
            old = session.get(Event, event.event_id)
            assert old is not None
            session.add(
                Event(
                    block_id=old.block_id,
                    kind=old.kind,
                    day=old.day,
                    amount=float(volume),
                    unit="volume_m3",
                    purpose=old.purpose,
                    confirmation="metered",
                    details={**(old.details or {}), "meter": meter.key, "reading": number},
                    note=old.note,
                    who=who,
                    entered=datetime.now(UTC),
                    supersedes=old.id,
                    origin=once(f"meter-{token}", old.id),
                )
            )
            book.dirty_blocks(session, [old.block_id], old.day)
        session.flush()
        up_to_date(session, today)
        return len(water)


def _own(session: Session, key: str, farms: Farms) -> Meter:
    meter = store.meter_of(session, key, farms)
    if meter is None:
        raise EntryError(f"there is no meter {key!r}")
    return meter


def _reading(session: Session, meter: Meter, number: int) -> MeterReading:
    readings = store.standing_readings(session, meter.id)
    found = next((one for one in readings if one.id == number), None)
    if found is None:
        raise EntryError(f"there is no reading {number} of this meter; look at it again")
    return found
