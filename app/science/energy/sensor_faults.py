"""What a day's rows say is wrong with a radiometer as a whole: swapped, dead, wrongly read.

Figures are of rows as read, before single values are set aside. Thresholds are working values
unless a source is named.
"""

from collections.abc import Iterator, Mapping

import numpy as np

from app.science import Bools, Floats
from app.science.constants import STEFAN_BOLTZMANN_W
from app.science.energy.day_checks import Finding
from app.science.energy.day_rows import DayRows
from app.science.energy.longwave import fourth_power_kelvin

LEAST_SHARE = 0.5  # of a day's rows that must speak
SWAPPED_ALBEDO = (0.05, 0.6)  # -, of the ground if the pair is turned round (FAO-56 p. 43, widened)
SWAPPED_SPREAD = 0.25  # of that albedo over the day, relative: a cap of snow is not so even
LONGWAVE_ABOVE = 15.0  # W m-2, downward over upward as a day's mean that a sky does not reach
BODY_TERM = (-300.0, 40.0)  # W m-2, net signal without the body (the floor is the BSRN limit)
DEAD_SHARE = 0.01  # of clear sky, the darkest overcast passes more
DEAD_SPREAD = 0.05  # W m-2, standard deviation over a day of a live longwave sensor is larger
UNIT_FACTOR = 2.0  # times clear sky over a day: an energy read as a flux, or a wrong factor
NET_APART = (0.05, 10.0)  # share of the mean size, and W m-2, logger net against its components
ALBEDO = {  # -, daily, of surfaces under a radiometer; ranges of FAO-56 p. 43, widened
    "reference grass": (0.15, 0.32),
    "green cover": (0.10, 0.32),
    "bare soil": (0.05, 0.40),
    "water": (0.03, 0.15),
    "snow": (0.40, 1.00),
}

# finding -> what it says, in plain words
SENSOR_FAULTS = {
    "shortwave_swapped": "downward and upward shortwave look swapped",
    "longwave_swapped": "downward and upward longwave look swapped",
    "body_term_missing": "longwave lacks the radiation of the sensor's own body",
    "shortwave_dead": "the shortwave sensor reads nothing under the sun",
    "longwave_dead": "the longwave sensor does not move",
    "shortwave_unit": "shortwave is far above clear sky: a wrong unit or factor",
    "net_rows_against_components": "net radiation differs from its four components row by row",
    "albedo_against_surface": "the albedo is not that of the declared surface",
}

Values = Mapping[str, Floats]


def sensor_faults(rows: DayRows, values: Values, surface: str | None = None) -> list[Finding]:
    """Findings on whole days, in the order of SENSOR_FAULTS; those that bit nowhere are left out.

    Arguments: `rows`; `values` canonical quantity to (days, rows) as read, any of them missing;
    `surface` a name of ALBEDO declared under the sensor. Returns Findings (days,) whose
    `quantities` name what must not be used. A day with too few rows says nothing.
    Errors: ValueError for an unknown surface.
    Source: BSRN limits and comparison tests; FAO-56 p. 43 for albedo; working values.
    """
    if surface is not None and surface not in ALBEDO:
        raise ValueError(f"surface is {surface!r}; it must be one of {', '.join(ALBEDO)}")
    parts = (_shortwave(rows, values, surface), _longwave(values), _net(values))
    found = {finding.check: finding for part in parts for finding in part}
    return [found[name] for name in SENSOR_FAULTS if name in found and found[name].where.any()]


