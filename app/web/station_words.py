"""What people say of a station's sensors, worded: marks that stand, and the sensor log."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date, datetime, timedelta, timezone

from sqlalchemy.orm import Session

from app import wording
from app.science.quantities import QUANTITIES
from app.storage import judgement
from app.storage.pages import StationRow

KINDS = {
    "calibration": "calibration",
    "cleaning": "cleaning",
    "levelling": "levelling",
    "moved": "moved",
    "note": "note",
}


@dataclass(frozen=True)
class MarkLine:
    """A mark that stands."""

    id: int
    span: str
    quantity: str
    verdict: str
    why: str
    who: str
    entered: date


@dataclass(frozen=True)
class LogLine:
    """A line of the sensor log that stands."""

    id: int
    day: date
    kind: str
    quantity: str
    factor: str
    note: str
    who: str


@dataclass(frozen=True)
class Said:
    """All that is said of a station, newest first, and what may be chosen in the forms."""

    marks: tuple[MarkLine, ...]
    log: tuple[LogLine, ...]
    quantities: Mapping[str, str]
    kinds: Mapping[str, str]


def span_said(first: datetime, last: datetime, utc_offset_h: float) -> str:
    """`9 July 2026`, `9 July 2026 to 11 July 2026`, or with times, in local standard time."""
    zone = timezone(timedelta(hours=utc_offset_h))
    start, end = first.astimezone(zone), last.astimezone(zone)
    midnight = datetime.min.time()
    if start.time() == midnight and end.time() == midnight:
        last_day = (end - timedelta(days=1)).date()
        whole = wording.full_day(start.date())
        return whole if start.date() == last_day else f"{whole} to {wording.full_day(last_day)}"
    return (
        f"{wording.full_day(start.date())} {start:%H:%M} to "
        f"{wording.full_day(end.date())} {end:%H:%M}"
    )


def said_of(session: Session, station: StationRow) -> Said:
    """What stands of a station's marks and sensor log."""
    offset = float(station.details.get("utc_offset_h", 0.0))
    marks = judgement.marks(session, station.id)
    log = judgement.sensor_log(session, station.id)
    return Said(
        marks=tuple(
            MarkLine(
                mark.id,
                span_said(mark.first, mark.last, offset),
                wording.word(wording.QUANTITIES, mark.quantity),
                mark.verdict,
                mark.why,
                mark.who,
                mark.entered.date(),
            )
            for mark in reversed(marks)
        ),
        log=tuple(
            LogLine(
                entry.id,
                entry.day,
                KINDS.get(entry.kind, entry.kind),
                wording.word(wording.QUANTITIES, entry.quantity) if entry.quantity else "",
                "" if entry.factor is None else f"{entry.factor:.4g}",
                entry.note,
                entry.who,
            )
            for entry in reversed(log)
        ),
        quantities={name: wording.word(wording.QUANTITIES, name) for name in QUANTITIES},
        kinds=KINDS,
    )
