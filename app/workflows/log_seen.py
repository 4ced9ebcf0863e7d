"""Log what was seen or decided on a field: stages, cover, cuttings, readings, keep-offs, notes.

Like water, nothing is overwritten, a form sent twice changes nothing, and ledgers and advice follow
in the same transaction. What was wrong is deleted (`log_event.void_event`) and said again.
"""

from collections.abc import Callable, Sequence
from datetime import UTC, date, datetime, timedelta
from typing import Any

from pydantic import ValidationError
from sqlalchemy import select
from sqlalchemy.orm import Session

from app.book.reading import ReadingPart
from app.storage import book
from app.storage.database import Database
from app.storage.tables import Block, Event
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.log_event import blocks_of
from app.workflows.once import EntryError, once
from app.workflows.stretches import seasons_of

OF_A_CROP = ("stage", "cover", "cutting")
LONGEST_KEEP_OFF = timedelta(days=120)
Details = dict[str, Any]


def log_seen(
    db: Database,
    field_key: str,
    block_key: str | None,
    kind: str,
    day: date,
    who: str,
    token: str,
    today: date,
    *,
    amount: float = 0.0,
    details: Details | None = None,
    note: str | None = None,
) -> int:
    """Log something seen on a field, or on one of its blocks; returns the first event's number.

    kind stage: amount 1 to 4; cover: amount 0-1 and details `height_m`; cutting; reading: details
    as `ReadingPart`; keep_off: details `last`, its last day; note: what it says. Raises EntryError.
    """
    told = check_seen(kind, day, today, amount, details, note)
    with db.write() as session:
        blocks = blocks_of(session, field_key, block_key)
        number, new = put_seen(session, blocks, kind, day, who, token, amount, told, note)
        if new and kind != "note":
            up_to_date(session, today)
        return number


def check_seen(
    kind: str, day: date, today: date, amount: float, details: Details | None, note: str | None
) -> Details | None:
    """The details as kept; EntryError where what was seen cannot be as stated."""
    if kind not in KINDS:
        raise EntryError(f"kind is {kind!r}; choose one of {', '.join(KINDS)}")
    if day.year < 1980 or (day > today and kind != "keep_off"):
        raise EntryError(f"day is {day}; give a day from 1980 to {today}")
    return KINDS[kind](day, amount, details or {}, note or "")


def put_seen(
    session: Session,
    blocks: Sequence[Block],
    kind: str,
    day: date,
    who: str,
    token: str,
    amount: float,
    told: Details | None,
    note: str | None,
) -> tuple[int, bool]:
    """Keep what was seen, as checked, and mark its blocks dirty: the number, and False if it was
    there. EntryError where the season cannot have it."""
    already = session.scalar(select(Event.id).where(Event.origin == once(token, blocks[0].id)))
    if already is not None:
        return already, False
    events = [
        Event(
            block_id=block.id,
            kind=kind,
            day=day,
            amount=amount,
            unit="",
            purpose="crop",
            confirmation="measured",
            details=told,
            note=note,
            who=who,
            entered=datetime.now(UTC),
            origin=once(token, block.id),
        )
        for block in blocks
    ]
    session.add_all(events)
    session.flush()
    numbers = [block.id for block in blocks]
    if kind in OF_A_CROP:
        _fits_a_season(session, numbers, kind, day)
    if kind != "note":
        # a reading before six in the morning corrects the close of the day before
        since = day - timedelta(days=1) if kind == "reading" else day
        book.dirty_blocks(session, numbers, since)
    return events[0].id, True


def _stage(day: date, amount: float, details: Details, note: str) -> Details | None:
    if amount not in (1, 2, 3, 4):
        raise EntryError(f"stage is {amount:g}; choose 1 initial, 2 development, 3 mid or 4 late")
    return None


def _cover(day: date, amount: float, details: Details, note: str) -> Details | None:
    height = details.get("height_m")
    if not 0 <= amount <= 1:
        raise EntryError(f"cover is {amount:g}; give a fraction of the ground, 0 to 1")
    if not isinstance(height, int | float) or not 0 < height <= 30:
        raise EntryError(f"height_m is {height}; give the crop's height in metres, 0 to 30")
    return {"height_m": float(height)}


def _cutting(day: date, amount: float, details: Details, note: str) -> Details | None:
    return None


def _reading(day: date, amount: float, details: Details, note: str) -> Details | None:
    try:
        part = ReadingPart.model_validate(details)
    except ValidationError as error:
        first = error.errors()[0]
        place = ".".join(map(str, first["loc"])) or "the reading"
        said = str(first["msg"]).removeprefix("Value error, ")
        raise EntryError(f"{place}: {said}") from None
    if part.trust == "none" and not note.strip():
        raise EntryError("note is empty; say why the reading is set aside")
    return part.model_dump(mode="json")


def _keep_off(day: date, amount: float, details: Details, note: str) -> Details | None:
    last = details.get("last")
    if not isinstance(last, date) or not day <= last <= day + LONGEST_KEEP_OFF:
        raise EntryError(
            f"last is {last}; give a last day from {day} on, at most {LONGEST_KEEP_OFF.days} days "
            "later"
        )
    return {"last": str(last)}


def _note(day: date, amount: float, details: Details, note: str) -> Details | None:
    if not note.strip():
        raise EntryError("note is empty; say what was seen")
    return None


KINDS: dict[str, Callable[[date, float, Details, str], Details | None]] = {
    "stage": _stage,
    "cover": _cover,
    "cutting": _cutting,
    "reading": _reading,
    "keep_off": _keep_off,
    "note": _note,
}
"""What can be seen, and what checks its figures and gives the details as kept."""


def _fits_a_season(session: Session, blocks: list[int], kind: str, day: date) -> None:
    """EntryError where nothing grows on the day, or what was seen cannot be of the season."""
    try:
        growing = {
            season.block_id
            for season, crop in seasons_of(session, blocks)
            if season.planting <= day and str(crop.last_day) >= str(day)
        }
    except ValueError as error:
        raise EntryError(f"{kind} on {day} does not fit the season: {error}") from None
    if growing != set(blocks):
        raise EntryError(f"day is {day}; no crop grows on all of the field then")
