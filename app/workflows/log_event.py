"""Log, correct and delete events; ledgers and advice follow in the same transaction.

Nothing is overwritten: a correction or deletion is a new row that supersedes. A form carries a
once-only token, so that sending it twice changes nothing.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from typing import Any

from sqlalchemy import select
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session

from app.storage import book
from app.storage.database import Database
from app.storage.events import VOID, head_of, presumed_near
from app.storage.scope import Farms, of_farms
from app.storage.tables import Block, Event, Farm, Field
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.once import EntryError, once

UNITS = {"hours": 1000.0, "gross_mm": 1000.0, "net_mm": 1000.0, "volume_m3": 1e8, "rain_mm": 1000.0}
"""The greatest amount taken in each unit; more is a slip of the pen."""
PURPOSES = {"crop", "pre-plant", "germination", "leaching", "frost", "cooling", "injection"}
CONFIRMATIONS = {"advised", "presumed", "reported", "metered", "measured"}


@dataclass(frozen=True, kw_only=True)
class Water:
    """Water as it was entered: irrigation of a block, or rain of the field's own gauge (rain_mm).

    area_share: part of the block that was watered, above 0 to 1; wetted_fraction: of the surface
    by this application, where it was not by the block's own system. Raises EntryError.
    """

    day: date
    amount: float
    unit: str
    purpose: str = "crop"
    confirmation: str = "reported"
    note: str | None = None
    area_share: float = 1.0
    wetted_fraction: float | None = None

    def __post_init__(self) -> None:
        for name, choices in (
            ("unit", list(UNITS)),
            ("purpose", sorted(PURPOSES)),
            ("confirmation", sorted(CONFIRMATIONS)),
        ):
            if getattr(self, name) not in choices:
                raise EntryError(
                    f"{name} is {getattr(self, name)!r}; choose one of {', '.join(choices)}"
                )
        if not math.isfinite(self.amount) or self.amount < 0:
            raise EntryError(f"amount is {self.amount:g}; it must be a number above 0")
        if self.amount == 0 and not self.rain:
            raise EntryError("amount is 0; it must be a number above 0")
        if self.amount > (most := UNITS[self.unit]):
            raise EntryError(
                f"amount is {self.amount:g} {self.unit}; more than {most:g} is not taken"
            )
        if self.day.year < 1980:
            raise EntryError(f"day is {self.day}; give a day from 1980 on")
        if not 0 < self.area_share <= 1:
            raise EntryError(
                f"area_share is {self.area_share:g}; give the part watered, above 0 and at most 1"
            )
        if self.wetted_fraction is not None and not 0.01 <= self.wetted_fraction <= 1:
            raise EntryError(f"wetted_fraction is {self.wetted_fraction:g}; give 0.01 to 1")
        if self.rain and (self.area_share != 1 or self.wetted_fraction is not None):
            raise EntryError("area_share is for irrigation; rain falls on the whole field")

    @property
    def rain(self) -> bool:
        """Whether it is rain of the field's own gauge."""
        return self.unit == "rain_mm"

    @property
    def details(self) -> dict[str, float] | None:
        """What is kept beside the amount, None where nothing is out of the ordinary."""
        told = {} if self.area_share == 1 else {"area_share": self.area_share}
        if self.wetted_fraction is not None:
            told["wetted_fraction"] = self.wetted_fraction
        return told or None


def log_water(
    db: Database,
    field_key: str,
    block_key: str | None,
    water: Water,
    who: str,
    token: str,
    today: date,
) -> int:
    """Log water on a field, or on one of its blocks; a volume is shared by area.

    Returns the number of the (first) event. Raises EntryError.
    """
    with db.write() as session:
        number = put_water(session, field_key, block_key, water, who, token, today)
        up_to_date(session, today)
        return number


def log_irrigation(
    db: Database,
    field_key: str,
    block_key: str | None,
    day: date,
    amount: float,
    unit: str,
    who: str,
    token: str,
    today: date,
    purpose: str = "crop",
    confirmation: str = "reported",
    note: str | None = None,
) -> int:
    """Log water put on a field, or on one of its blocks; as `log_water`."""
    if unit == "rain_mm":
        raise EntryError("rain is logged as rain, not as irrigation")
    water = Water(
        day=day, amount=amount, unit=unit, purpose=purpose, confirmation=confirmation, note=note
    )
    return log_water(db, field_key, block_key, water, who, token, today)


def log_rain(
    db: Database,
    field_key: str,
    day: date,
    rain_mm: float,
    who: str,
    token: str,
    today: date,
    note: str | None = None,
) -> int:
    """Log rain of a field's own gauge, in place of its station's; as `log_water`."""
    water = Water(day=day, amount=rain_mm, unit="rain_mm", confirmation="measured", note=note)
    return log_water(db, field_key, None, water, who, token, today)


