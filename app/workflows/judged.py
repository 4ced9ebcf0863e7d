"""A station's rows as people have judged them: calibrated, marked spans set aside or trusted."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np
from numpy.typing import NDArray

from app.intake import Clock, DayNote, Rows, station_day
from app.storage.judgement import LogEntry, Mark
from app.workflows.compare import EPOCH, as_day

Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class JudgedRows:
    """Rows with factors applied and bad spans set aside; `good` masks (rows,) by quantity."""

    rows: Rows
    good: dict[str, Bools]
    notes: list[DayNote]


def judged(rows: Rows, marks: Sequence[Mark], log: Iterable[LogEntry], clock: Clock) -> JudgedRows:
    """Apply the sensor log's factors, then the marks in the order they were made.

    A row belongs to a span when its interval ends after the span's start and not after its end.
    """
    days = station_day(rows.instant, rows.interval_s, clock)
    values = dict(rows.values)
    for quantity, factor in _factors(log, days).items():
        if quantity in values:
            values[quantity] = values[quantity] * factor
    bad: dict[str, Bools] = {}
    good: dict[str, Bools] = {}
    for mark in marks:
        if mark.quantity not in values:
            continue
        inside = (rows.instant > mark.first.timestamp()) & (rows.instant <= mark.last.timestamp())
        for verdict, masks in (("bad", bad), ("good", good)):
            before = masks.get(mark.quantity, np.zeros(len(rows), np.bool_))
            masks[mark.quantity] = before | inside if mark.verdict == verdict else before & ~inside
    notes = []
    for quantity, mask in bad.items():
        given = mask & ~np.isnan(values[quantity])
        values[quantity] = np.where(mask, np.nan, values[quantity])
        for day, count in zip(*np.unique(days[given], return_counts=True), strict=True):
            notes.append(DayNote(as_day(day), quantity, "set_aside", float(count), "marked_bad"))
    return JudgedRows(
        Rows(rows.instant, rows.line, rows.interval_s, values),
        {quantity: mask for quantity, mask in good.items() if mask.any()},
        notes,
    )


def _factors(log: Iterable[LogEntry], days: NDArray[np.int64]) -> dict[str, NDArray[np.float64]]:
    """Factor of each row by quantity: that of the last calibration on or before its day."""
    factors: dict[str, NDArray[np.float64]] = {}
    for entry in log:
        if entry.kind == "calibration" and entry.quantity and entry.factor:
            so_far = factors.setdefault(entry.quantity, np.ones(days.size))
            so_far[days >= _number(entry.day)] = entry.factor
    return factors


def _number(day: date) -> int:
    return (day - EPOCH) // timedelta(days=1)
