"""Reference ET from an evaporation pan."""

from collections.abc import Callable
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats

Pan = Literal["class A", "sunken"]
Fetch = Literal["green", "dry"]
_Formula = Callable[[Floats, Floats, Floats], Floats]


def _class_a_green(u2: Floats, rh: Floats, fetch: Floats) -> Floats:
    log_fetch, log_rh = np.log(fetch), np.log(rh)
    return np.asarray(
        0.108
        - 0.0286 * u2
        + 0.0422 * log_fetch
        + 0.1434 * log_rh
        - 0.000631 * log_fetch**2 * log_rh
    )


def _class_a_dry(u2: Floats, rh: Floats, fetch: Floats) -> Floats:
    log_fetch, log_run = np.log(fetch), np.log(86.4 * u2)
    return np.asarray(
        0.61
        + 0.00341 * rh
        - 0.000162 * u2 * rh
        - 0.00000959 * u2 * fetch
        + 0.00327 * u2 * log_fetch
        - 0.00289 * u2 * log_run
        - 0.0106 * log_run * log_fetch
        + 0.00063 * log_fetch**2 * log_run
    )


def _sunken_green(u2: Floats, rh: Floats, fetch: Floats) -> Floats:
    log_fetch, log_run = np.log(fetch), np.log(86.4 * u2)
    return np.asarray(
        0.87
        + 0.119 * log_fetch
        - 0.0157 * log_run**2
        - 0.0019 * log_fetch**2 * log_run
        + 0.013 * log_run * np.log(rh)
        - 0.000053 * log_run * log_fetch * rh
    )


def _sunken_dry(u2: Floats, rh: Floats, fetch: Floats) -> Floats:
    log_fetch, log_rh = np.log(fetch), np.log(rh)
    return np.asarray(
        1.145
        - 0.080 * u2
        + 0.000903 * u2**2 * log_rh
        - 0.0964 * log_fetch
        + 0.0031 * u2 * log_fetch
        + 0.0015 * log_fetch**2 * log_rh
    )


_FORMULAS: dict[tuple[Pan, Fetch], _Formula] = {
    ("class A", "green"): _class_a_green,
    ("class A", "dry"): _class_a_dry,
    ("sunken", "green"): _sunken_green,
    ("sunken", "dry"): _sunken_dry,
}


def pan_coefficient(
    wind_2m: ArrayLike, rh_mean: ArrayLike, fetch: ArrayLike, *, pan: Pan, surroundings: Fetch
) -> Floats:
    """Pan coefficient Kp of a pan in green or dry surroundings.

    Arguments, shapes that broadcast: `wind_2m` u2 [m s-1, 1..8]; `rh_mean` [%, 30..84]; `fetch`
    upwind of the surroundings [m, 1..1000]; values outside are taken at the nearest end; `pan`
    "class A" or "sunken"; `surroundings` "green" or "dry". Returns Kp [-]. NaN gives NaN.
    Source: FAO-56 table 7 with the ranges printed under it.
    """
    return _FORMULAS[pan, surroundings](
        np.clip(floats(wind_2m), 1.0, 8.0),
        np.clip(floats(rh_mean), 30.0, 84.0),
        np.clip(floats(fetch), 1.0, 1000.0),
    )


def reference_et_from_pan(pan_evaporation: ArrayLike, coefficient: ArrayLike) -> Floats:
    """Reference ETo from pan evaporation.

    Arguments, shapes that broadcast: `pan_evaporation` [mm d-1]; `coefficient` Kp [-]. Returns
    ETo [mm d-1]. NaN gives NaN. Source: FAO-56 eq 55.
    """
    return floats(pan_evaporation) * floats(coefficient)
