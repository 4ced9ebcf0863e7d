"""Vapour pressure, its saturation and slope, air pressure, and the ladder of humidity sources."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Floats, floats
from app.science.constants import (
    ARID_DEW_POINT_OFFSET,
    ASCE,
    PSYCHROMETER_VENTILATED,
    Standard,
)


def atmospheric_pressure(elevation: ArrayLike) -> Floats:
    """Mean air pressure P at an elevation.

    Arguments: `elevation` z, any shape [m, -450..6000]. Returns P [kPa]. NaN gives NaN.
    Source: FAO-56 eq 7; ASCE-EWRI eq 3.
    """
    z = floats(elevation)
    return np.asarray(101.3 * ((293.0 - 0.0065 * z) / 293.0) ** 5.26)


def psychrometric_constant(pressure: ArrayLike) -> Floats:
    """Psychrometric constant gamma of air at a pressure.

    Arguments: `pressure` P, any shape [kPa]. Returns gamma [kPa degC-1]. NaN gives NaN.
    Source: FAO-56 eq 8; ASCE-EWRI eq 4.
    """
    return floats(pressure) * 0.665e-3


def saturation_vapour_pressure(temperature: ArrayLike) -> Floats:
    """Saturation vapour pressure e0(T) over water.

    Arguments: `temperature` T, any shape [degC, -50..60]. Returns e0 [kPa]. NaN gives NaN.
    Source: FAO-56 eq 11; ASCE-EWRI eq 7.
    """
    t = floats(temperature)
    return np.asarray(0.6108 * np.exp(17.27 * t / (t + 237.3)))


def mean_saturation_vapour_pressure(tmax: ArrayLike, tmin: ArrayLike) -> Floats:
    """Mean saturation vapour pressure es of a day.

    Arguments: `tmax`, `tmin`, shapes that broadcast [degC]. Returns es [kPa]. NaN gives NaN.
    Source: FAO-56 eq 12; ASCE-EWRI eq 6.
    """
    return (saturation_vapour_pressure(tmax) + saturation_vapour_pressure(tmin)) / 2.0


def saturation_slope(temperature: ArrayLike, constants: Standard = ASCE) -> Floats:
    """Slope Delta of the saturation vapour pressure curve.

    Arguments: `temperature` T, any shape [degC]; `constants`. Returns Delta [kPa degC-1]. NaN
    gives NaN. Source: FAO-56 eq 13; ASCE-EWRI eq 5.
    """
    t = floats(temperature)
    shifted = t + 237.3
    return np.asarray(constants.slope_factor * np.exp(17.27 * t / shifted) / (shifted * shifted))


def dew_point(vapour_pressure: ArrayLike) -> Floats:
    """Dew point Tdew of air with a vapour pressure.

    Arguments: `vapour_pressure` ea, any shape [kPa, above 0]. Returns Tdew [degC]; NaN where ea
    is NaN or not above 0. Source: FAO-56 Annex 3 eq 3-11.
    """
    ea = floats(vapour_pressure)
    log = np.log(np.where(ea > 0.0, ea, np.nan))
    return np.asarray((116.91 + 237.3 * log) / (16.78 - log))


def vapour_pressure_psychrometer(
    dry_bulb: ArrayLike,
    wet_bulb: ArrayLike,
    pressure: ArrayLike,
    coefficient: float = PSYCHROMETER_VENTILATED,
) -> Floats:
    """Vapour pressure ea from dry and wet bulb.

    Arguments: `dry_bulb`, `wet_bulb` [degC], `pressure` [kPa], shapes that broadcast;
    `coefficient` of the instrument [degC-1]. Returns ea [kPa]. NaN gives NaN.
    Source: FAO-56 eq 15, 16.
    """
    wet = floats(wet_bulb)
    gamma = coefficient * floats(pressure)
    return saturation_vapour_pressure(wet) - gamma * (np.asarray(dry_bulb) - wet)


def vapour_pressure_rh_extremes(
    tmax: ArrayLike, tmin: ArrayLike, rh_max: ArrayLike, rh_min: ArrayLike
) -> Floats:
    """Vapour pressure ea of a day from both extremes of humidity.

    Arguments, shapes that broadcast: `tmax`, `tmin` [degC]; `rh_max`, `rh_min` [%, 0..100].
    Returns ea [kPa]. NaN gives NaN. Source: FAO-56 eq 17; ASCE-EWRI eq 11.
    """
    at_dawn = saturation_vapour_pressure(tmin) * floats(rh_max)
    at_noon = saturation_vapour_pressure(tmax) * floats(rh_min)
    return (at_dawn + at_noon) / 200.0


def vapour_pressure_rh_max(tmin: ArrayLike, rh_max: ArrayLike) -> Floats:
    """Vapour pressure ea of a day from the highest humidity.

    Arguments, shapes that broadcast: `tmin` [degC]; `rh_max` [%, 0..100]. Returns ea [kPa].
    NaN gives NaN. Source: FAO-56 eq 18; ASCE-EWRI eq 12.
    """
    return saturation_vapour_pressure(tmin) * floats(rh_max) / 100.0


def vapour_pressure_rh_mean(tmax: ArrayLike, tmin: ArrayLike, rh_mean: ArrayLike) -> Floats:
    """Vapour pressure ea of a day from the mean humidity.

    Arguments, shapes that broadcast: `tmax`, `tmin` [degC]; `rh_mean` [%, 0..100]. Returns ea
    [kPa]. NaN gives NaN. Source: FAO-56 eq 19; ASCE-EWRI eq 13.
    """
    mean = floats(rh_mean) / 100.0
    return mean * mean_saturation_vapour_pressure(tmax, tmin)


def vapour_pressure_tmin(tmin: ArrayLike, arid: bool = False) -> Floats:
    """Vapour pressure ea of a day where humidity was not measured: the dew point is Tmin.

    Arguments: `tmin`, any shape [degC]; `arid` takes 2 K off. Returns ea [kPa]. NaN gives NaN.
    Source: FAO-56 eq 48 and Annex 6.
    """
    offset = ARID_DEW_POINT_OFFSET if arid else 0.0
    return saturation_vapour_pressure(floats(tmin) - offset)


HUMIDITY_RUNGS = (
    "none",
    "vapour pressure or dew point",
    "highest and lowest humidity",
    "highest humidity",
    "mean humidity",
    "lowest temperature",
)
# Standard uncertainty of a day's vapour pressure by humidity rung, share of ea: working values.
HUMIDITY_SHARE = np.array([np.nan, 0.04, 0.05, 0.08, 0.08, 0.20])


def best_vapour_pressure(
    *,
    tmax: ArrayLike,
    tmin: ArrayLike,
    vapour_pressure: ArrayLike,
    dew_point: ArrayLike,
    rh_max: ArrayLike,
    rh_min: ArrayLike,
    rh_mean: ArrayLike,
    arid: bool = False,
) -> tuple[Floats, NDArray[np.int8]]:
    """Vapour pressure of each day from the best humidity source present, and that source's rung.

    Arguments, shape (days,): temperatures and dew point [degC], humidities [%, 0..105; above 100
    counts as 100], `vapour_pressure` [kPa]. Returns ea [kPa] and the rung (index into
    HUMIDITY_RUNGS, 0 where even Tmin is NaN). Source: order of FAO-56 chapter 3 and ASCE-EWRI
    table 2, as told on the methods page.
    """
    clipped = [np.minimum(floats(rh), 100.0) for rh in (rh_max, rh_min)]
    mean = np.minimum(floats(rh_mean), 100.0)
    direct = floats(vapour_pressure)
    direct = np.where(np.isnan(direct), saturation_vapour_pressure(dew_point), direct)
    candidates = (
        direct,
        vapour_pressure_rh_extremes(tmax, tmin, *clipped),
        vapour_pressure_rh_max(tmin, clipped[0]),
        vapour_pressure_rh_mean(tmax, tmin, mean),
        vapour_pressure_tmin(tmin, arid),
    )
    best = np.full(np.broadcast_shapes(*(c.shape for c in candidates)), np.nan)
    rung = np.zeros(best.shape, dtype=np.int8)
    for number, candidate in enumerate(candidates, start=1):
        take = (rung == 0) & ~np.isnan(candidate)
        best = np.where(take, candidate, best)
        rung = np.where(take, np.int8(number), rung)
    return best, rung
