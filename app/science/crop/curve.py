"""The crop coefficient, root and height curves of a season, day by day."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Days, Floats
from app.science.crop.climate import LEAST_ADJUSTED, adjust, climate_term
from app.science.crop.position import Position, positions, ramp
from app.science.crop.season import CropSeason
from app.science.crop.stand import stand_kcb

# Length of the trailing mean of wind and humidity (working value).
TRAILING_DAYS = 30
# FAO-56 eq 76: the most of the ground that counts as covered.
MOST_COVER = 0.99


@dataclass(frozen=True, kw_only=True)
class Curve:
    """A season's curves, each (days,): coefficient (Kcb when dual, Kc when single) [-], kc_min of
    the day [-], height [m], root_depth [m], in_season bool, stage: 0 off season, 1 initial,
    2 development, 3 mid, 4 late; cover: fraction of ground covered as seen, NaN where it follows
    from the coefficient."""

    coefficient: Floats
    kc_min: Floats
    height: Floats
    root_depth: Floats
    in_season: Bools
    stage: NDArray[np.int8]
    cover: Floats


def stage_progress(day: ArrayLike, stage_days: tuple[int, int, int, int]) -> tuple[Floats, Floats]:
    """How far development and the late stage have gone on `day` of the season, each 0-1.

    day: any shape [d], the planting day is 1; fractions allowed. A stage is complete at the close
    of its last day; a stage of no days is passed at once. Source: FAO-56 eq 66.
    """
    day = np.asarray(day, dtype=np.float64)
    first, development, mid, late = stage_days
    grown = ramp(day, first, development)
    aged = ramp(day, first + development + mid, late)
    return grown, aged


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


def season_curve(
    season: CropSeason,
    date: Days,
    wind_2m: Floats,
    rh_min: Floats,
    *,
    warmth: Floats | None = None,
    warmth_before: float = 0.0,
) -> Curve:
    """Curves of one season; arguments as in `season_curves` but each (days,)."""
    curve = season_curves(
        [season],
        date[:, None],
        wind_2m[:, None],
        rh_min[:, None],
        warmth=None if warmth is None else warmth[:, None],
        warmth_before=[warmth_before],
    )
    return Curve(**{name: values[:, 0] for name, values in vars(curve).items()})


def season_curves(
    seasons: Sequence[CropSeason],
    date: Days,
    wind_2m: Floats,
    rh_min: Floats,
    within: Bools | None = None,
    *,
    warmth: Floats | None = None,
    warmth_before: Sequence[float] | None = None,
) -> Curve:
    """Curves of many seasons, each on its own consecutive days under the weather of those days.

    date (days, seasons) datetime64[D]; wind_2m [m s-1] and rh_min [%], same shape, NaN-free
    inside the season. within: False on days that only pad a shorter season's column, taken as off
    season. warmth and warmth_before: degree days, as in `positions`. Heights and roots follow the
    table's own curve, so that weather moves neither; heights of forage fall with each cutting.
    Off season (before planting, after the last day) the soil is bare: Kcb = Kc_min = 0 (Kc of the
    initial stage when single); perennials keep the initial coefficient; roots keep the depth they
    reached. Returns (days, seasons) arrays.
    Source: FAO-56 eq 66, 62, 65, 70, 8-1, 98; chapter 10 (mulch), chapter 11 (off season).
    """
    table = _Table(seasons)
    place = positions(seasons, date, within, warmth, warmth_before)
    in_season = place.in_season
    wind, humid = by_end = _climate(table, place, wind_2m, rh_min, late=False)
    if (table.climate == "stage_mean").any():
        by_end = _climate(table, place, wind_2m, rh_min, late=True)
    k_mid = _moved(table, table.k_mid, wind, humid, np.where(table.dual, LEAST_ADJUSTED, 0.0))
    k_end = _moved(table, table.k_end, *by_end, LEAST_ADJUSTED)
    k = table.k_ini + place.grown * (k_mid - table.k_ini) + place.aged * (k_end - k_mid)
    bare = np.where(table.dual & ~table.perennial, 0.0, table.k_ini)
    growing = in_season | table.perennial
    coefficient = np.where(in_season, np.maximum(k, 0.0), bare)
    height = _height(table, place.grown, in_season)
    cover = np.full(coefficient.shape, np.nan)
    for b, season in enumerate(seasons):
        if season.cover_seen:
            full = k_mid[:, b] if season.canopy.full == "table" else None
            told = _by_cover(
                season, date[:, b], coefficient[:, b], full, wind[:, b], humid[:, b], height[:, b]
            )
            here = in_season[:, b] & ~np.isnan(told[0])
            for column, values in zip((coefficient, cover, height), told, strict=True):
                column[:, b] = np.where(here, values, column[:, b])
        if season.mulch is not None:
            less = np.where(in_season[:, b], 1.0 - season.mulch.reduction, 1.0)
            coefficient[:, b] *= less
    return Curve(
        coefficient=coefficient,
        kc_min=np.where(growing, table.kc_min, 0.0),
        height=height,
        root_depth=table.root_min + (table.root_max - table.root_min) * place.roots,
        in_season=in_season,
        stage=np.where(in_season, place.stage, 0).astype(np.int8),
        cover=cover,
    )


def _by_cover(
    season: CropSeason,
    date: Days,
    curve: Floats,
    full: Floats | None,
    wind: Floats,
    humid: Floats,
    height: Floats,
) -> tuple[Floats, Floats, Floats]:
    """Kcb, cover and height [m] from cover seen, each (days,); NaN before the first seen.

    full: Kcb at full cover, or None for that of the height; wind, humid: the season's climate.
    """
    seen = season.cover_seen
    days = date.astype("datetime64[D]").astype(np.float64)
    when = np.array([s.date.astype("datetime64[D]").astype(np.float64) for s in seen])
    cover = np.interp(days, when, [s.cover for s in seen], left=np.nan)
    tall = np.interp(days, when, [s.height_m for s in seen], left=np.nan)
    then = _curve_when(season, date, curve, seen[-1].date)
    moved = np.where(days > when[-1], curve / then if then > 0.0 else 1.0, 1.0)
    cover = np.minimum(cover * moved, MOST_COVER)
    tall = np.minimum(tall * np.maximum(moved, 1.0), np.maximum(tall, season.height_max_m))
    calm = np.isnan(wind)
    if full is None:
        term = climate_term(wind, humid, tall)
        full = np.minimum(1.0 + 0.1 * tall, 1.20) + np.where(calm, 0.0, term)
    kcb = stand_kcb(season.canopy, cover, tall, _day_of_year(date), full, season.kc_min)
    return kcb, cover, tall


def _curve_when(season: CropSeason, date: Days, curve: Floats, when: np.datetime64) -> float:
    """The season's own coefficient on the day `when`; before the first day of `date` by the
    table, or as on the first day where the stages do not go by days alone."""
    place = int((when - date[0]).astype("timedelta64[D]").astype(np.int64))
    if place < 0 and season.plain:
        day = float((when - season.planting).astype("timedelta64[D]").astype(np.int64)) + 1.0
        k = coefficient_on(day, season.stage_days, season.k_ini, season.k_mid, season.k_end)
        return float(k)
    return float(curve[min(max(place, 0), curve.size - 1)])


def _day_of_year(date: Days) -> Floats:
    first = date.astype("datetime64[Y]").astype("datetime64[D]")
    return np.asarray((date.astype("datetime64[D]") - first).astype(np.float64) + 1.0)


def season_of_stand(season: CropSeason, cover: float, height_m: float) -> CropSeason:
    """The season with Kcb mid and end of a stand of `cover` 0-1 and `height_m` at mid-season.

    Kcb mid by the season's canopy and the noon sun of the first day of mid-season, at the table's
    climate (the season's climate adjustment comes on top); Kcb end keeps its share of Kcb mid,
    and is no less than live ground cover; Kcb ini stays, as ground cover may still rest. Raises
    ValueError with single coefficients. Source: FAO-56 chapter 9; `stand_kcb`.
    """
    if season.coefficients != "dual":
        raise ValueError("a stand's cover tells Kcb, not Kc: choose dual coefficients")
    canopy = season.canopy
    mid = season.planting + np.timedelta64(sum(season.stage_days[:2]), "D")
    full = season.k_mid if canopy.full == "table" else min(1.0 + 0.1 * height_m, 1.20)
    day = _day_of_year(np.array([mid], dtype="datetime64[D]"))
    kcb = float(stand_kcb(canopy, cover, height_m, day, full, season.kc_min)[0])
    ground = canopy.ground_cover_kcb or 0.0
    end = kcb * season.k_end / season.k_mid if season.k_mid > 0.0 else kcb
    return replace(
        season,
        k_mid=kcb,
        k_end=max(end, ground),
        height_max_m=height_m,
    )


class _Table:
    """The seasons' numbers as arrays (seasons,), ready to broadcast over days."""

    def __init__(self, seasons: Sequence[CropSeason]) -> None:
        def column(name: str) -> Floats:
            return np.array([getattr(season, name) for season in seasons], dtype=np.float64)

        self.dual = np.array([s.coefficients == "dual" for s in seasons])
        self.perennial = np.array([s.perennial for s in seasons])
        self.climate = np.array([s.climate_adjustment for s in seasons])
        self.k_ini, self.k_mid, self.k_end = column("k_ini"), column("k_mid"), column("k_end")
        self.kc_min, self.height = column("kc_min"), column("height_max_m")
        self.forage = np.array([s.forage for s in seasons])
        self.root_max = column("root_max_m")
        self.root_min = np.where(self.perennial, self.root_max, column("root_min_m"))


def _height(table: _Table, grown: Floats, in_season: Bools) -> Floats:
    """Height [m]: its maximum times Kcb / Kcb mid by the table, never shrinking (FAO-56 Annex 8);
    perennials always at the maximum, forage with its cycles; bare soil 0."""
    k = table.k_ini + grown * (table.k_mid - table.k_ini)
    share = np.clip(k / np.maximum(table.k_mid, 1e-6), 0.0, 1.0)
    tall = np.where(table.perennial & ~table.forage, table.height, table.height * share)
    return np.where(in_season | table.perennial, tall, 0.0)


def _climate(
    table: _Table, place: Position, wind: Floats, rh_min: Floats, *, late: bool
) -> tuple[Floats, Floats]:
    """Wind and humidity by which each day's k_mid (or k_end, `late`) is moved, by each season's
    climate adjustment; NaN for none."""
    means = np.full((2, *wind.shape), np.nan)
    for choice in set(table.climate.tolist()) - {"none"}:
        those = np.flatnonzero(table.climate == choice)
        inside = place.in_season[:, those]
        stage = place.stage[:, those] == (4 if late else 3)
        if late:
            stage &= ~place.mature[:, those]
        for mean, values in zip(means, (wind, rh_min), strict=True):
            own = np.where(inside, values[:, those], np.nan)
            if choice == "stage_mean":
                own = _mean_of(own, stage)
            elif choice == "trailing":
                own = _trailing(own, inside)
            mean[:, those] = own
    return means[0], means[1]


def _moved(
    table: _Table, coefficient: Floats, wind: Floats, humid: Floats, least: ArrayLike
) -> Floats:
    """A coefficient (seasons,) moved by each day's climate (days, seasons)."""
    chosen = table.climate != "none"
    moved = adjust(coefficient, wind, humid, table.height, least=least)
    return np.where(chosen, moved, coefficient)


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
