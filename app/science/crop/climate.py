"""Adjustment of crop coefficients to wind and humidity."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats

# FAO-56 eq 65 and 70: smaller table values are not adjusted.
LEAST_ADJUSTED = 0.45


def climate_term(wind_2m: ArrayLike, rh_min: ArrayLike, height: ArrayLike) -> Floats:
    """Climate term added to a tabulated coefficient.

    wind_2m [m s-1], held to 1-6; rh_min [%], held to 20-80; height [m], held to 0.1-10; shapes
    broadcast. Returns the term [-]; NaN in, NaN out. Source: FAO-56 eq 62, 70 and 72.
    """
    wind = np.clip(np.asarray(wind_2m, dtype=np.float64), 1.0, 6.0)
    humidity = np.clip(np.asarray(rh_min, dtype=np.float64), 20.0, 80.0)
    tall = np.clip(np.asarray(height, dtype=np.float64), 0.1, 10.0)
    return np.asarray((0.04 * (wind - 2.0) - 0.004 * (humidity - 45.0)) * (tall / 3.0) ** 0.3)


def adjust(
    coefficient: ArrayLike,
    wind_2m: ArrayLike,
    rh_min: ArrayLike,
    height: ArrayLike,
    *,
    least: ArrayLike = LEAST_ADJUSTED,
) -> Floats:
    """Tabulated coefficient adjusted to the climate where it is at least `least`.

    coefficient [-]; other arguments as in `climate_term`; shapes broadcast. `least` 0 adjusts
    always (single Kc mid). NaN in, NaN out. Source: FAO-56 eq 62, 65 and 70.
    """
    table = np.asarray(coefficient, dtype=np.float64)
    adjusted = table + climate_term(wind_2m, rh_min, height)
    return np.asarray(np.where(table >= np.asarray(least), adjusted, table))


def alfalfa_to_grass(wind_2m: ArrayLike, rh_min: ArrayLike) -> Floats:
    """Ratio of an alfalfa-based to a grass-based coefficient [-].

    wind_2m [m s-1], rh_min [%]; NaN in, NaN out. Source: FAO-56 eq 68 (alfalfa 0.5 m tall).
    """
    return 1.2 + climate_term(wind_2m, rh_min, 0.5)
