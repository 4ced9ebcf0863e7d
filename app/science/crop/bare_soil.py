"""Kc of the initial stage from how often, how much and how much of the soil is wetted."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats

# FAO-56 Annex 7: potential soil evaporation over ETo, and the ceiling of Kc ini.
BARE_SOIL_FACTOR = 1.15
# FAO-56 eq 59: wettings up to 10 mm are light (figure 29), from 40 mm on heavy (figure 30).
LIGHT_MM, HEAVY_MM = 10.0, 40.0


def kc_ini(interval: ArrayLike, eto: ArrayLike, tew: ArrayLike, rew: ArrayLike) -> Floats:
    """Mean Kc of bare soil wetted every `interval` days.

    interval [d] > 0; eto [mm d-1] > 0; tew > rew >= 0 [mm]; shapes broadcast. Returns Kc ini [-],
    at most 1.15; NaN in, NaN out. Source: FAO-56 eq 7-1 to 7-4.
    """
    tw, et, total, ready = (np.asarray(x, dtype=np.float64) for x in (interval, eto, tew, rew))
    potential = BARE_SOIL_FACTOR * et
    first_stage = ready / potential
    drying = total - ready
    decay = (tw - first_stage) * potential * (1.0 + ready / drying) / total
    late = (total - drying * np.exp(-np.maximum(decay, 0.0))) / (tw * et)
    mean = np.where(tw <= first_stage, BARE_SOIL_FACTOR, late)
    return np.asarray(np.minimum(mean, BARE_SOIL_FACTOR))


def kc_ini_light(interval: ArrayLike, eto: ArrayLike) -> Floats:
    """Kc ini for wettings of at most 10 mm on any soil (FAO-56 figure 29, Annex 7).

    Arguments and return as in `kc_ini`.
    """
    et = np.asarray(eto, dtype=np.float64)
    return kc_ini(interval, et, 10.0, np.minimum(np.maximum(2.5, 6.0 / np.sqrt(et)), 7.0))


def kc_ini_heavy(interval: ArrayLike, eto: ArrayLike, *, coarse: bool) -> Floats:
    """Kc ini for wettings of 40 mm or more (FAO-56 figure 30a coarse, 30b medium and fine soils;
    Annex 7). Arguments and return as in `kc_ini`."""
    root = np.sqrt(np.asarray(eto, dtype=np.float64))
    tew = np.minimum(15.0, 7.0 * root) if coarse else np.minimum(28.0, 13.0 * root)
    return kc_ini(interval, eto, tew, np.minimum(6.0 if coarse else 9.0, tew - 0.01))


def kc_ini_between(depth: ArrayLike, light: ArrayLike, heavy: ArrayLike) -> Floats:
    """Kc ini for a wetting of `depth` [mm], linear between 10 mm (`light`) and 40 mm (`heavy`).

    Shapes broadcast; NaN in, NaN out. Source: FAO-56 eq 59.
    """
    share = (np.asarray(depth, dtype=np.float64) - LIGHT_MM) / (HEAVY_MM - LIGHT_MM)
    low = np.asarray(light, dtype=np.float64)
    return np.asarray(low + np.clip(share, 0.0, 1.0) * (np.asarray(heavy) - low))


def kc_ini_initial_stage(
    interval: ArrayLike, eto: ArrayLike, depth: ArrayLike, fw: ArrayLike = 1.0, *, coarse: bool
) -> Floats:
    """Kc ini of the initial stage for irrigations of `depth` over the field every `interval` days.

    interval [d], eto [mm d-1], depth [mm] over the whole field, fw wetted fraction 0.01-1;
    shapes broadcast; NaN in, NaN out. Source: FAO-56 eq 59 to 61.
    """
    share = np.asarray(fw, dtype=np.float64)
    wetted_depth = infiltrated_depth(depth, share)
    light = kc_ini_light(interval, eto)
    heavy = kc_ini_heavy(interval, eto, coarse=coarse)
    return np.asarray(kc_ini_between(wetted_depth, light, heavy) * share)


def infiltrated_depth(depth: ArrayLike, fw: ArrayLike) -> Floats:
    """Depth [mm] where the water falls: `depth` over the field by the wetted fraction (FAO-56
    eq 61). Shapes broadcast; NaN in, NaN out."""
    return np.asarray(np.asarray(depth, dtype=np.float64) / np.asarray(fw, dtype=np.float64))


def wetting_interval(initial_days: ArrayLike, wettings: ArrayLike) -> Floats:
    """Mean interval [d] of `wettings` in an initial stage of `initial_days` (FAO-56 eq 7-7).

    Shapes broadcast; NaN in, NaN out.
    """
    days = np.asarray(initial_days, dtype=np.float64)
    return np.asarray(days / (np.asarray(wettings, dtype=np.float64) + 0.5))
