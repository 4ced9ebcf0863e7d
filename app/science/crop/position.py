"""Where in its stages a season stands each day: by days, warmth, stages seen and cuttings."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app.science import Bools, Days, Floats
from app.science.crop.season import CropSeason


@dataclass(frozen=True, kw_only=True)
class Position:
    """Each (days, seasons): development and late stage gone through 0-1; root growth done 0-1;
    stage 1-4 whether or not in season; mature, past the late stage's end; in_season."""

    grown: Floats
    aged: Floats
    roots: Floats
    stage: NDArray[np.int8]
    mature: Bools
    in_season: Bools


def ramp(day: Any, before: Any, length: Any) -> Floats:
    """0 up to `before`, 1 from `before + length` on, linear between; a step where length is 0."""
    shortest = np.maximum(np.asarray(length, dtype=np.float64), 1e-9)
    return np.asarray(np.clip((day - before) / shortest, 0.0, 1.0))


def positions(
    seasons: Sequence[CropSeason],
    date: Days,
    within: Bools | None = None,
    warmth: Floats | None = None,
    warmth_before: Sequence[float] | None = None,
) -> Position:
    """Positions of many seasons, each on its own consecutive days.

    date (days, seasons). within: False on days that only pad a column. warmth (days, seasons):
    degree days, needed by seasons that go by them; warmth_before (seasons): their sum before the
    first day, counted from planting, or from the last stage seen or cutting before it.
    The planting day is day 1; a stage is complete at the close of its last day. Source: FAO-56
    eq 66; root growth of eq 8-1 (dual), from planting to mid-season (single).
    """
    planting = np.array([s.planting for s in seasons], dtype="datetime64[D]")
    last_day = np.array([s.last_day for s in seasons], dtype="datetime64[D]")
    last = (last_day - planting).astype(np.float64) + 1.0
    lengths = np.array([s.stage_days for s in seasons], dtype=np.float64).T
    ends = np.cumsum(lengths, axis=0)
    dual = np.array([s.coefficients == "dual" for s in seasons])
    day = (date - planting).astype(np.float64) + 1.0
    in_season = (day >= 1.0) & (day <= last)
    kept = np.minimum(day, last)
    basal = ramp(kept, ends[0], lengths[1])
    plain = np.clip((kept - 1.0) / np.maximum(ends[1], 1.0), 0.0, 1.0)
    position = Position(
        grown=ramp(day, ends[0], lengths[1]),
        aged=ramp(day, ends[2], lengths[3]),
        roots=np.where(dual, basal, plain),
        stage=_stage(day, ends),
        mature=day > ends[3],
        in_season=in_season,
    )
    for b, season in enumerate(seasons):
        if season.plain:
            continue
        heat = None
        if season.degree_days is not None:
            if warmth is None:
                raise ValueError("a season by degree days needs the warmth of its days")
            heat = warmth[:, b]
        before = 0.0 if warmth_before is None else warmth_before[b]
        own = _anchored(season, date[:, b], day[:, b], in_season[:, b], heat, before)
        for name, values in vars(own).items():
            getattr(position, name)[:, b] = values
    if within is not None:
        position.in_season[:] &= within
    return position


def _stage(day: Floats, ends: Any) -> NDArray[np.int8]:
    number = 1 + (day > ends[0]) + (day > ends[1]) + (day > ends[2])
    return np.asarray(number, dtype=np.int8)


def _anchored(
    season: CropSeason,
    date: Days,
    day: Floats,
    in_season: Bools,
    heat: Floats | None,
    heat_before: float,
) -> Position:
    """Position of one season (days,) with stages seen, cuttings or warmth.

    Each stage seen sets the place in the stages from its day on, each cutting from the day after
    it; earlier days keep theirs.
    """
    step = np.ones(day.shape) if heat is None else np.where(day >= 1.0, heat, 0.0)
    clock = day if heat is None else heat_before + np.cumsum(step)
    lengths = np.tile(_lengths(season, cut=False)[:, None], day.size)
    place = clock.copy()
    for since, stage, cut in season.anchors:
        i = int(np.searchsorted(date, since))
        if cut:
            lengths[:, i:] = _lengths(season, cut=True)[:, None]
        if i == day.size:
            continue
        began = lengths[: stage - 1, i].sum()
        passed = clock[i] - step[i]
        if heat is None:
            passed -= float((date[i] - since).astype(np.float64))
        elif date[i] > since:
            passed = 0.0  # what came before the first day is counted from there
        place[i:] = began + (clock[i:] - passed)
    ends = np.cumsum(lengths, axis=0)
    mature = place > ends[3]
    if season.degree_days is not None and season.end is None and season.cycle_days is None:
        in_season = in_season & (place - step < ends[3])
    grown = ramp(place, ends[0], lengths[1])
    since_planting = place - (1.0 if heat is None else 0.0)
    single = np.clip(since_planting / np.maximum(ends[1], 1.0), 0.0, 1.0)
    roots = grown if season.coefficients == "dual" else single
    # Roots never shrink, and stop with the season.
    roots = np.maximum.accumulate(np.where(in_season, roots, 0.0))
    return Position(
        grown=grown,
        aged=ramp(place, ends[2], lengths[3]),
        roots=roots,
        stage=_stage(place, ends),
        mature=mature,
        in_season=in_season,
    )


def _lengths(season: CropSeason, *, cut: bool) -> Floats:
    """Stage lengths, in days or degree days; those of the cycles after a cutting."""
    if season.degree_days is not None:
        return np.array(season.degree_days.stage_sums, dtype=np.float64)
    days = season.cycle_days if cut and season.cycle_days is not None else season.stage_days
    return np.array(days, dtype=np.float64)
