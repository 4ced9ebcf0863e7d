"""Kc of the initial stage from how often, how much and how much of the soil is wetted."""

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats
from app.science.crop.ranges import check_range
from app.science.crop.season import CropSeason

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


def kc_ini_own_soil(
    interval: ArrayLike,
    eto: ArrayLike,
    tew: ArrayLike,
    rew: ArrayLike,
    depth: ArrayLike = np.inf,
    fw: ArrayLike = 1.0,
) -> Floats:
    """Kc ini of the whole field for wettings of a known soil.

    interval [d] > 0; eto [mm d-1] > 0; tew > rew >= 0 [mm] at 5 mm/d and more; depth of a wetting
    over the field [mm]; fw wetted fraction 0.01-1; shapes broadcast. Below 5 mm/d TEW counts times
    sqrt(ETo / 5), for Kc ini alone; no wetting gives more to evaporation than its depth where it
    falls. NaN in, NaN out. Source: FAO-56 Annex 7, eq 7-1 to 7-6, eq 60 and 61; the bound by depth
    is mass balance.
    """
    et, share = np.asarray(eto, dtype=np.float64), np.asarray(fw, dtype=np.float64)
    cool = np.asarray(tew, dtype=np.float64) * np.sqrt(np.minimum(et, 5.0) / 5.0)
    total = np.minimum(cool, infiltrated_depth(depth, share))
    ready = np.minimum(np.asarray(rew, dtype=np.float64), total - 0.01)
    return np.asarray(kc_ini(interval, et, total, np.maximum(ready, 0.0)) * share)


def wettings(rain: Floats, irrigation: Floats, eto: Floats) -> tuple[int, float]:
    """Number of wettings of a span of days and their mean depth [mm].

    rain, irrigation, eto (days,) [mm], NaN-free. Water up to a fifth of the day's ETo is ignored;
    wet days next to each other are one wetting. Depth 0 for none. Source: FAO-56 Annex 7 (days
    next to each other) and chapter 8 (rain below 0.2 ETo).
    """
    water = rain + irrigation
    wet = water > 0.2 * eto
    first = wet & ~np.concatenate(([False], wet[:-1]))
    count = int(first.sum())
    return count, float(np.cumsum(np.where(wet, water, 0.0))[-1]) / count if count else 0.0


def season_of_wetting(season: CropSeason, kc: float) -> CropSeason:
    """The season with `kc` 0-1.2 as the single coefficient of its initial stage.

    For a coefficient from how often the soil is wetted (`kc_ini_initial_stage`,
    `kc_ini_own_soil`). Raises ValueError for a dual season, whose evaporation is reckoned daily.
    Source: FAO-56 chapter 6, eq 59.
    """
    if season.coefficients != "single":
        raise ValueError("Kc ini by wetting is for single coefficients; dual ones reckon it daily")
    check_range("kc", kc, 0.0, 1.2)
    return replace(season, k_ini=kc)
