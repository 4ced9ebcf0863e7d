"""Drift of a pyranometer, from the level of its clear days over months."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.science import Bools, Days, Floats
from app.science.energy.sun import day_of_year

LEAST_CLEAR, LEAST_SPAN = 8, 60  # clear days, and days from first to last (the methods page)
DAYS_A_MONTH = 365.25 / 12.0
SEASON_SHARE = 0.08  # that clear air itself changes over half a year, working value
LEAST_CHANGE = 0.02  # share over the span, below it nothing is said, working value
SURE = 3.0  # standard errors, working value
SEASON_DAYS, SEASON_LEAST = 15, 3  # either side of a date, and clear days there, of past years
BRIGHT, BRIGHT_DAYS = 0.93, 45  # of the brightest tenth within so many days, working values


@dataclass(frozen=True)
class Drift:
    """`rate` share a month, `error` its standard error; `change` share over the span of `span`
    days; `clear_days` it rests on; `reason` empty, or why there is no answer (`few_clear_days`);
    `drifting` whether it is a fault. Figures NaN where there is no answer.
    """

    rate: float
    error: float
    change: float
    span: int
    clear_days: int
    reason: str
    drifting: bool


def drift(date: Days, level: Floats, clear: Bools, expected: Floats | None = None) -> Drift:
    """Whether the level of clear days changes steadily.

    Arguments, (days,) in time order: `date`; `level` measured over clear sky [-]; `clear` which
    days are clear; `expected` level of the date without drift, as from past years
    (`expected_level`) or a neighbour's level on the same day. Returns Drift: a median slope of the
    logarithm, so that a third of the days may be hazy. Without `expected` the season of the air
    itself is allowed for, 8 % over half a year, and only more than that is called drift.
    Source: the methods page, checks (working values); Theil-Sen slope.
    """
    value = np.log(np.where(level > 0.0, level, np.nan))
    if expected is not None:
        value = value - np.log(np.where(expected > 0.0, expected, np.nan))
    used = clear & ~np.isnan(value)
    day = np.asarray(date).astype("datetime64[D]").astype(np.int64)[used]
    count = int(used.sum())
    span = int(day[-1] - day[0]) if count else 0
    if count < LEAST_CLEAR or span < LEAST_SPAN:
        return Drift(np.nan, np.nan, np.nan, span, count, "few_clear_days", False)
    month = day / DAYS_A_MONTH
    slope, error = median_slope(month, value[used])
    months = span / DAYS_A_MONTH
    change = float(np.expm1(slope * months))
    least = LEAST_CHANGE
    if expected is None:
        least += SEASON_SHARE * min(months / 6.0, 1.0)
    drifting = abs(change) > least and abs(slope) > SURE * error
    return Drift(slope, error, change, span, count, "", drifting)


def median_slope(x: Floats, y: Floats) -> tuple[float, float]:
    """Median of the slopes between all pairs of points, and its standard error.

    Arguments, (n,): `x`, `y`. Returns slope and error [y per x]; the error is that of a straight
    line through points with the robust spread of the residuals. NaN where x does not vary.
    Source: Theil-Sen estimator (common practice); spread 1.4826 times the median deviation.
    """
    if x.size > 400:  # 80 000 pairs tell as much
        keep = np.linspace(0, x.size - 1, 400).astype(np.int64)
        x, y = x[keep], y[keep]
    i, j = np.triu_indices(x.size, 1)
    run = x[j] - x[i]
    apart = run != 0.0
    if not apart.any():
        return np.nan, np.nan
    slope = float(np.median((y[j] - y[i])[apart] / run[apart]))
    off = y - slope * x
    spread = 1.4826 * float(np.median(np.abs(off - np.median(off))))
    return slope, spread / float(np.sqrt(((x - x.mean()) ** 2).sum()))


def expected_level(date: Days, level: Floats, clear: Bools) -> Floats:
    """Clear-day level of the date in past years, so that the season of the air is not drift.

    Arguments, (days,) in time order: `date`, `level` [-], `clear`. Returns (days,): the median
    level of clear days within 15 days of the date in years before, at least 3 of them, NaN
    elsewhere. Only days at least 350 days before are looked at. Source: working values.
    """
    when = np.asarray(date).astype("datetime64[D]").astype(np.int64)
    season = day_of_year(date)
    told = np.full(when.shape, np.nan)
    used = np.flatnonzero(clear & ~np.isnan(level))
    for i in np.flatnonzero(clear):
        past = used[when[used] <= when[i] - 365 + SEASON_DAYS]
        near = past[_apart(season[past], int(season[i])) <= SEASON_DAYS]
        if near.size >= SEASON_LEAST:
            told[i] = np.median(level[near])
    return told


def _apart(season: NDArray[np.int64], of: int) -> NDArray[np.int64]:
    off = np.abs(season - of)
    return np.asarray(np.minimum(off, 366 - off))


def bright_days(date: Days, ratio: Floats) -> Bools:
    """Clear days of a station that knows only days: those near the brightest around them.

    Arguments, (days,) in time order: `date`; `ratio` Rs/Rso [-]. Returns (days,): within 7 % of
    the brightest tenth of the days from 45 before to 45 after, at least 20 of them. Source:
    working values; for judging the past, since later days count too.
    """
    when = np.asarray(date).astype("datetime64[D]").astype(np.int64)
    told = np.zeros(when.shape, dtype=np.bool_)
    for i in np.flatnonzero(~np.isnan(ratio)):
        begin, end = np.searchsorted(when, [when[i] - BRIGHT_DAYS, when[i] + BRIGHT_DAYS + 1])
        near = ratio[begin:end]
        near = near[~np.isnan(near)]
        told[i] = near.size >= 20 and ratio[i] >= BRIGHT * np.quantile(near, 0.9)
    return told
