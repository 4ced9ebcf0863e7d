"""Hard checks of a station's single rows: which values must not be used.

Sources: Global Network recommended QC tests V2.0 (BSRN) for the radiation limits; what is marked
working value has no published source. A value that fails is set aside, never deleted.
"""

from collections.abc import Callable, Iterator, Mapping

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Floats, floats
from app.science.constants import RH_LIMIT, SOLAR_CONSTANT_W, STEFAN_BOLTZMANN_W
from app.science.energy.humidity import saturation_vapour_pressure
from app.science.energy.longwave import fourth_power_kelvin
from app.science.energy.records import Site
from app.science.energy.sun import elevation_at_instants
from app.science.quantities import outside

NIGHT_OFFSET_LIMIT = -10.0  # W m-2, thermal offset below it is a fault, working value
SHORTWAVE_TELLS = 50.0  # W m-2, BSRN comparison tests apply above it
NET_ABOVE_SHORTWAVE = 100.0  # W m-2, most that longwave can add to net radiation, working value
DEW_POINT_MARGIN = 1.0  # K above air temperature, sensor error allowed, working value
VAPOUR_PRESSURE_MARGIN = 1.08  # share of saturation allowed, about 1 K, working value
STUCK_HOURS = 12.0  # h of one local day that must all read the same, working value
STUCK_ROWS = 6  # rows at least, working value

Values = Mapping[str, ArrayLike]
_Named = Iterator[tuple[str, Bools]]


def row_checks(
    site: Site, instants_mid_utc_s: ArrayLike, values: Values
) -> dict[str, NDArray[np.bool_]]:
    """Which values of which rows fail a hard check.

    Arguments: `site`; `instants_mid_utc_s` middle of each row's interval (rows,) [s since
    1970-01-01 UTC]; `values` canonical quantity to array (rows,) in the units of
    `science.quantities`. Returns "quantity/check" to (rows,) True where the value must not be
    used. A missing value or a missing partner never fails. Errors: ValueError naming the quantity
    whose shape is not that of the instants.
    Source: BSRN physically possible limits and comparison tests; ASCE-EWRI Appendix D.
    """
    instants = np.asarray(instants_mid_utc_s).astype(np.int64)
    arrays = {name: floats(array) for name, array in values.items()}
    for name, array in arrays.items():
        if array.shape != instants.shape:
            raise ValueError(
                f"{name} has shape {array.shape}; the instants have shape {instants.shape}"
            )
    checks: tuple[Callable[[], _Named], ...] = (
        lambda: _shortwave(site, instants, arrays),
        lambda: _longwave(arrays),
        lambda: _net_radiation(arrays),
        lambda: _humidity(arrays),
        lambda: _stuck(site, instants, arrays),
    )
    return {name: failed for check in checks for name, failed in check()}


def _shortwave(site: Site, instants: NDArray[np.int64], values: Mapping[str, Floats]) -> _Named:
    """BSRN limits of downward and upward shortwave, and upward above downward."""
    down, up = values.get("shortwave_down"), values.get("shortwave_up")
    if down is None and up is None:
        return
    sine, distance = elevation_at_instants(site.latitude_deg, site.longitude_deg, instants)
    beam = SOLAR_CONSTANT_W * distance * np.maximum(sine, 0.0) ** 1.2
    if down is not None:
        yield (
            "shortwave_down/possible",
            (down < NIGHT_OFFSET_LIMIT) | (down > 1.5 * beam + 100.0),
        )
    if up is not None:
        yield "shortwave_up/possible", (up < NIGHT_OFFSET_LIMIT) | (up > 1.2 * beam + 50.0)
    if down is not None and up is not None:
        # snow on the upper dome, or the two sensors swapped: neither can be trusted
        covered = (up > down) & (np.fmax(up, down) > SHORTWAVE_TELLS)
        yield "shortwave_down/below_upward", covered
        yield "shortwave_up/above_downward", covered


