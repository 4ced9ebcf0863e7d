"""The crop coefficient, root and height curves of a season, day by day."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Days, Floats
from app.science.crop.climate import LEAST_ADJUSTED, adjust
from app.science.crop.season import CropSeason

# Length of the trailing mean of wind and humidity (working value).
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
    in_season: Bools
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


def _ramp(day: Floats, before: float | Floats, length: float | Floats) -> Floats:
    """0 up to `before`, 1 from `before + length` on, linear between; a step where length is 0."""
    shortest = np.maximum(np.asarray(length, dtype=np.float64), 1e-9)
    return np.asarray(np.clip((day - before) / shortest, 0.0, 1.0))


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
    """Curves of one season; arguments as in `season_curves` but each (days,)."""
    curve = season_curves([season], date[:, None], wind_2m[:, None], rh_min[:, None])
    return Curve(**{name: values[:, 0] for name, values in vars(curve).items()})


def season_curves(
    seasons: Sequence[CropSeason],
    date: Days,
    wind_2m: Floats,
    rh_min: Floats,
    within: Bools | None = None,
) -> Curve:
    """Curves of many seasons, each on its own consecutive days under the weather of those days.

    date (days, seasons) datetime64[D]; wind_2m [m s-1] and rh_min [%], same shape, NaN-free
    inside the season. within: False on days that only pad a shorter season's column, taken as off
    season. Heights and roots follow the table's own curve, so that weather moves
    neither. Off season (before planting, after the last day) the soil is bare: Kcb = Kc_min = 0
    (Kc of the initial stage when single); perennials keep the initial coefficient; roots keep the
    depth they reached. Returns (days, seasons) arrays.
    Source: FAO-56 eq 66, 62, 65, 70, 8-1; chapter 11 (off season).
    """
    table = _Table(seasons)
    day = (date - table.planting).astype(np.float64) + 1.0
    in_season = (day >= 1.0) & (day <= table.last)
    if within is not None:
        in_season &= within
    grown, aged = _progress(day, table)
    k_mid, k_end = _adjusted(table, day, in_season, wind_2m, rh_min)
    k = table.k_ini + grown * (k_mid - table.k_ini) + aged * (k_end - k_mid)
    bare = np.where(table.dual & ~table.perennial, 0.0, table.k_ini)
    growing = in_season | table.perennial
    roots = _roots_progress(np.minimum(day, table.last), table)
    number = 1 + (day > table.ends[0]) + (day > table.ends[1]) + (day > table.ends[2])
    return Curve(
        coefficient=np.where(in_season, np.maximum(k, 0.0), bare),
        kc_min=np.where(growing, table.kc_min, 0.0),
        height=_height(table, grown, in_season),
        root_depth=table.root_min + (table.root_max - table.root_min) * roots,
        in_season=in_season,
        stage=np.where(in_season, number, 0).astype(np.int8),
    )


class _Table:
    """The seasons' numbers as arrays (seasons,), ready to broadcast over days."""

    def __init__(self, seasons: Sequence[CropSeason]) -> None:
        def column(name: str) -> Floats:
            return np.array([getattr(season, name) for season in seasons], dtype=np.float64)

        self.planting = np.array([s.planting for s in seasons], dtype="datetime64[D]")
        last_day = np.array([s.last_day for s in seasons], dtype="datetime64[D]")
        self.last = (last_day - self.planting).astype(np.float64) + 1.0
        self.lengths = np.array([s.stage_days for s in seasons], dtype=np.float64).T
        self.ends = np.cumsum(self.lengths, axis=0)
        self.dual = np.array([s.coefficients == "dual" for s in seasons])
        self.perennial = np.array([s.perennial for s in seasons])
        self.climate = np.array([s.climate_adjustment for s in seasons])
        self.k_ini, self.k_mid, self.k_end = column("k_ini"), column("k_mid"), column("k_end")
        self.kc_min, self.height = column("kc_min"), column("height_max_m")
        self.root_max = column("root_max_m")
        self.root_min = np.where(self.perennial, self.root_max, column("root_min_m"))


