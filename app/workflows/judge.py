"""What people say of a station's sensors; station days, ledgers and advice follow at once.

A span of readings marked bad is set aside, never deleted; marked good, no check sets it aside. The
sensor log holds calibrations, whose factor counts from its day on, and what was done at the mast.
Nothing is edited: taking a word back is a row that supersedes.
"""

import math
from datetime import UTC, date, datetime, time, timedelta, timezone

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.science.quantities import QUANTITIES
from app.storage import book, judgement
from app.storage.database import Database
from app.storage.tables import SensorEntry, SpanMark, Station
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.once import EntryError, once

VERDICTS = ("bad", "good")
KINDS = ("calibration", "cleaning", "levelling", "moved", "note")
FACTORS = (0.5, 2.0)
"""A calibration outside these is a slip of the pen (working value)."""
LONGEST_TEXT = 400


def mark_span(
    db: Database,
    station_key: str,
    quantity: str,
    first: date,
    last: date,
    verdict: str,
    why: str,
    who: str,
    token: str,
    today: date,
    from_time: time = time.min,
    to_time: time | None = None,
) -> int:
    """Mark a quantity's readings bad or good, local standard time, both days included.

    Without times the span is whole days. Returns the mark's number; the same token again changes
    nothing. Raises EntryError.
    """
    if quantity not in QUANTITIES:
        raise EntryError(f"there is no quantity {quantity!r}")
    if verdict not in VERDICTS:
        raise EntryError(f"verdict is {verdict!r}; choose bad or good")
    said = _text(why, "why")
    with db.write() as session:
        station = _station(session, station_key)
        zone = timezone(timedelta(hours=station.details["utc_offset_h"]))
        start = datetime.combine(first, from_time, zone)
        end = (
            datetime.combine(last + timedelta(days=1), time.min, zone)
            if to_time is None
            else datetime.combine(last, to_time, zone)
        )
        if end <= start:
            raise EntryError(f"the span ends {end:%Y-%m-%d %H:%M}, not after its start")
        origin = once(token, station.id)
        already = session.scalar(select(SpanMark.id).where(SpanMark.origin == origin))
        if already is not None:
            return already
        mark = SpanMark(
            station_id=station.id,
            quantity=quantity,
            first=start,
            last=end,
            verdict=verdict,
            why=said,
            who=who,
            entered=datetime.now(UTC),
            origin=origin,
        )
        session.add(mark)
        session.flush()
        _follow(session, station, first, today)
        return mark.id


def log_sensor(
    db: Database,
    station_key: str,
    kind: str,
    day: date,
    note: str,
    who: str,
    token: str,
    today: date,
    quantity: str | None = None,
    factor: float | None = None,
) -> int:
    """Add a line to a station's sensor log; raises EntryError.

    A calibration names its quantity and the factor that multiplies the readings from `day` on, in
    place of the factor before.
    """
    if kind not in KINDS:
        raise EntryError(f"kind is {kind!r}; choose one of {', '.join(KINDS)}")
    if quantity is not None and quantity not in QUANTITIES:
        raise EntryError(f"there is no quantity {quantity!r}")
    if kind == "calibration":
        if quantity is None or factor is None:
            raise EntryError("a calibration needs the quantity and the factor")
        if not (math.isfinite(factor) and FACTORS[0] <= factor <= FACTORS[1]):
            raise EntryError(
                f"factor is {factor:g}; it multiplies the readings and must lie between "
                f"{FACTORS[0]:g} and {FACTORS[1]:g}"
            )
    elif factor is not None:
        raise EntryError("only a calibration has a factor")
    said = _text(note, "note") if kind != "calibration" or note.strip() else ""
    with db.write() as session:
        station = _station(session, station_key)
        origin = once(token, station.id)
        already = session.scalar(select(SensorEntry.id).where(SensorEntry.origin == origin))
        if already is not None:
            return already
        entry = SensorEntry(
            station_id=station.id,
            quantity=quantity,
            day=day,
            kind=kind,
            factor=factor,
            note=said,
            who=who,
            entered=datetime.now(UTC),
            origin=origin,
        )
        session.add(entry)
        session.flush()
        if kind == "calibration":
            _follow(session, station, day, today)
        return entry.id


def take_back_mark(db: Database, mark_id: int, who: str, token: str, today: date) -> None:
    """A mark no longer counts; it stays in the history. Raises EntryError."""
    with db.write() as session:
        old = session.get(SpanMark, mark_id)
        if old is None or old.verdict == judgement.VOID:
            raise EntryError(f"there is no mark {mark_id}")
        if judgement.superseded(session, old):
            return
        station = session.get_one(Station, old.station_id)
        session.add(
            SpanMark(
                station_id=old.station_id,
                quantity=old.quantity,
                first=old.first,
                last=old.last,
                verdict=judgement.VOID,
                why=old.why,
                who=who,
                entered=datetime.now(UTC),
                supersedes=old.id,
                origin=once(token, old.station_id),
            )
        )
        session.flush()
        zone = timezone(timedelta(hours=station.details["utc_offset_h"]))
        _follow(session, station, old.first.astimezone(zone).date(), today)


def take_back_entry(db: Database, entry_id: int, who: str, token: str, today: date) -> None:
    """An entry of the sensor log no longer counts; it stays in the history."""
    with db.write() as session:
        old = session.get(SensorEntry, entry_id)
        if old is None or old.kind == judgement.VOID:
            raise EntryError(f"there is no entry {entry_id} in a sensor log")
        if judgement.superseded(session, old):
            return
        session.add(
            SensorEntry(
                station_id=old.station_id,
                quantity=old.quantity,
                day=old.day,
                kind=judgement.VOID,
                factor=old.factor,
                note=old.note,
                who=who,
                entered=datetime.now(UTC),
                supersedes=old.id,
                origin=once(token, old.station_id),
            )
        )
        session.flush()
        if old.kind == "calibration":
            _follow(session, session.get_one(Station, old.station_id), old.day, today)


def _station(session: Session, key: str) -> Station:
    station = book.find(session, Station, key)
    if station is None:
        raise EntryError(f"there is no station {key!r}")
    return station


def _text(text: str, name: str) -> str:
    said = " ".join(text.split())
    if not said:
        raise EntryError(f"{name} is empty; say in a few words what was seen")
    if len(said) > LONGEST_TEXT:
        raise EntryError(f"{name} is longer than {LONGEST_TEXT} letters; say it shorter")
    return said


def _follow(session: Session, station: Station, since: date, today: date) -> None:
    book.dirty_station(session, station.id, since)
    up_to_date(session, today)
