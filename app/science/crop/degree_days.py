"""Degree days: the warmth that moves a crop through its stages."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.crop.ranges import check_range

METHODS = ("mean", "clipped", "sine")


@dataclass(frozen=True, kw_only=True)
class DegreeDays:
    """How a season counts warmth, and how much of it each stage takes.

    method: mean, clipped or sine (see `degree_days`). base_c -10 to 25 and upper_c up to 50, or
    None for no upper temperature [degC]. stage_sums: degree days of the initial, development, mid
    and late stages, none negative, not all zero. Raises ValueError naming the field.
    """

    base_c: float
    upper_c: float | None = None
    method: str = "mean"
    stage_sums: tuple[float, float, float, float]

    def __post_init__(self) -> None:
        if self.method not in METHODS:
            raise ValueError(f"method is {self.method!r}; choose one of {', '.join(METHODS)}")
        check_range("base_c", self.base_c, -10.0, 25.0)
        if self.upper_c is not None:
            check_range("upper_c", self.upper_c, self.base_c + 1.0, 50.0)
        if len(self.stage_sums) != 4 or not all(warm >= 0.0 for warm in self.stage_sums):
            raise ValueError(f"stage_sums is {self.stage_sums}; give four sums, none negative")
        if not sum(self.stage_sums) > 0.0:
            raise ValueError("stage_sums are all zero; a season needs some warmth")

    def daily(self, tmax: ArrayLike, tmin: ArrayLike) -> Floats:
        """Degree days of days with `tmax` and `tmin` [degC]; NaN in, NaN out."""
        upper = np.inf if self.upper_c is None else self.upper_c
        return degree_days(tmax, tmin, self.base_c, upper, self.method)


def degree_days(
    tmax: ArrayLike,
    tmin: ArrayLike,
    base: ArrayLike,
    upper: ArrayLike = np.inf,
    method: str = "mean",
) -> Floats:
    """Degree days of a day [degC d], never negative.

    tmax >= tmin, base < upper [degC], upper inf for none; shapes broadcast; NaN in, NaN out.
    mean: (tmax + tmin) / 2, held to base and upper, less base. clipped: both held to base and
    upper first. sine: area of a sine from tmin to tmax between base and upper (horizontal
    cut-off). Raises ValueError for another method. Source: Agricultural and Forest Meteorology
    87:291-300 (1997), methods 1 and 2; Ecology 50:514-517 (1969); all from memory.
    """
    high, low, cold, hot = (floats(values) for values in (tmax, tmin, base, upper))
    if method == "mean":
        mean = (high + low) / 2.0
        return np.asarray(np.minimum(np.maximum(mean, cold), hot) - cold)
    if method == "clipped":
        warm = (np.minimum(np.maximum(values, cold), hot) for values in (high, low))
        return np.asarray(sum(warm) / 2.0 - cold)
    if method == "sine":
        return np.asarray(_above(high, low, cold) - _above(high, low, hot))
    raise ValueError(f"method is {method!r}; choose one of {', '.join(METHODS)}")


def _above(high: Floats, low: Floats, threshold: Floats) -> Floats:
    """Area of a sine from `low` to `high` above `threshold`, a day long."""
    mean, reach = (high + low) / 2.0, (high - low) / 2.0
    beyond = threshold - mean
    share = np.where(reach > 0.0, beyond / np.where(reach > 0.0, reach, 1.0), np.sign(beyond))
    angle = np.arcsin(np.clip(share, -1.0, 1.0))
    # Below the whole sine the area is mean - threshold; written out, as inf has no angle.
    within = (mean - np.where(np.isinf(threshold), 0.0, threshold)) * (np.pi / 2.0 - angle)
    area = np.where(share >= 1.0, 0.0 * mean, (within + reach * np.cos(angle)) / np.pi)
    return np.maximum(area, 0.0)


def usual_stage_sums(
    stage_days: tuple[int, int, int, int], daily: Floats
) -> tuple[float, float, float, float]:
    """Degree days of each stage in a usual year: what a table's stage lengths mean in warmth.

    daily (days,): usual degree days from planting on, at least as many days as the stages.
    Raises ValueError for fewer. Source: sums of the usual days (working value).
    """
    ends = np.cumsum(stage_days)
    if daily.size < ends[-1]:
        raise ValueError(f"daily has {daily.size} days; the stages take {ends[-1]}")
    sums = np.diff(np.concatenate(([0.0], np.cumsum(daily)))[np.concatenate(([0], ends))])
    return float(sums[0]), float(sums[1]), float(sums[2]), float(sums[3])
