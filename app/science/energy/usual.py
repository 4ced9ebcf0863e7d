"""Rung 9: what is usual for the date, from the station's own past years."""

from dataclasses import dataclass

import numpy as np

from app.science import Days, Floats

HALF_WINDOW = 7  # days on either side of the date, 15 in all (the methods page)
LEAST_YEARS = 3  # past years with enough days (the methods page)
LEAST_DAYS = 8  # of the 15 days, for a year to count, working value


@dataclass(frozen=True)
class Usual:
    """The usual for the date on each day, all (days,), NaN where not known: `ratio` Rs/Rso [-];
    `tmax`, `tmin` [degC]; `vapour_pressure` [kPa]; `wind_2m` is not among them, for 2 m/s serves.
    """

    ratio: Floats
    tmax: Floats
    tmin: Floats
    vapour_pressure: Floats


def usual_for_date(date: Days, history_date: Days, history: Floats) -> Floats:
    """Mean of a record around the date in past years, 15 days wide.

    Arguments: `date` (days,) wanted; `history_date` (n,) in any order, each day once; `history`
    (n,) any unit, NaN allowed. Returns (days,): the mean over past years of each year's mean over
    the anniversary and seven days on either side; NaN with fewer than three years that hold eight
    such days. Only days at least 358 days before the date are looked at. 29 February looks at
    1 March of other years.
    Source: the methods page, the weather ahead (working values).
    """
    wanted = np.asarray(date).astype("datetime64[D]")
    result = np.full(wanted.shape, np.nan)
    known = ~np.isnan(history)
    if not known.any() or wanted.size == 0:
        return result
    day = np.asarray(history_date).astype("datetime64[D]").astype(np.int64)[known]
    first, last = int(day.min()), int(day.max())
    sums, counts = np.zeros(last - first + 2), np.zeros(last - first + 2)
    sums[day - first + 1] = history[known]
    counts[day - first + 1] = 1.0
    sums, counts = np.cumsum(sums), np.cumsum(counts)
    years = int(wanted.max().astype("datetime64[Y]").astype(np.int64)) - int(
        np.datetime64(first, "D").astype("datetime64[Y]").astype(np.int64)
    )
    total, number = np.zeros(wanted.shape), np.zeros(wanted.shape)
    for back in range(1, years + 2):
        middle = years_before(wanted, back).astype(np.int64) - first
        low = np.clip(middle - HALF_WINDOW, 0, sums.size - 1)
        high = np.clip(middle + HALF_WINDOW + 1, 0, sums.size - 1)
        held = counts[high] - counts[low]
        enough = held >= LEAST_DAYS
        total += np.where(enough, (sums[high] - sums[low]) / np.maximum(held, 1.0), 0.0)
        number += enough
    np.divide(total, number, out=result, where=number >= LEAST_YEARS)
    return result


def years_before(date: Days, years: int) -> Days:
    """The same date some years before, (days,); 29 February becomes 1 March where there is none."""
    days = np.asarray(date).astype("datetime64[D]")
    month = days.astype("datetime64[M]")
    in_month = (days - month.astype("datetime64[D]")).astype(np.int64)
    return np.asarray((month - 12 * years).astype("datetime64[D]") + in_month)
