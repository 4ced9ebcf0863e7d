"""What the weather ahead may be: how the same rule missed on past mornings, and the rain then."""

from dataclasses import dataclass

import numpy as np

from app.science import Days, Floats, Ints
from app.science.energy.usual import usual_for_date, years_before
from app.science.outlook.usual import LEAST_PAIRS, RECORD_DAYS, foretell, ratio_to_ra

# Past years looked at, days on either side of the date whose mornings count, years with such
# mornings that are needed, and recent mornings that serve in their stead (working values).
MOST_YEARS, NEAR_DATE, LEAST_YEARS, RECENT = 10, 15, 3, 60
# How far back those mornings may lie, where days are missing.
RECENT_REACH = 2 * RECENT
# Mornings this many leads apart are taken to miss independently of each other (working value).
APART = 3
Z = 1.2816  # a normal variable passes it one time in ten


@dataclass(frozen=True)
class Sequences:
    """What may come, one column a past morning, all (days, mornings); the first day is today.

    `departure` [mm MJ-1 m2]: of the ratio ETo/Ra from what the rule foretold then, widened for the
    few mornings (`small_sample`); `rain` [mm], NaN where no gauge spoke.
    """

    departure: Floats
    rain: Floats

    def eto(self, foretold: Floats, ra: Floats) -> Floats:
        """ETo [mm d-1] (days, mornings): what is foretold now (days,) [mm d-1], missed as it was
        then; ra (days,) [MJ m-2 d-1]. Never below 0."""
        return np.maximum(foretold[:, None] + self.departure * ra[:, None], 0.0)

    def first(self, days: int) -> "Sequences":
        """The first days alone."""
        return Sequences(self.departure[:days], self.rain[:days])


def past_sequences(
    today: np.datetime64, date: Days, eto: Floats, rain: Floats, ra: Floats, horizon: int
) -> Sequences:
    """Sequences of `horizon` days from past mornings like this one.

    today [datetime64[D]]; date (n,) consecutive days up to yesterday at the latest; eto, rain (n,)
    [mm d-1] NaN allowed; ra (n,) [MJ m-2 d-1]. Mornings within 15 days of the date in at most ten
    past years, where three years or more have them; else the last 60. A morning counts where all
    days from it on are known, and ten of the 60 before it. No column at all where none counts.
    Source: the methods page, the range (working values).
    """
    ratio = ratio_to_ra(eto, ra)
    usual = ratio_to_ra(usual_for_date(date, date, eto), ra)
    usable = _usable(ratio, horizon)
    chosen = _near_the_date(today, date, usable)
    if np.unique(_season_of(today, date[chosen])).size < LEAST_YEARS:
        chosen = usable[-RECENT:]
        chosen = chosen[date[chosen] >= today - np.timedelta64(RECENT_REACH + horizon, "D")]
    return _sequences(ratio, usual, rain, chosen, horizon)


def _usable(ratio: Floats, horizon: int) -> Ints:
    """Places of mornings with all of `horizon` days known, and enough of a record before them."""
    known = np.concatenate(([0], np.cumsum(~np.isnan(ratio))))
    mornings = np.arange(RECORD_DAYS, ratio.size - horizon + 1)
    ahead = known[mornings + horizon] - known[mornings]
    before = known[mornings] - known[mornings - RECORD_DAYS]
    return np.asarray(mornings[(ahead == horizon) & (before >= LEAST_PAIRS)])


def _season_of(today: np.datetime64, days: Days) -> Ints:
    """Whole years from each day's nearest anniversary of today to today."""
    return np.rint((today - days).astype(np.int64) / 365.2425).astype(np.int64)


def _near_the_date(today: np.datetime64, date: Days, usable: Ints) -> Ints:
    days = date[usable]
    back = _season_of(today, days)
    anniversary = np.array(
        [years_before(np.array([today]), int(b))[0] for b in back], "datetime64[D]"
    )
    away = np.abs((days - anniversary).astype(np.int64))
    return np.asarray(usable[(back >= 1) & (back <= MOST_YEARS) & (away <= NEAR_DATE)])


def _sequences(
    ratio: Floats, usual: Floats, rain: Floats, mornings: Ints, horizon: int
) -> Sequences:
    before = mornings[:, None] + np.arange(-RECORD_DAYS, 0)
    ahead = mornings[:, None] + np.arange(horizon)
    shape = np.concatenate((usual[before], usual[ahead]), axis=1)
    missed = (ratio[ahead] - foretell(ratio[before], shape)).T
    return Sequences(missed * small_sample(mornings.size, horizon)[:, None], rain[ahead].T)


def small_sample(mornings: int, horizon: int) -> Floats:
    """By how much departures are widened at each lead, (horizon,), at least 1.

    Overlapping sequences repeat each other, the more the longer the lead: of m mornings only
    m / (3 lead) are taken as independent, two at least. The factor is that of the interval for one
    further draw of a normal variable from so few, at the 10 % the range leaves out on each side.
    Source: Student's t by its series in 1/n (from memory); the count is a working value.
    """
    count = np.maximum(mornings / (APART * np.arange(1.0, horizon + 1.0)), 2.0)
    freedom = count - 1.0
    student = Z + (Z**3 + Z) / (4 * freedom) + (5 * Z**5 + 16 * Z**3 + 3 * Z) / (96 * freedom**2)
    return np.asarray(student / Z * np.sqrt(1.0 + 1.0 / count))
