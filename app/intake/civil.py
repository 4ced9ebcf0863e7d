"""From the clock in the file to UTC, also where that clock is put forward and back."""

import datetime as dt
from dataclasses import dataclass
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

import numpy as np
from numpy.typing import NDArray

from app.intake.errors import IntakeError
from app.intake.model import Instants

_EPOCH = dt.datetime(1970, 1, 1, tzinfo=dt.UTC)
_DAY = 86400


@dataclass(frozen=True)
class Civil:
    """UTC seconds, and which rows stand in an hour that did not exist."""

    utc: Instants
    no_such_hour: NDArray[np.bool_]
    in_repeated_hour: NDArray[np.bool_]


def zone(name: str) -> ZoneInfo:
    """Time zone of an IANA name; IntakeError when there is none."""
    try:
        return ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError) as error:
        raise IntakeError(
            f"There is no time zone {name!r}. Use 'station', 'UTC' or a name such as "
            "'Europe/Madrid'."
        ) from error


def civil_to_utc(local: Instants, name: str) -> Civil:
    """UTC of civil local seconds, in file order; `local` and the result have shape (rows,).

    Where the clock was put back, the hour that comes twice is told apart by the order of the
    rows: the second round begins when the clock does not run on, or where only it continues the
    usual step. A file newest first is understood.
    """
    if local.size == 0:
        return Civil(local, np.zeros(0, bool), np.zeros(0, bool))
    falling = int(np.count_nonzero(np.diff(local) < 0)) * 2 > local.size
    ordered = local[::-1] if falling else local
    before, after, at = _changes(zone(name), int(local.min()), int(local.max()))
    utc, gap, twice = _resolve(ordered, before, after, at)
    if falling:
        utc, gap, twice = utc[::-1], gap[::-1], twice[::-1]
    return Civil(utc, gap, twice)


def _changes(zone: ZoneInfo, low: int, high: int) -> tuple[Instants, Instants, Instants]:
    """Offsets [s] before and after each change and its instant [UTC s], the start first."""
    day = low // _DAY - 2
    last = high // _DAY + 2
    before, after, at = [], [], []
    known = _offset(zone, day * _DAY)
    before.append(known)
    after.append(known)
    at.append(day * _DAY)
    for step in range(day + 1, last + 1):
        offset = _offset(zone, step * _DAY)
        if offset != known:
            left, right = (step - 1) * _DAY, step * _DAY
            while right - left > 1:
                middle = (left + right) // 2
                if _offset(zone, middle) == known:
                    left = middle
                else:
                    right = middle
            before.append(known)
            after.append(offset)
            at.append(right)
            known = offset
    return np.array(before), np.array(after), np.array(at)


def _offset(zone: ZoneInfo, utc: int) -> int:
    offset = (_EPOCH + dt.timedelta(seconds=utc)).astimezone(zone).utcoffset()
    return int(offset.total_seconds()) if offset is not None else 0


def _resolve(
    local: Instants, before: Instants, after: Instants, at: Instants
) -> tuple[Instants, NDArray[np.bool_], NDArray[np.bool_]]:
    # The change whose later local clock (of the two it has) lies at or before the row.
    late = at + np.maximum(before, after)
    change = np.maximum(np.searchsorted(late, local, side="right") - 1, 0)
    utc = local - after[change]
    coming = np.minimum(change + 1, at.size - 1)
    early = at + np.minimum(before, after)
    between = (coming > change) & (local >= early[coming])
    put_back = before[coming] > after[coming]
    gap = between & ~put_back
    utc[gap] = local[gap] - before[coming[gap]]
    # The clock face of the change itself, before it is put forward, is that instant: no gap.
    no_such_hour = gap & (local > early[coming])
    twice = between & put_back
    steps = np.diff(local)
    step = int(np.median(steps[steps > 0])) if np.any(steps > 0) else 0
    for row in np.flatnonzero(twice):
        first, second = local[row] - before[coming[row]], local[row] - after[coming[row]]
        last = utc[row - 1] if row else first - step
        utc[row] = first if last < first and second - last != step else second
    return utc, no_such_hour, twice
