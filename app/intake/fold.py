"""Several sets of rows laid over each other: later wins per instant and quantity."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from app.intake.model import Floats, Rows


def fold(parts: Sequence[Rows]) -> Rows:
    """Rows of all parts, sorted and unique by instant and interval; NaN never overwrites."""
    parts = [part for part in parts if len(part)]
    if not parts:
        return Rows.none()
    if len(parts) == 1 and _in_order(parts[0]):
        return parts[0]
    instant = np.concatenate([part.instant for part in parts])
    interval_s = np.concatenate([part.interval_s for part in parts])
    line = np.concatenate([part.line for part in parts])
    order = np.lexsort((interval_s, instant))  # stable: file order within equals
    instant, interval_s, line = instant[order], interval_s[order], line[order]
    first = np.r_[True, (np.diff(instant) != 0) | (np.diff(interval_s) != 0)]
    starts = np.flatnonzero(first)
    last = np.r_[starts[1:], instant.size] - 1
    values = {}
    for name in sorted({name for part in parts for name in part.values}):
        column = np.concatenate([part.values.get(name, _absent(len(part))) for part in parts])
        values[name] = last_given(column[order], starts)
    return Rows(instant[starts], line[last], interval_s[starts], values)


def last_given(column: Floats, starts: NDArray[np.intp]) -> Floats:
    """Last value that is not NaN of each group of rows; groups begin at `starts`."""
    if starts.size == column.size:
        return column
    place = np.where(np.isnan(column), -1, np.arange(column.size))
    chosen = np.maximum.reduceat(place, starts)
    return np.where(chosen >= 0, column[np.maximum(chosen, 0)], np.nan)


def _in_order(rows: Rows) -> bool:
    step, wider = np.diff(rows.instant), np.diff(rows.interval_s)
    return bool(np.all((step > 0) | ((step == 0) & (wider > 0))))


def _absent(size: int) -> Floats:
    return np.full(size, np.nan)
