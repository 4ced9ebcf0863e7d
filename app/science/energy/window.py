"""What settles on a radiometer: frost, dew, snow or dust on the longwave window, snow on the dome.

Decided after the fact, from rows of one step (METHODS, checks): a window that reads like a black
body at air temperature while the sun proves an open sky is covered. Fog reads the same, so where
nothing proves the sky open the answer is "undecidable".
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.science import Bools, Floats
from app.science.constants import GRASS_EMISSIVITY, STEFAN_BOLTZMANN_W
from app.science.energy.day_rows import DayRows
from app.science.energy.longwave import cloudiness, fourth_power_kelvin, net_longwave_hourly

BLACK_WITHIN = 6.0  # W m-2 below a black body at air temperature (the methods page)
LEAST_HOURS = 1.0  # h in a row (the methods page)
MORNING_HOURS = 2.0  # h after the sun passed 10 degrees that prove the sky, working value
OPEN_RATIO = 0.6  # Rs/Rso of them that proves it open (low sun: clear gives 0.8), working value
DAWN_HOURS = 2.0  # h between the spell's end and sunrise at most, working value
MOST_REPLACED = 0.25  # of a day's hours may be replaced (the methods page)
REPLACED_ERROR = 20.0  # W m-2, standard uncertainty of modelled LWd in an hour, working value
DOME_TELLS = 50.0  # W m-2, upward shortwave that can be compared, BSRN comparison tests
OFFSET_FROM = -2.0  # W m-2, night shortwave below it is offset (the methods page)


@dataclass(frozen=True)
class CoveredWindow:
    """Covered and undecidable rows, (days, rows): `covered`, `undecidable`. Figures (days,):
    `morning_ratio` Rs/Rso of the first high sun [-, NaN where not measured]; `covered_hours`,
    `undecidable_hours` [h]; `gap` the covered rows' mean LWd less a black body [W m-2, NaN where
    there are none].
    """

    covered: Bools
    undecidable: Bools
    morning_ratio: Floats
    covered_hours: Floats
    undecidable_hours: Floats
    gap: Floats


def covered_window(
    rows: DayRows,
    longwave_down: Floats,
    air_temperature: Floats,
    shortwave_down: Floats,
    open_by_neighbour: Bools | None = None,
) -> CoveredWindow:
    """Spells in which the longwave window read like a black body, and what the sun says of them.

    Arguments, (days, rows): `rows`; `longwave_down`, `shortwave_down` [W m-2]; `air_temperature`
    [degC]; `open_by_neighbour` (days,) where a neighbour saw an open sky that morning. Returns
    CoveredWindow. A spell of an hour or more within 6 W m-2 of a black body is covered where its
    own high sun, or the first two hours of high sun after a spell that lasted to dawn, were bright.
    A missing value ends a spell.
    Source: the methods page, checks; thresholds working values.
    """
    gap = longwave_down - STEFAN_BOLTZMANN_W * fourth_power_kelvin(air_temperature)
    suspect = gap > -BLACK_WITHIN  # False where NaN
    ratio = morning_ratio(rows, shortwave_down)
    proven = ratio >= OPEN_RATIO
    if open_by_neighbour is not None:
        proven = proven | open_by_neighbour
    covered = np.zeros(suspect.shape, dtype=np.bool_)
    undecidable = covered.copy()
    flat_covered, flat_undecidable = covered.reshape(-1), undecidable.reshape(-1)
    for begin, end in _spells(rows, suspect):
        spell = slice(begin, end)
        if _bright(rows, shortwave_down, spell) or _before_open_morning(rows, end, proven):
            flat_covered[spell] = True
        else:
            flat_undecidable[spell] = True
    hours = rows.interval_s / 3600.0
    held = covered.sum(axis=1)
    total = np.where(covered, gap, 0.0).sum(axis=1)
    return CoveredWindow(
        covered=covered,
        undecidable=undecidable,
        morning_ratio=ratio,
        covered_hours=held * hours,
        undecidable_hours=undecidable.sum(axis=1) * hours,
        gap=_mean(total, held),
    )


def morning_ratio(rows: DayRows, shortwave_down: Floats) -> Floats:
    """Rs/Rso over the first two hours of sun above 10 degrees on each day.

    Arguments: `rows`; `shortwave_down` (days, rows) [W m-2]. Returns (days,) [-]; NaN where a row
    of those hours is missing or the sun never stands that high.
    """
    rising = rows.high & rows.morning
    wanted = rising & (np.cumsum(rising, axis=1) <= round(MORNING_HOURS * 3600 / rows.interval_s))
    clear = np.where(wanted, rows.clear, 0.0).sum(axis=1)
    seen = np.where(wanted, shortwave_down, 0.0).sum(axis=1)
    return _mean(seen, clear)


def _spells(rows: DayRows, suspect: Bools) -> list[tuple[int, int]]:
    """Begin and end (exclusive) of suspect spells of an hour or more, in flat row numbers."""
    flat = suspect.reshape(-1)
    if flat.size == 0:
        return []
    same = np.empty(flat.shape, dtype=np.bool_)
    same[0] = False
    same[1:] = np.diff(rows.middle.reshape(-1)) == rows.interval_s  # no spell across missing days
    begins = np.flatnonzero(flat & ~(np.r_[False, flat[:-1]] & same))
    ends = np.flatnonzero(flat & ~np.r_[flat[1:] & same[1:], False]) + 1
    least = LEAST_HOURS * 3600.0 / rows.interval_s
    pairs = zip(begins.tolist(), ends.tolist(), strict=True)
    return [(b, e) for b, e in pairs if e - b >= least]


def _bright(rows: DayRows, shortwave_down: Floats, spell: slice) -> bool:
    """Whether the spell's own high sun, an hour of it or more, proves the sky open."""
    high = rows.high.reshape(-1)[spell]
    seen = shortwave_down.reshape(-1)[spell][high]
    clear = float(rows.clear.reshape(-1)[spell][high].sum())
    enough = high.sum() * rows.interval_s >= LEAST_HOURS * 3600.0
    return bool(enough and clear > 0.0 and seen.sum() >= OPEN_RATIO * clear)


