"""The crop coefficient, root and height curves of a season, day by day."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science.crop.climate import LEAST_ADJUSTED, adjust
from app.science.crop.season import CropSeason

Floats = NDArray[np.float64]
Days = NDArray[np.datetime64]

# METHODS of the project: length of the trailing mean of wind and humidity (working value).
TRAILING_DAYS = 30


@dataclass(frozen=True, kw_only=True)
class Curve:
    """A season's curves, each (days,): coefficient (Kcb when dual, Kc when single) [-], kc_min of
    the day [-], height [m], root_depth [m], in_season bool, and stage: 0 off season, 1 initial,
    2 development, 3 mid, 4 late."""

    coefficient: Floats
    kc_min: Floats
    height: Floats
    root_depth: Floats
    in_season: NDArray[np.bool_]
    stage: NDArray[np.int8]


def stage_progress(day: ArrayLike, stage_days: tuple[int, int, int, int]) -> tuple[Floats, Floats]:
    """How far development and the late stage have gone on `day` of the season, each 0-1.

    day: any shape [d], the planting day is 1; fractions allowed. A stage is complete at the close
    of its last day; a stage of no days is passed at once. Source: FAO-56 eq 66.
    """
    day = np.asarray(day, dtype=np.float64)
    first, development, mid, late = stage_days
    grown = _ramp(day, first, development)
    aged = _ramp(day, first + development + mid, late)
    return grown, aged


def _ramp(day: Floats, before: int, length: int) -> Floats:
    if length == 0:
        return np.asarray(day > before, dtype=np.float64)
    return np.asarray(np.clip((day - before) / length, 0.0, 1.0))


def coefficient_on(
    day: ArrayLike,
    stage_days: tuple[int, int, int, int],
    k_ini: ArrayLike,
    k_mid: ArrayLike,
    k_end: ArrayLike,
) -> Floats:
    """Crop coefficient [-] on `day` of the season: level, rising, level, falling.

    day as in `stage_progress`; k_ini, k_mid, k_end [-] broadcast with it. NaN in, NaN out.
    Source: FAO-56 eq 66 and figure 34.
    """
    grown, aged = stage_progress(day, stage_days)
    ini, mid, end = (np.asarray(k, dtype=np.float64) for k in (k_ini, k_mid, k_end))
    return np.asarray(ini + grown * (mid - ini) + aged * (end - mid))


def season_curve(season: CropSeason, date: Days, wind_2m: Floats, rh_min: Floats) -> Curve:
    """Curves of `season` on the consecutive days `date` under the weather of those days.

    date (days,) datetime64[D]; wind_2m [m s-1], rh_min [%] (days,), NaN-free inside the season.
    Heights and roots follow the table's own curve, so that weather moves neither. Off season
    (before planting, after `last_day`): bare soil, Kcb = Kc_min = 0 (Kc of the initial stage when
    single); perennials keep the initial coefficient; roots keep the depth they reached.
    Source: FAO-56 eq 66, 62, 65, 70, 8-1; chapter 11 (off season).
    """
    day = (date - season.planting.astype("datetime64[D]")).astype(np.float64) + 1.0
    in_season = (day >= 1.0) & (date <= season.last_day)
    k_mid, k_end = _adjusted(season, day, in_season, wind_2m, rh_min)
    k = coefficient_on(day, season.stage_days, season.k_ini, k_mid, k_end)
    dual = season.coefficients == "dual"
    bare = 0.0 if dual and not season.perennial else season.k_ini
    return Curve(
        coefficient=np.where(in_season, np.maximum(k, 0.0), bare),
        kc_min=np.where(in_season | season.perennial, season.kc_min, 0.0),
        height=_height(season, day, in_season),
        root_depth=_root_depth(season, day),
        in_season=in_season,
        stage=_stage(season, day, in_season),
    )


def _adjusted(
    season: CropSeason, day: Floats, in_season: NDArray[np.bool_], wind: Floats, rh_min: Floats
) -> tuple[Floats, Floats]:
    """k_mid and k_end of each day by the season's climate adjustment."""
    shape = day.shape
    if season.climate_adjustment == "none":
        return np.full(shape, season.k_mid), np.full(shape, season.k_end)
    first, development, mid, late = season.stage_days
    opening = first + development
    closing = opening + mid
    if season.climate_adjustment == "stage_mean":
        in_mid = in_season & (day > opening) & (day <= closing)
        in_late = in_season & (day > closing) & (day <= closing + late)
        climates = [
            (_mean_where(wind, stage, in_season), _mean_where(rh_min, stage, in_season))
            for stage in (in_mid, in_late)
        ]
    elif season.climate_adjustment == "day":
        climates = [(wind, rh_min)] * 2
    else:
        climates = [(_trailing(wind, in_season), _trailing(rh_min, in_season))] * 2
    least_mid = LEAST_ADJUSTED if season.coefficients == "dual" else 0.0
    height = season.height_max_m
    return (
        adjust(season.k_mid, *climates[0], height, least=least_mid),
        adjust(season.k_end, *climates[1], height),
    )


