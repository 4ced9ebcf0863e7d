"""What an intake changes: rows that are there already, rows that differ, the days they touch.

Works through some weeks of days at a time, so that a file of years needs little memory.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date, timedelta
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy.orm import Session

from app.intake import Clock, Rows, fold, station_day, unpack
from app.intake.model import Floats, Instants
from app.storage.series import applied_packs
from app.storage.tables import Intake

WINDOW = 64
"""Days compared at a time."""
LONGEST = 1 << 20
"""More than the seconds of any interval."""


@dataclass(frozen=True)
class Compared:
    """Rows that are stored the same, rows that differ from what is stored, days that change."""

    same: int
    differing: int
    days: list[date]


def compare(session: Session, station: int, rows: Rows, clock: Clock) -> Compared:
    """What `rows` would change if they were laid over a station's stored rows."""
    days = station_day(rows.instant, rows.interval_s, clock)
    same, differing, changed = 0, 0, set[date]()
    for first, last in windows(days):
        inside = (days >= first) & (days <= last)
        stored = stored_rows(session, station, as_day(first), as_day(last))
        if not len(stored):
            changed |= {as_day(day) for day in np.unique(days[inside])}
            continue
        mine = rows if inside.all() else _chosen(rows, inside)
        moved = _moved(stored, fold([stored, mine]))
        there = _holds(_identity(stored), _identity(mine))
        others = int((there & _holds(moved, _identity(mine))).sum())
        same += int(there.sum()) - others
        differing += others
        changed |= set(_days_of(moved, clock))
    return Compared(same, differing, sorted(changed))


def changed_without(session: Session, intake: Intake, clock: Clock) -> list[date]:
    """Days of a station that would differ if an applied intake were not there."""
    if intake.first_day is None or intake.last_day is None:
        return []
    changed: set[date] = set()
    span = np.array([(day - EPOCH).days for day in (intake.first_day, intake.last_day)])
    for first, last in windows(span):
        days = as_day(first), as_day(last)
        with_it = stored_rows(session, intake.station_id, *days)
        without = stored_rows(session, intake.station_id, *days, leaving_out=intake.id)
        changed |= set(_days_of(_moved(with_it, without), clock))
    return sorted(changed)


def windows(days: NDArray[np.int64]) -> Iterator[tuple[int, int]]:
    """First and last day number of each window from the earliest to the latest of `days`."""
    if days.size:
        for first in range(int(days.min()), int(days.max()) + 1, WINDOW):
            yield first, min(first + WINDOW - 1, int(days.max()))


def stored_rows(
    session: Session, station: int, first: date, last: date, leaving_out: int | None = None
) -> Rows:
    """A station's rows of some days: its applied intakes folded in order."""
    packs = applied_packs(session, station, first, last, leaving_out)
    return fold([unpack(blob) for blob in packs])


EPOCH = date(1970, 1, 1)


def as_day(number: Any) -> date:
    """Day number since 1970-01-01 as a date."""
    return EPOCH + timedelta(days=int(number))


def _chosen(rows: Rows, mask: NDArray[np.bool_]) -> Rows:
    values = {name: column[mask] for name, column in rows.values.items()}
    return Rows(rows.instant[mask], rows.line[mask], rows.interval_s[mask], values)


def _identity(rows: Rows) -> Instants:
    """Instant and interval of each row as one number, sorted as rows are."""
    return rows.instant * LONGEST + rows.interval_s


def _holds(sorted_: Instants, wanted: Instants) -> NDArray[np.bool_]:
    """Whether each wanted number is among the sorted ones."""
    if not sorted_.size:
        return np.zeros(wanted.size, np.bool_)
    place = np.minimum(np.searchsorted(sorted_, wanted), sorted_.size - 1)
    found: NDArray[np.bool_] = sorted_[place] == wanted
    return found


def _moved(before: Rows, after: Rows) -> Instants:
    """Identities of the rows that differ between two folds of one station."""
    a, b = _identity(before), _identity(after)
    union = a if np.array_equal(a, b) else np.union1d(a, b)
    places = np.searchsorted(union, a), np.searchsorted(union, b)
    differs = ~(_holds(a, union) & _holds(b, union))
    for name in sorted(set(before.values) | set(after.values)):
        x, y = (
            _spread(rows.values.get(name), place, union.size)
            for rows, place in zip((before, after), places, strict=True)
        )
        differs |= ~((x == y) | (np.isnan(x) & np.isnan(y)))
    return union[differs]


def _spread(values: Floats | None, place: NDArray[np.intp], size: int) -> Floats:
    spread = np.full(size, np.nan)
    if values is not None:
        spread[place] = values
    return spread


def _days_of(identities: Instants, clock: Clock) -> list[date]:
    """The station days of rows."""
    instants, intervals = np.divmod(identities, LONGEST)
    return [as_day(day) for day in np.unique(station_day(instants, intervals, clock))]