def _before_open_morning(rows: DayRows, end: int, proven: Bools) -> bool:
    """Whether a spell that ended before flat row `end` lasted to the dawn of an open morning."""
    width = rows.up.shape[1]
    middle, sunlit = rows.middle.reshape(-1), ~rows.night.reshape(-1)
    day = (end - 1) // width
    noon = day * width + int(np.argmax(rows.up[day]))
    if end - 1 > noon:
        day += 1
        if day >= rows.date.size:
            return False
        noon = day * width + int(np.argmax(rows.up[day]))
    lit = np.flatnonzero(sunlit[end - 1 : noon + 1])
    if lit.size == 0 or not proven[day]:
        return False
    wait = middle[end - 1 + int(lit[0])] - middle[end - 1]
    return bool(wait <= DAWN_HOURS * 3600.0)


@dataclass(frozen=True)
class ReplacedLongwave:
    """`longwave_down` (days, rows) [W m-2] with covered rows modelled, NaN where too many were;
    (days,): `hours` replaced, `widening` standard uncertainty they add [MJ m-2 d-1], `too_many`
    where more than a quarter of the day was covered and the day takes the next rung.
    """

    longwave_down: Floats
    hours: Floats
    widening: Floats
    too_many: Bools


def replace_covered(
    rows: DayRows,
    window: CoveredWindow,
    longwave_down: Floats,
    air_temperature: Floats,
    vapour_pressure: Floats,
) -> ReplacedLongwave:
    """Downward longwave with covered rows replaced by the model under the sky that was proven.

    Arguments, (days, rows): `rows`, `window`; `longwave_down` [W m-2], `air_temperature` [degC],
    `vapour_pressure` [kPa]. Returns ReplacedLongwave. A row the model cannot make is NaN.
    Source: the methods page, checks; ASCE-EWRI eq 44, 45 turned round.
    """
    ratio = np.where(window.morning_ratio >= OPEN_RATIO, window.morning_ratio, 1.0)
    model = modelled_longwave_down(air_temperature, vapour_pressure, cloudiness(ratio)[:, None])
    too_many = window.covered_hours > MOST_REPLACED * 24.0
    told = np.where(window.covered, model, longwave_down)
    told = np.where(window.covered & too_many[:, None], np.nan, told)
    hours = np.where(too_many, 0.0, window.covered_hours)
    return ReplacedLongwave(told, hours, hours * REPLACED_ERROR * 0.0036, too_many)


def modelled_longwave_down(
    air_temperature: Floats, vapour_pressure: Floats, cloud: Floats
) -> Floats:
    """Downward longwave of which rung 2 would make the model's net longwave.

    Arguments, shapes that broadcast: `air_temperature` [degC]; `vapour_pressure` [kPa]; `cloud`
    fcd [-]. Returns sigma Ta^4 - Rnl / 0.98 [W m-2]. NaN gives NaN.
    Source: ASCE-EWRI eq 44 and the definition of rung 2 on the methods page.
    """
    rnl = net_longwave_hourly(air_temperature, vapour_pressure, cloud) / 0.0036
    black = STEFAN_BOLTZMANN_W * fourth_power_kelvin(air_temperature)
    return np.asarray(black - rnl / GRASS_EMISSIVITY)


@dataclass(frozen=True)
class DomeDays:
    """(days,): `snow_hours` with upward above downward shortwave and the sun above 10 degrees [h];
    `offset_rows` of the night below -2 W m-2, `night_rows` measured, `offset` their mean [W m-2,
    NaN without any].
    """

    snow_hours: Floats
    offset_rows: NDArray[np.int64]
    night_rows: NDArray[np.int64]
    offset: Floats


def dome_days(rows: DayRows, shortwave_down: Floats, shortwave_up: Floats) -> DomeDays:
    """Snow on the upper dome, and the night offset of the downward pyranometer.

    Arguments, (days, rows) [W m-2]: `shortwave_down`, `shortwave_up` as read, before negative
    values became zero. Returns DomeDays. A missing value counts as neither.
    Source: BSRN comparison tests; the methods page, checks.
    """
    snow = rows.high & (shortwave_up > shortwave_down) & (shortwave_up > DOME_TELLS)
    measured = rows.night & ~np.isnan(shortwave_down)
    below = measured & (shortwave_down < OFFSET_FROM)
    count = below.sum(axis=1)
    total = np.where(below, shortwave_down, 0.0).sum(axis=1)
    return DomeDays(
        snow_hours=snow.sum(axis=1) * rows.interval_s / 3600.0,
        offset_rows=count,
        night_rows=measured.sum(axis=1),
        offset=_mean(total, count),
    )


def _mean(total: Floats, count: Floats | NDArray[np.int64]) -> Floats:
    """Total over count, NaN where the count is 0."""
    none = np.full(total.shape, np.nan)
    return np.asarray(np.divide(total, count, out=none, where=count > 0))