def _mean_where(values: Floats, stage: NDArray[np.bool_], season: NDArray[np.bool_]) -> Floats:
    """Mean over the stage's days; over the season's where the stage is not in sight."""
    chosen = stage if stage.any() else season
    mean = float(values[chosen].mean()) if chosen.any() else np.nan
    return np.full(values.shape, mean)


def _trailing(values: Floats, in_season: NDArray[np.bool_]) -> Floats:
    """Mean of the day and the up to 29 days of the season before it; NaN off season."""
    kept = np.where(in_season, values, 0.0)
    mean = np.full(values.shape, np.nan)
    total = np.concatenate(([0.0], np.cumsum(kept)))
    count = np.concatenate(([0], np.cumsum(in_season)))
    here = np.flatnonzero(in_season)
    from_day = np.maximum(here + 1 - TRAILING_DAYS, 0)
    mean[here] = (total[here + 1] - total[from_day]) / (count[here + 1] - count[from_day])
    return mean


def _height(season: CropSeason, day: Floats, in_season: NDArray[np.bool_]) -> Floats:
    """Height [m]: its maximum times Kcb / Kcb mid by the table, never shrinking (FAO-56 Annex 8);
    perennials always at the maximum; bare soil 0."""
    if season.perennial:
        return np.full(day.shape, season.height_max_m)
    before_late = (*season.stage_days[:3], 10**6)
    k = coefficient_on(day, before_late, season.k_ini, season.k_mid, season.k_mid)
    share = np.clip(k / season.k_mid, 0.0, 1.0) if season.k_mid > 0 else np.ones(day.shape)
    return np.where(in_season, season.height_max_m * share, 0.0)


def _root_depth(season: CropSeason, day: Floats) -> Floats:
    """Root depth [m] by the table's basal curve (FAO-56 eq 8-1); with single coefficients linear
    from planting to the first day of mid-season; perennials at the maximum; kept after harvest."""
    if season.perennial:
        return np.full(day.shape, season.root_max_m)
    last = (season.last_day - season.planting.astype("datetime64[D]")).astype(np.float64) + 1.0
    until = np.minimum(day, last)
    if season.coefficients == "single":
        share = _ramp(until - 1.0, 0, season.stage_days[0] + season.stage_days[1])
    else:
        share, _ = stage_progress(until, season.stage_days)
    return season.root_min_m + (season.root_max_m - season.root_min_m) * share


def _stage(season: CropSeason, day: Floats, in_season: NDArray[np.bool_]) -> NDArray[np.int8]:
    ends = np.cumsum(season.stage_days)[:3]
    number = 1 + np.searchsorted(ends, day - 1.0, side="right")
    return np.where(in_season, number, 0).astype(np.int8)
