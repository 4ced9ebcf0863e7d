"""Shortwave radiation: clear sky, from sunshine, from the temperature range, and its net part."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.constants import GRASS_ALBEDO, K_RS_COASTAL, K_RS_INTERIOR
from app.science.energy.humidity import atmospheric_pressure

DEFAULT_ANGSTROM = (0.25, 0.50)  # FAO-56 eq 35, where no calibration exists


def clear_sky(
    extraterrestrial: ArrayLike, elevation: ArrayLike, angstrom: tuple[float, float] | None = None
) -> Floats:
    """Clear-sky shortwave Rso of the reference equations.

    Arguments, shapes that broadcast: `extraterrestrial` Ra [MJ m-2 per step]; `elevation` z
    [m, below 6000]; `angstrom` calibrated (a, b), None or the defaults for the elevation form.
    Returns Rso in the unit of Ra. NaN gives NaN.
    Source: FAO-56 eq 36 (calibrated) and eq 37; ASCE-EWRI eq 19.
    """
    ra = floats(extraterrestrial)
    if angstrom is not None and angstrom != DEFAULT_ANGSTROM:
        return ra * (angstrom[0] + angstrom[1])
    return ra * (0.75 + 2e-5 * floats(elevation))


def clear_sky_envelope(
    extraterrestrial: ArrayLike,
    elevation: ArrayLike,
    vapour_pressure: ArrayLike,
    sine_of_elevation: ArrayLike,
    turbidity: float = 1.0,
) -> Floats:
    """Clear-sky shortwave as beam and diffuse through moist air, the envelope for pyranometers.

    Arguments, shapes that broadcast: `extraterrestrial` Ra [MJ m-2 per step]; `elevation` z [m];
    `vapour_pressure` ea [kPa]; `sine_of_elevation` [-, above 0]; `turbidity` Kt [-, 0..1].
    Returns Rso in the unit of Ra; NaN where any input is NaN or the sun is down.
    Source: ASCE-EWRI Appendix D (from memory); FAO-56 Annex 3 eq 3-17 to 3-20 in form.
    """
    pressure = atmospheric_pressure(elevation)
    sine = floats(sine_of_elevation)
    sine = np.where(sine > 0.0, sine, np.nan)
    water_mm = 0.14 * floats(vapour_pressure) * pressure + 2.1
    beam = 0.98 * np.exp(
        -0.00146 * pressure / (turbidity * sine) - 0.075 * (water_mm / sine) ** 0.4
    )
    diffuse = np.where(beam >= 0.15, 0.35 - 0.36 * beam, 0.18 + 0.82 * beam)
    return np.asarray((beam + diffuse) * floats(extraterrestrial))


def shortwave_from_sunshine(
    extraterrestrial: ArrayLike,
    sunshine_h: ArrayLike,
    day_length_h: ArrayLike,
    angstrom: tuple[float, float] = DEFAULT_ANGSTROM,
) -> Floats:
    """Shortwave Rs from hours of sunshine.

    Arguments, shapes that broadcast: `extraterrestrial` Ra [MJ m-2 d-1]; `sunshine_h` n [h];
    `day_length_h` N [h]; `angstrom` (a, b). Returns Rs [MJ m-2 d-1]; n/N counts as at most 1, and
    as 0 where N is 0. NaN gives NaN. Source: FAO-56 eq 35.
    """
    n, length = np.broadcast_arrays(floats(sunshine_h), floats(day_length_h))
    dark = np.where((length <= 0.0) & ~np.isnan(n), 0.0, np.nan)
    fraction = np.divide(n, length, out=dark, where=length > 0.0)
    share = angstrom[0] + angstrom[1] * np.minimum(fraction, 1.0)
    return np.asarray(share * floats(extraterrestrial))


def shortwave_from_temperature_range(
    extraterrestrial: ArrayLike,
    tmax: ArrayLike,
    tmin: ArrayLike,
    clear_sky_shortwave: ArrayLike,
    coastal: bool = False,
) -> Floats:
    """Shortwave Rs from the day's temperature range, at most clear sky.

    Arguments, shapes that broadcast: `extraterrestrial` Ra, `clear_sky_shortwave` Rso
    [MJ m-2 d-1]; `tmax`, `tmin` [degC]; `coastal` takes kRs 0.19 instead of 0.16. Returns Rs
    [MJ m-2 d-1]; NaN where an input is NaN or Tmax is below Tmin. Source: FAO-56 eq 50.
    """
    span = floats(tmax) - floats(tmin)
    root = np.sqrt(np.where(span >= 0.0, span, np.nan))
    k_rs = K_RS_COASTAL if coastal else K_RS_INTERIOR
    rs = k_rs * root * floats(extraterrestrial)
    return np.minimum(rs, floats(clear_sky_shortwave))


def net_shortwave(shortwave: ArrayLike, albedo: ArrayLike = GRASS_ALBEDO) -> Floats:
    """Net shortwave Rns of a surface, the reference grass by default.

    Arguments, shapes that broadcast: `shortwave` Rs [MJ m-2 per step]; `albedo` [-, 0..1].
    Returns Rns in the unit of Rs. NaN gives NaN. Source: FAO-56 eq 38; ASCE-EWRI eq 16.
    """
    rs = floats(shortwave)
    return rs * (1.0 - floats(albedo))