def _shortwave(rows: DayRows, values: Values, surface: str | None) -> Iterator[Finding]:
    down, up = values.get("shortwave_down"), values.get("shortwave_up")
    if down is not None:
        seen = rows.high & ~np.isnan(down)
        enough = _enough(seen, rows.high)
        level = _ratio(_sum(down, seen), _sum(rows.clear, seen))
        dead = enough & (np.abs(level) < DEAD_SHARE)
        yield Finding("shortwave_dead", dead, level, ("shortwave_down",))
        large = enough & (level > UNIT_FACTOR)
        yield Finding("shortwave_unit", large, level, ("shortwave_down",))
    if down is None or up is None:
        return
    both = rows.high & ~np.isnan(down) & ~np.isnan(up)
    turned = _ratio(_sum(down, both), _sum(up, both))
    row_ratio = np.divide(down, up, out=np.full(up.shape, np.nan), where=both & (up > 50.0))
    spread = _spread(row_ratio) / turned
    low, high = SWAPPED_ALBEDO
    even = (spread < SWAPPED_SPREAD) & (turned > low) & (turned < high)
    swapped = _enough(both, rows.high) & (_sum(up, both) > 0.0) & even
    pair = ("shortwave_down", "shortwave_up")
    yield Finding("shortwave_swapped", swapped, 1.0 / turned, pair)
    if surface is not None:
        albedo = _ratio(_sum(up, both), _sum(down, both))
        least, most = ALBEDO[surface]
        odd = _enough(both, rows.high) & ((albedo < least) | (albedo > most)) & (albedo < 1.0)
        yield Finding("albedo_against_surface", odd, albedo)


def _longwave(values: Values) -> Iterator[Finding]:
    down, up = values.get("longwave_down"), values.get("longwave_up")
    air = values.get("air_temperature")
    if down is not None and up is not None:
        above = _mean(down - up)
        plausible = (_mean(down) > 100.0) & (_mean(up) > 100.0)
        pair = ("longwave_down", "longwave_up")
        yield Finding("longwave_swapped", plausible & (above > LONGWAVE_ABOVE), above, pair)
    for name, longwave in (("longwave_up", up), ("longwave_down", down)):
        if longwave is None:
            continue
        middle = _mean(longwave)
        still = _spread(longwave) < DEAD_SPREAD
        yield Finding("longwave_dead", still, middle, (name,))
        if air is not None and name == "longwave_down":
            whole = middle + _mean(STEFAN_BOLTZMANN_W * fourth_power_kelvin(air))
            low, high = BODY_TERM
            lacking = (middle > low) & (middle < high) & (whole > 100.0) & ~still
            yield Finding("body_term_missing", lacking, middle, (name,))


def _net(values: Values) -> Iterator[Finding]:
    names = ("shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "net_radiation")
    if not all(name in values for name in names):
        return
    sd, su, ld, lu, net = (values[name] for name in names)
    parts = sd - su + ld - lu
    off = _mean(np.abs(net - parts))
    share, least = NET_APART
    apart = off > np.maximum(share * _mean(np.abs(parts)), least)
    yield Finding("net_rows_against_components", apart, _mean(net - parts))


def _sum(values: Floats, where: Bools) -> Floats:
    return np.asarray(np.where(where, values, 0.0).sum(axis=1))


def _enough(seen: Bools, wanted: Bools) -> Bools:
    count = wanted.sum(axis=1)
    return np.asarray((count > 0) & (seen.sum(axis=1) >= LEAST_SHARE * count))


def _ratio(top: Floats, bottom: Floats) -> Floats:
    none = np.full(top.shape, np.nan)
    return np.asarray(np.divide(top, bottom, out=none, where=bottom != 0.0))


def _mean(values: Floats) -> Floats:
    """Mean of each day's known rows; NaN where fewer than half are known."""
    known = ~np.isnan(values)
    count = known.sum(axis=1)
    mean = _sum(values, known) / np.maximum(count, 1)
    return np.where((count > 0) & (count >= LEAST_SHARE * values.shape[1]), mean, np.nan)


def _spread(values: Floats) -> Floats:
    """Standard deviation of each day's known rows; NaN where there are none."""
    known = ~np.isnan(values)
    count = np.maximum(known.sum(axis=1), 1)
    mean = _sum(values, known) / count
    square = _sum((np.nan_to_num(values) - mean[:, None]) ** 2, known) / count
    return np.where(known.any(axis=1), np.sqrt(square), np.nan)