def correct_event(
    db: Database,
    event_id: int,
    day: date,
    amount: float,
    unit: str,
    who: str,
    token: str,
    today: date,
    note: str | None = None,
    *,
    purpose: str | None = None,
    confirmation: str | None = None,
    area_share: float | None = None,
) -> int:
    """Put a corrected entry in place of an event; what is None stays. Raises EntryError."""

    def change(old: Event) -> Water:
        kept = old.details or {}
        return Water(
            day=_at_hand(day, today),
            amount=amount,
            unit=unit,
            purpose=purpose or old.purpose,
            confirmation=confirmation or old.confirmation,
            note=old.note if note is None else note,
            area_share=kept.get("area_share", 1.0) if area_share is None else area_share,
            wetted_fraction=kept.get("wetted_fraction"),
        )

    return _supersede(db, event_id, change, who, token, today)


def void_event(db: Database, event_id: int, who: str, token: str, today: date) -> None:
    """Delete an event: it stays in the history and no longer counts; raises EntryError."""
    _supersede(db, event_id, None, who, token, today)


def _at_hand(day: date, today: date) -> date:
    if day > today + timedelta(days=1):
        raise EntryError(f"day is {day}; log water when it has run, at the latest for tomorrow")
    return day


def blocks_of(
    session: Session, field_key: str, block_key: str | None, farms: Farms = None
) -> list[Block]:
    """The blocks of a field of some farms, or the one named; raises EntryError for none."""
    wanted = select(Block).join(Field).join(Farm).where(Field.key == field_key).order_by(Block.id)
    if block_key is not None:
        wanted = wanted.where(Block.key == block_key)
    blocks = list(session.scalars(of_farms(wanted, farms)))
    if not blocks:
        part = f" with a block {block_key!r}" if block_key else ""
        raise EntryError(f"there is no field {field_key!r}{part}")
    return blocks


def put_water(
    session: Session,
    field_key: str,
    block_key: str | None,
    water: Water,
    who: str,
    token: str,
    today: date,
) -> int:
    """`log_water` in the caller's transaction; the ledgers are left dirty.

    What was only presumed of the same application gives way to it.
    """
    _at_hand(water.day, today)
    blocks = blocks_of(session, field_key, block_key)
    already = session.scalar(select(Event.id).where(Event.origin == once(token, blocks[0].id)))
    if already is not None:
        return already
    area = sum(block.area_ha for block in blocks)
    numbers = []
    for block in blocks:
        share = block.area_ha / area if water.unit == "volume_m3" else 1.0
        given_way = None if water.rain else presumed_near(session, block.id, water.day)
        event = Event(
            block_id=block.id,
            kind="rain" if water.rain else "irrigation",
            day=water.day,
            amount=water.amount * share,
            unit=water.unit,
            purpose=water.purpose,
            confirmation=water.confirmation,
            details=water.details,
            note=water.note,
            who=who,
            entered=datetime.now(UTC),
            origin=once(token, block.id),
            supersedes=None if given_way is None else given_way.id,
        )
        session.add(event)
        session.flush()
        numbers.append(event.id)
        first = water.day if given_way is None else min(water.day, given_way.day)
        book.dirty_blocks(session, [block.id], first)
    return numbers[0]


def _supersede(
    db: Database,
    event_id: int,
    change: Callable[[Event], Water] | None,
    who: str,
    token: str,
    today: date,
) -> int:
    """Put what `change` makes of an event in its place; a deletion where there is none."""
    try:
        with db.write() as session:
            old = session.get(Event, event_id)
            if old is None or old.kind == VOID:
                raise EntryError(f"there is no event {event_id}")
            origin = once(token, old.block_id)
            already = session.scalar(select(Event.id).where(Event.origin == origin))
            if already is not None:
                return already
            _still_stands(session, old)
            event = Event(
                block_id=old.block_id,
                who=who,
                entered=datetime.now(UTC),
                supersedes=old.id,
                origin=origin,
                **(_void(old) if change is None else _changed(old, change(old))),
            )
            session.add(event)
            session.flush()
            book.dirty_blocks(session, [old.block_id], min(old.day, event.day))
            up_to_date(session, today)
            return event.id
    except IntegrityError:
        raise EntryError(_CHANGED) from None


KEPT = ("day", "amount", "unit", "purpose", "confirmation", "note", "details")


def _void(old: Event) -> dict[str, Any]:
    return {"kind": VOID, **{name: getattr(old, name) for name in KEPT}}


def _changed(old: Event, water: Water) -> dict[str, Any]:
    if (old.kind == "rain") != water.rain:
        raise EntryError(f"event {old.id} is {old.kind}; it cannot become {water.unit}")
    return {"kind": old.kind, **{name: getattr(water, name) for name in KEPT}}


_CHANGED = "this entry was changed by somebody else meanwhile; look at it again"


def _still_stands(session: Session, event: Event) -> None:
    if head_of(session, event).id != event.id:
        raise EntryError(_CHANGED)
