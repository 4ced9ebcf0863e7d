"""Log, correct and delete events; ledgers and advice follow in the same transaction.

Nothing is overwritten: a correction or deletion is a new row that supersedes. A form carries a
once-only token, so that sending it twice changes nothing.
"""

import math
from datetime import UTC, date, datetime, timedelta

from sqlalchemy import select
from sqlalchemy.exc import IntegrityError
from sqlalchemy.orm import Session

from app.storage import book
from app.storage.database import Database
from app.storage.events import VOID, head_of
from app.storage.tables import Block, Event, Field
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.once import EntryError, once

UNITS = {"hours": 1000.0, "gross_mm": 1000.0, "net_mm": 1000.0, "volume_m3": 1e8, "rain_mm": 1000.0}
"""The greatest amount taken in each unit; more is a slip of the pen."""
PURPOSES = {"crop", "pre-plant", "germination", "leaching", "frost", "cooling", "injection"}
CONFIRMATIONS = {"advised", "presumed", "reported", "metered", "measured"}


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
    """Log water put on a field, or on one of its blocks; a volume is shared by area.

    Returns the number of the (first) event. Raises EntryError.
    """
    if unit == "rain_mm":
        raise EntryError("rain is logged as rain, not as irrigation")
    if purpose not in PURPOSES:
        raise EntryError(f"purpose is {purpose!r}; choose one of {', '.join(sorted(PURPOSES))}")
    if confirmation not in CONFIRMATIONS:
        choices = ", ".join(sorted(CONFIRMATIONS))
        raise EntryError(f"confirmation is {confirmation!r}; choose one of {choices}")
    _check(day, amount, unit, today)
    return _log(
        db, "irrigation", field_key, block_key, day, amount, unit, purpose, confirmation, note,
        who, token, today,
    )  # fmt: skip


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
    """Log rain of a field's own gauge, in place of its station's; raises EntryError."""
    _check(day, rain_mm, "rain_mm", today)
    return _log(
        db, "rain", field_key, None, day, rain_mm, "rain_mm", "crop", "measured", note,
        who, token, today,
    )  # fmt: skip


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
) -> int:
    """Put a corrected entry in place of an event; raises EntryError."""
    _check(day, amount, unit, today)
    return _supersede(db, event_id, None, day, amount, unit, note, who, token, today)


def void_event(db: Database, event_id: int, who: str, token: str, today: date) -> None:
    """Delete an event: it stays in the history and no longer counts; raises EntryError."""
    _supersede(db, event_id, VOID, None, None, None, None, who, token, today)


def _check(day: date, amount: float, unit: str, today: date) -> None:
    if unit not in UNITS:
        raise EntryError(f"unit is {unit!r}; choose one of {', '.join(UNITS)}")
    if not math.isfinite(amount) or amount < 0 or (amount == 0 and unit != "rain_mm"):
        raise EntryError(f"amount is {amount:g}; it must be a number above 0")
    if amount > UNITS[unit]:
        raise EntryError(f"amount is {amount:g} {unit}; more than {UNITS[unit]:g} is not taken")
    if day > today + timedelta(days=1):
        raise EntryError(f"day is {day}; log water when it has run, at the latest for tomorrow")
    if day.year < 1980:
        raise EntryError(f"day is {day}; give a day from 1980 on")


def _log(
    db: Database,
    kind: str,
    field_key: str,
    block_key: str | None,
    day: date,
    amount: float,
    unit: str,
    purpose: str,
    confirmation: str,
    note: str | None,
    who: str,
    token: str,
    today: date,
) -> int:
    with db.write() as session:
        wanted = select(Block).join(Field).where(Field.key == field_key).order_by(Block.id)
        if block_key is not None:
            wanted = wanted.where(Block.key == block_key)
        blocks = list(session.scalars(wanted))
        if not blocks:
            part = f" with a block {block_key!r}" if block_key else ""
            raise EntryError(f"there is no field {field_key!r}{part}")
        origin = once(token, blocks[0].id)
        already = session.scalar(select(Event.id).where(Event.origin == origin))
        if already is not None:
            return already
        area = sum(block.area_ha for block in blocks)
        numbers = []
        for block in blocks:
            share = block.area_ha / area if unit == "volume_m3" else 1.0
            event = Event(
                block_id=block.id,
                kind=kind,
                day=day,
                amount=amount * share,
                unit=unit,
                purpose=purpose,
                confirmation=confirmation,
                note=note,
                who=who,
                entered=datetime.now(UTC),
                origin=once(token, block.id),
            )
            session.add(event)
            session.flush()
            numbers.append(event.id)
        book.dirty_blocks(session, [block.id for block in blocks], day)
        up_to_date(session, today)
        return numbers[0]


def _supersede(
    db: Database,
    event_id: int,
    kind: str | None,
    day: date | None,
    amount: float | None,
    unit: str | None,
    note: str | None,
    who: str,
    token: str,
    today: date,
) -> int:
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
            if unit is not None and (old.kind == "rain") != (unit == "rain_mm"):
                raise EntryError(f"event {event_id} is {old.kind}; it cannot become {unit}")
            event = Event(
                block_id=old.block_id,
                kind=kind or old.kind,
                day=day or old.day,
                amount=old.amount if amount is None else amount,
                unit=unit or old.unit,
                purpose=old.purpose,
                confirmation=old.confirmation,
                note=note if note is not None else old.note,
                who=who,
                entered=datetime.now(UTC),
                supersedes=old.id,
                origin=origin,
            )
            session.add(event)
            session.flush()
            book.dirty_blocks(session, [old.block_id], min(old.day, event.day))
            up_to_date(session, today)
            return event.id
    except IntegrityError:
        raise EntryError(_CHANGED) from None


_CHANGED = "this entry was changed by somebody else meanwhile; look at it again"


def _still_stands(session: Session, event: Event) -> None:
    if head_of(session, event).id != event.id:
        raise EntryError(_CHANGED)