def _progress(day: Floats, table: _Table) -> tuple[Floats, Floats]:
    grown = _ramp(day, table.ends[0], table.lengths[1])
    return grown, _ramp(day, table.ends[2], table.lengths[3])


def _roots_progress(day: Floats, table: _Table) -> Floats:
    """Share of root growth done: with the basal curve (FAO-56 eq 8-1) when dual; from planting to
    the first day of mid-season when single."""
    dual = _ramp(day, table.ends[0], table.lengths[1])
    single = np.clip((day - 1.0) / np.maximum(table.ends[1], 1.0), 0.0, 1.0)
    return np.where(table.dual, dual, single)


def _height(table: _Table, grown: Floats, in_season: Bools) -> Floats:
    """Height [m]: its maximum times Kcb / Kcb mid by the table, never shrinking (FAO-56 Annex 8);
    perennials always at the maximum; bare soil 0."""
    k = table.k_ini + grown * (table.k_mid - table.k_ini)
    share = np.clip(k / np.maximum(table.k_mid, 1e-6), 0.0, 1.0)
    tall = np.where(table.perennial, table.height, table.height * share)
    return np.where(in_season | table.perennial, tall, 0.0)


def _adjusted(
    table: _Table, day: Floats, in_season: Bools, wind: Floats, rh_min: Floats
) -> tuple[Floats, Floats]:
    """k_mid and k_end of each day by each season's climate adjustment."""
    least_mid = np.where(table.dual, LEAST_ADJUSTED, 0.0)
    k_mid = np.broadcast_to(table.k_mid, day.shape).copy()
    k_end = np.broadcast_to(table.k_end, day.shape).copy()
    for choice in set(table.climate.tolist()) - {"none"}:
        those = np.flatnonzero(table.climate == choice)
        inside = in_season[:, those]
        u2, rh = (np.where(inside, x[:, those], np.nan) for x in (wind, rh_min))
        ends, days = table.ends[:, those], day[:, those]
        if choice == "stage_mean":
            mid = (days > ends[1]) & (days <= ends[2])
            late = (days > ends[2]) & (days <= ends[3])
            for_mid = _mean_of(u2, mid), _mean_of(rh, mid)
            for_end = _mean_of(u2, late), _mean_of(rh, late)
        else:
            daily = choice == "day"
            for_mid = (u2, rh) if daily else (_trailing(u2, inside), _trailing(rh, inside))
            for_end = for_mid
        height = table.height[those]
        k_mid[:, those] = adjust(table.k_mid[those], *for_mid, height, least=least_mid[those])
        k_end[:, those] = adjust(table.k_end[those], *for_end, height)
    return k_mid, k_end


def _mean_of(values: Floats, stage: Bools) -> Floats:
    """Mean of each column over the stage's days; over its season where no such day is in sight."""
    here = ~np.isnan(values)
    chosen = np.where((stage & here).any(axis=0), stage & here, here)
    count = chosen.sum(axis=0)
    # Added up day by day (a plain sum's order depends on the array's shape).
    total = np.cumsum(np.where(chosen, values, 0.0), axis=0)[-1]
    mean = np.divide(total, count, out=np.full(total.shape, np.nan), where=count > 0)
    return np.broadcast_to(mean, values.shape)


def _trailing(values: Floats, in_season: Bools) -> Floats:
    """Mean of the day and the up to 29 days of the season before it; NaN off season."""
    total = np.zeros((values.shape[0] + 1, values.shape[1]))
    np.cumsum(np.where(in_season, values, 0.0), axis=0, out=total[1:])
    after = np.arange(1, values.shape[0] + 1)[:, None]
    before = np.maximum(after - TRAILING_DAYS, np.argmax(in_season, axis=0))
    sums = total[1:] - np.take_along_axis(total, before, axis=0)
    return np.where(in_season, sums / np.maximum(after - before, 1), np.nan)
