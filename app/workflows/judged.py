"""A station's rows as people have judged them: calibrated, marked spans set aside or trusted."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np
from numpy.typing import NDArray

from app.intake import Clock, DayNote, Rows, station_day
from app.science.energy.day_checks import Marks
from app.storage.judgement import LogEntry, Mark
from app.workflows.compare import EPOCH, as_day

Bools = NDArray[np.bool_]
FIELDS = {
    "air_temperature": ("tmax", "tmin", "tmean"),
    "air_temperature_max": ("tmax",),
    "air_temperature_min": ("tmin",),
    "relative_humidity": ("rh_max", "rh_min", "rh_mean", "vapour_pressure"),
    "relative_humidity_max": ("rh_max",),
    "relative_humidity_min": ("rh_min",),
    "wind_speed": ("wind",),
    "sunshine_hours": ("sunshine",),
}
"""Fields of a day's weather that rest on a quantity of its rows; else of the same name."""


@dataclass(frozen=True)
class JudgedRows:
    """Rows with factors applied and bad spans set aside; `good` masks (rows,) by quantity."""

    rows: Rows
    good: dict[str, Bools]
    notes: list[DayNote]

    def marks_of_days(self, days: NDArray[np.datetime64], clock: Clock) -> Marks:
        """The days with readings that a person vouches for, by field of DailyWeather."""
        of_rows = station_day(self.rows.instant, self.rows.interval_s, clock)
        wanted = days.astype("datetime64[D]").astype(np.int64)
        good: dict[str, Bools] = {}
        for quantity, mask in self.good.items():
            vouched = np.isin(wanted, of_rows[mask])
            for field in FIELDS.get(quantity, (quantity,)):
                good[field] = good.get(field, np.zeros(wanted.size, np.bool_)) | vouched
        return Marks(good=good)


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