def _longwave(values: Mapping[str, Floats]) -> _Named:
    """BSRN limits of both longwaves, against air temperature and against each other."""
    down, up = values.get("longwave_down"), values.get("longwave_up")
    air = values.get("air_temperature")
    if down is not None:
        yield "longwave_down/possible", outside("longwave_down", down)
    if up is not None:
        yield "longwave_up/possible", outside("longwave_up", up)
    if air is not None:
        black = STEFAN_BOLTZMANN_W * fourth_power_kelvin(air)
        if down is not None:
            yield "longwave_down/against_air", (down < 0.4 * black) | (down > black + 25.0)
        if up is not None:
            low = STEFAN_BOLTZMANN_W * fourth_power_kelvin(air - 15.0)
            high = STEFAN_BOLTZMANN_W * fourth_power_kelvin(air + 25.0)
            yield "longwave_up/against_air", (up < low) | (up > high)
    if down is not None and up is not None:
        apart = (down < up - 300.0) | (down > up + 25.0)
        yield "longwave_down/against_upward", apart
        yield "longwave_up/against_downward", apart


def _net_radiation(values: Mapping[str, Floats]) -> _Named:
    """Net radiation within what shortwave and longwave together can give."""
    net, down = values.get("net_radiation"), values.get("shortwave_down")
    if net is None:
        return
    yield "net_radiation/possible", outside("net_radiation", net)
    if down is not None:
        yield "net_radiation/above_shortwave", net > np.maximum(down, 0.0) + NET_ABOVE_SHORTWAVE


def _humidity(values: Mapping[str, Floats]) -> _Named:
    """Relative humidity, dew point and vapour pressure against saturation."""
    for name in ("relative_humidity", "relative_humidity_max", "relative_humidity_min"):
        if name in values:
            yield f"{name}/above_saturation", values[name] > RH_LIMIT
    air = values.get("air_temperature")
    if air is None:
        return
    if "dew_point" in values:
        yield "dew_point/above_saturation", values["dew_point"] > air + DEW_POINT_MARGIN
    if "vapour_pressure" in values:
        most = VAPOUR_PRESSURE_MARGIN * saturation_vapour_pressure(air)
        yield "vapour_pressure/above_saturation", values["vapour_pressure"] > most


def _stuck(site: Site, instants: NDArray[np.int64], values: Mapping[str, Floats]) -> _Named:
    """Values that are the same through a local day of `STUCK_HOURS` or more."""
    day = (instants + round(site.utc_offset_h * 3600.0)) // 86400
    for name in ("wind_speed", "air_temperature", "shortwave_down", "longwave_down"):
        if name not in values:
            continue
        stuck = _constant_days(values[name], day, instants)
        if name == "shortwave_down":  # a polar night rightly reads nothing but zero
            sine, _ = elevation_at_instants(site.latitude_deg, site.longitude_deg, instants)
            stuck &= _any_of_day(sine > 0.1, day)
        yield f"{name}/stuck", stuck


def _groups(day: NDArray[np.int64]) -> tuple[NDArray[np.intp], int]:
    """Each row's group number, and how many groups there are."""
    unique, group = np.unique(day, return_inverse=True)
    return group, unique.size


def _any_of_day(which: Bools, day: NDArray[np.int64]) -> Bools:
    group, count = _groups(day)
    return (np.bincount(group, weights=which, minlength=count) > 0)[group]


def _constant_days(values: Floats, day: NDArray[np.int64], instants: NDArray[np.int64]) -> Bools:
    known = ~np.isnan(values)
    constant = np.zeros(values.shape, dtype=np.bool_)
    if not known.any():
        return constant
    group, count = _groups(day[known])
    low, high = np.full(count, np.inf), np.full(count, -np.inf)
    first, last = np.full(count, np.inf), np.full(count, -np.inf)
    np.minimum.at(low, group, values[known])
    np.maximum.at(high, group, values[known])
    np.minimum.at(first, group, instants[known].astype(np.float64))
    np.maximum.at(last, group, instants[known].astype(np.float64))
    enough = (np.bincount(group, minlength=count) >= STUCK_ROWS) & (
        last - first >= STUCK_HOURS * 3600.0
    )
    constant[known] = ((low == high) & enough)[group]
    return constant
