"""Which days hold enough of a quantity to stand for the day (METHODS section 2, working values)."""

from dataclasses import dataclass

import numpy as np

from app.intake.grid import Bools, Grid
from app.intake.model import Floats

DAY_SHARE = 0.90  # of the intervals
DAYLIGHT_SHARE = 0.95  # of daylight, for shortwave
NIGHT_SHARE = 0.80  # of the night, for longwave and net radiation
_HAIR = 1e-9


@dataclass(frozen=True)
class Figure:
    """One figure a day, shape (days,): NaN where too little was read, with the reason there."""

    values: Floats
    reason: list[str]


def mean_of_day(grid: Grid, name: str, *, night: bool = False) -> Figure:
    """Time-weighted mean; with `night` enough of the night is needed as well."""
    values = grid.values[name]
    present = ~np.isnan(values)
    judged = _Judged(values.shape[0])
    judged.need(_share(present), DAY_SHARE, "of the intervals")
    judged.allow_filled(_share(_filled(grid, name)))
    if night:
        judged.need(_share(present, grid.night), NIGHT_SHARE, "of the night")
    total = np.where(present, values, 0.0).sum(axis=1)
    return judged.figure(total / np.maximum(present.sum(axis=1), 1))


def sun_mean_of_day(grid: Grid, name: str) -> Figure:
    """Mean shortwave over the whole day: the daylight must be there, a dark interval is zero."""
    values = grid.values[name]
    present = ~np.isnan(values)
    light = ~grid.night
    judged = _Judged(values.shape[0])
    judged.need(_share(present, light), DAYLIGHT_SHARE, "of the daylight")
    judged.allow_filled(_share(_filled(grid, name), light, empty=0.0))
    judged.refuse(~_any(present), "no readings")
    read = present & light
    by_day = np.where(read, values, 0.0).sum(axis=1) / np.maximum(read.sum(axis=1), 1)
    at_night = np.where(present & ~light, values, 0.0).sum(axis=1)
    return judged.figure((by_day * light.sum(axis=1) + at_night) / values.shape[1])


def sum_of_day(grid: Grid, name: str, *, daylight: bool = False) -> Figure:
    """Sum of what was read; nothing is interpolated into a sum."""
    values = grid.values[name]
    present = ~np.isnan(values)
    judged = _Judged(values.shape[0])
    if daylight:
        judged.need(_share(present, ~grid.night), DAYLIGHT_SHARE, "of the daylight")
        judged.refuse(~_any(present), "no readings")
    else:
        judged.need(_share(present), DAY_SHARE, "of the intervals")
    return judged.figure(np.where(present, values, 0.0).sum(axis=1))


def extreme_of_day(grid: Grid, name: str, *, highest: bool) -> Figure:
    """Highest or lowest value read; also needs one reading in each quarter of the day."""
    values = grid.values[name].copy()
    filled = _filled(grid, name)
    judged = _Judged(values.shape[0])
    judged.need(_share(~np.isnan(values)), DAY_SHARE, "of the intervals")
    judged.allow_filled(_share(filled))
    values[filled] = np.nan
    quarter = np.arange(values.shape[1]) * 4 // values.shape[1]
    quarters = min(4, values.shape[1])
    for part in range(quarters):
        judged.refuse(
            ~_any(~np.isnan(values[:, quarter == part])), "a quarter of the day without a reading"
        )
    worst = -np.inf if highest else np.inf
    read_only = np.where(np.isnan(values), worst, values)
    return judged.figure(read_only.max(axis=1) if highest else read_only.min(axis=1))


class _Judged:
    """Reasons gathered over several needs; the first that fails is kept."""

    def __init__(self, days: int) -> None:
        self._reason = [""] * days
        self._good = np.ones(days, bool)

    def need(self, share: Floats, least: float, of: str) -> None:
        for day in np.flatnonzero((share < least - _HAIR) & self._good):
            found = 100 * float(share[day])
            self._reason[day] = (
                "no readings"
                if found == 0
                else f"only {found:.3g} % {of}, {100 * least:.3g} % needed"
            )
        self._good &= share >= least - _HAIR

    def allow_filled(self, share: Floats) -> None:
        most = 1.0 - DAY_SHARE
        for day in np.flatnonzero((share > most + _HAIR) & self._good):
            self._reason[day] = f"{100 * float(share[day]):.0f} % would rest on interpolation"
        self._good &= share <= most + _HAIR

    def refuse(self, bad: Bools, reason: str) -> None:
        for day in np.flatnonzero(bad & self._good):
            self._reason[day] = reason
        self._good &= ~bad

    def figure(self, values: Floats) -> Figure:
        return Figure(np.where(self._good, values, np.nan), self._reason)


def _any(which: Bools) -> Bools:
    return np.asarray(which.any(axis=1), np.bool_)


def _filled(grid: Grid, name: str) -> Bools:
    return grid.filled.get(name, np.zeros(grid.night.shape, bool))


def _share(which: Bools, within: Bools | None = None, empty: float = 1.0) -> Floats:
    """Share of the intervals (of those `within`) of each day; `empty` where there are none."""
    if within is None:
        return np.asarray(which.mean(axis=1), np.float64)
    among = within.sum(axis=1)
    found = (which & within).sum(axis=1) / np.maximum(among, 1)
    return np.where(among > 0, found, empty)
