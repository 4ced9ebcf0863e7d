"""Longwave radiation: black bodies, cloudiness from shortwave, and net longwave."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.constants import (
    ASCE,
    KELVIN,
    LOW_SUN,
    POLAR_NIGHT_CLOUD_RATIO,
    STEFAN_BOLTZMANN_W,
    Standard,
)


def fourth_power_kelvin(temperature: ArrayLike) -> Floats:
    """Fourth power of an absolute temperature.

    Arguments: `temperature`, any shape [degC]. Returns T^4 [K4]. NaN gives NaN.
    Source: FAO-56 eq 39 (0 degC is 273.16 K).
    """
    kelvin = floats(temperature) + KELVIN
    square = kelvin * kelvin
    return square * square


def black_body_daily(tmax: ArrayLike, tmin: ArrayLike, constants: Standard = ASCE) -> Floats:
    """Radiation of a black body at a day's air temperature: the mean of both extremes.

    Arguments, shapes that broadcast: `tmax`, `tmin` [degC]; `constants`. Returns sigma Ta^4
    [MJ m-2 d-1]. NaN gives NaN. Source: FAO-56 eq 39; ASCE-EWRI eq 17.
    """
    return constants.sigma_day * (fourth_power_kelvin(tmax) + fourth_power_kelvin(tmin)) / 2.0


def clear_sky_ratio(shortwave: ArrayLike, clear_sky_shortwave: ArrayLike) -> Floats:
    """Ratio Rs/Rso, as it stands (not limited).

    Arguments, shapes that broadcast: `shortwave` Rs, `clear_sky_shortwave` Rso [same unit].
    Returns the ratio [-]; NaN where an input is NaN or Rso is 0. Source: FAO-56 eq 39.
    """
    rs, rso = np.broadcast_arrays(floats(shortwave), floats(clear_sky_shortwave))
    return np.asarray(np.divide(rs, rso, out=np.full(rs.shape, np.nan), where=rso > 0.0))


def cloudiness(ratio: ArrayLike, constants: Standard = ASCE) -> Floats:
    """Cloudiness function fcd of net longwave: 1 under clear sky, near 0 under dense cloud.

    Arguments: `ratio` Rs/Rso, any shape [-], limited here to the standard's range; `constants`.
    Returns fcd [-]. NaN gives NaN. Source: FAO-56 eq 39; ASCE-EWRI eq 18, 45.
    """
    limited = np.clip(floats(ratio), constants.least_clear_sky_ratio, 1.0)
    return np.asarray(1.35 * limited - 0.35)


def _emittance(vapour_pressure: ArrayLike) -> Floats:
    """Net emittance 0.34 - 0.14 sqrt(ea) between ground and clear sky; NaN for negative ea."""
    ea = floats(vapour_pressure)
    return 0.34 - 0.14 * np.sqrt(np.where(ea >= 0.0, ea, np.nan))


def net_longwave_daily(
    tmax: ArrayLike,
    tmin: ArrayLike,
    vapour_pressure: ArrayLike,
    ratio: ArrayLike,
    constants: Standard = ASCE,
) -> Floats:
    """Modelled net longwave Rnl of a day, upward positive.

    Arguments, shapes that broadcast: `tmax`, `tmin` [degC]; `vapour_pressure` ea [kPa]; `ratio`
    Rs/Rso [-]; `constants`. Returns Rnl [MJ m-2 d-1]. NaN gives NaN.
    Source: FAO-56 eq 39; ASCE-EWRI eq 17.
    """
    black = black_body_daily(tmax, tmin, constants)
    return black * _emittance(vapour_pressure) * cloudiness(ratio, constants)


def net_longwave_hourly(
    temperature: ArrayLike,
    vapour_pressure: ArrayLike,
    cloud: ArrayLike,
    constants: Standard = ASCE,
) -> Floats:
    """Modelled net longwave Rnl of an hour, upward positive.

    Arguments, shapes that broadcast: `temperature` [degC]; `vapour_pressure` ea [kPa]; `cloud` fcd
    [-] (see `cloudiness`, `hourly_cloudiness`); `constants`. Returns Rnl [MJ m-2 h-1]. NaN gives
    NaN. Source: FAO-56 eq 39 with the hourly constant; ASCE-EWRI eq 44.
    """
    black = constants.sigma_hour * fourth_power_kelvin(temperature)
    return black * _emittance(vapour_pressure) * floats(cloud)


def hourly_cloudiness(
    ratio: ArrayLike, sine_of_elevation: ArrayLike, constants: Standard = ASCE
) -> Floats:
    """Cloudiness fcd of consecutive hours, carried over from the last hour with the sun up enough.

    Arguments: `ratio` Rs/Rso (hours,) in time order; `sine_of_elevation` (hours,) at mid-hour;
    `constants`. Returns fcd (hours,); NaN until the first hour that tells it. A NaN ratio is
    carried over like a low sun. Source: ASCE-EWRI, hourly cloudiness below 0.3 rad.
    """
    values = cloudiness(floats(ratio), constants)
    tells = (np.asarray(sine_of_elevation) >= np.sin(LOW_SUN)) & ~np.isnan(values)
    last = np.maximum.accumulate(np.where(tells, np.arange(values.size), -1))
    return np.where(last >= 0, values[np.maximum(last, 0)], np.nan)


def daily_ratio_or_polar_night(shortwave: ArrayLike, clear_sky_shortwave: ArrayLike) -> Floats:
    """Ratio Rs/Rso of a day for net longwave, with the working value where the sun never rises.

    Arguments, shapes that broadcast: `shortwave` Rs, `clear_sky_shortwave` Rso [MJ m-2 d-1].
    Returns the ratio [-]; NaN where an input is NaN. Source: FAO-56 eq 39; polar night working
    value.
    """
    dark = (np.asarray(clear_sky_shortwave) <= 0.0) & ~np.isnan(shortwave)
    ratio = clear_sky_ratio(shortwave, clear_sky_shortwave)
    return np.where(dark, POLAR_NIGHT_CLOUD_RATIO, ratio)


def longwave_with_body(signal: ArrayLike, body_temperature: ArrayLike) -> Floats:
    """Longwave of a pyrgeometer from its net signal and the temperature of its body.

    Arguments, shapes that broadcast: `signal` voltage over sensitivity, the net exchange [W m-2,
    usually below 0]; `body_temperature` [degC]. Returns longwave [W m-2]. NaN gives NaN.
    Source: definition of the instrument, U/C + sigma Tb^4 (from memory).
    """
    body = STEFAN_BOLTZMANN_W * fourth_power_kelvin(body_temperature)
    return np.asarray(floats(signal) + body)
