"""One crop season as the water balance needs it."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from app.science.crop.degree_days import DegreeDays
from app.science.crop.mulch import Mulch
from app.science.crop.ranges import check_range
from app.science.crop.seen import CoverSeen, StageSeen
from app.science.crop.stand import Canopy

__all__ = ["CLIMATE_ADJUSTMENTS", "COEFFICIENTS", "CropSeason", "bare_season", "check_range"]

COEFFICIENTS = ("dual", "single")
CLIMATE_ADJUSTMENTS = ("trailing", "stage_mean", "day", "none")
# A season by degree days may take half as long again as its stages in days (working value).
COOL_YEAR = 1.5
# A forage stand without an end goes on for a year.
FORAGE_DAYS = 365
EVEN = Canopy()


@dataclass(frozen=True, kw_only=True)
class CropSeason:
    """A crop from planting to harvest: stages, coefficients, height, roots, allowed depletion.

    planting: date; the planting day is day 1. stage_days: lengths of the initial, development,
    mid and late stages [d], 0 allowed but not all. coefficients: "dual" (k_* are basal, Kcb) or
    "single" (k_* are Kc). kc_min: Kc of dry bare soil, 0-0.5. height_max_m 0.01-30. root_min_m,
    root_max_m 0.02-10. depletion_fraction: p at ETc 5 mm/d, 0.01-0.95. mad: allowed depletion as
    a fraction of TAW, or None for RAW; mad_by_stage: the same for each of the four stages, each
    over `mad`. perennial: roots and height stay at their maximum. climate_adjustment: trailing,
    stage_mean, day or none. end: last day (harvest, killing frost), default the last day of the
    late stage.

    degree_days: stages by warmth; stage_days then only bound the season. stages_seen: each sets
    the place in the stages from its day on; days before keep theirs. cover_seen: cover and height
    seen, dual only: between two of them both are linear in time, after the last both follow the
    season's own curve, and Kcb comes from them by `canopy`; before the first the curve holds.
    cuttings: days of cutting of a forage; the day after one a cycle of cycle_days (default
    stage_days) begins, and its end coefficient lasts until the next. mulch on the soil.
    Source: FAO-56 chapters 6 to 10. Raises ValueError naming the field.
    """

    planting: np.datetime64
    stage_days: tuple[int, int, int, int]
    coefficients: str = "dual"
    k_ini: float
    k_mid: float
    k_end: float
    kc_min: float = 0.15
    height_max_m: float
    root_min_m: float
    root_max_m: float
    depletion_fraction: float
    mad: float | None = None
    perennial: bool = False
    climate_adjustment: str = "trailing"
    end: np.datetime64 | None = None
    mad_by_stage: tuple[float | None, float | None, float | None, float | None] | None = None
    degree_days: DegreeDays | None = None
    stages_seen: tuple[StageSeen, ...] = ()
    cover_seen: tuple[CoverSeen, ...] = ()
    canopy: Canopy = EVEN
    cuttings: tuple[np.datetime64, ...] = ()
    cycle_days: tuple[int, int, int, int] | None = None
    mulch: Mulch | None = None

    def __post_init__(self) -> None:
        for name in ("stage_days", "cycle_days"):
            days = getattr(self, name)
            if days is not None and (len(days) != 4 or min(days) < 0 or sum(days) < 1):
                raise ValueError(f"{name} is {days}; give four lengths in days, none negative")
        if self.coefficients not in COEFFICIENTS:
            raise ValueError(f"coefficients is {self.coefficients!r}; choose dual or single")
        if self.climate_adjustment not in CLIMATE_ADJUSTMENTS:
            raise ValueError(
                f"climate_adjustment is {self.climate_adjustment!r}; "
                f"choose one of {', '.join(CLIMATE_ADJUSTMENTS)}"
            )
        for name in ("k_ini", "k_mid", "k_end"):
            check_range(name, getattr(self, name), 0.0, 2.0)
        check_range("kc_min", self.kc_min, 0.0, 0.5)
        check_range("height_max_m", self.height_max_m, 0.01, 30.0)
        check_range("root_min_m", self.root_min_m, 0.02, 10.0)
        check_range("root_max_m", self.root_max_m, self.root_min_m, 10.0)
        check_range("depletion_fraction", self.depletion_fraction, 0.01, 0.95)
        for mad in (self.mad, *(self.mad_by_stage or ())):
            if mad is not None:
                check_range("mad", mad, 0.01, 1.0)
        if self.end is not None and self.end < self.planting:
            raise ValueError(f"end {self.end} is before planting {self.planting}")
        self._check_seen()

    def _check_seen(self) -> None:
        if self.mad_by_stage is not None and len(self.mad_by_stage) != 4:
            raise ValueError(f"mad_by_stage is {self.mad_by_stage}; give one for each of 4 stages")
        for name, dates in (
            ("stages_seen", [seen.date for seen in self.stages_seen]),
            ("cover_seen", [seen.date for seen in self.cover_seen]),
            ("cuttings", list(self.cuttings)),
        ):
            if any(b <= a for a, b in pairwise(dates)):
                raise ValueError(f"{name} must be in order of their dates, one a day; got {dates}")
            if name != "cover_seen" and dates and dates[0] < self.planting:
                raise ValueError(f"{name} has {dates[0]}, before planting {self.planting}")
        if self.cover_seen and self.coefficients != "dual":
            raise ValueError("cover_seen needs dual coefficients: cover tells Kcb, not Kc")

    @property
    def plain(self) -> bool:
        """Whether its stages go by days alone."""
        return self.degree_days is None and not self.anchors

    @property
    def forage(self) -> bool:
        """Whether it is cut and grows again."""
        return bool(self.cuttings) or self.cycle_days is not None

    @property
    def anchors(self) -> list[tuple[np.datetime64, int, bool]]:
        """First day, stage that begins, and whether by a cutting, of what sets the place in the
        stages; in order of days, a stage seen after a cutting of the day before."""
        one = np.timedelta64(1, "D")
        cut = [(day.astype("datetime64[D]") + one, 1, True) for day in self.cuttings]
        seen = [(s.date.astype("datetime64[D]"), s.stage, False) for s in self.stages_seen]
        return sorted(cut + seen, key=lambda anchor: (anchor[0], not anchor[2]))

    @property
    def last_day(self) -> np.datetime64:
        """Last day of the season: `end`, else the last day of the late stage, counted from the
        last stage seen; a year of forage; half as long again as stage_days by degree days."""
        first: np.datetime64 = self.planting.astype("datetime64[D]")
        days = sum(self.stage_days)
        if self.end is not None:
            end: np.datetime64 = self.end.astype("datetime64[D]")
            return end
        if self.forage:
            return first + np.timedelta64(FORAGE_DAYS - 1, "D")
        if self.degree_days is not None:
            return first + np.timedelta64(int(COOL_YEAR * days) - 1, "D")
        for since, stage, _ in self.anchors:
            first, days = since, sum(self.stage_days[stage - 1 :])
        return first + np.timedelta64(max(days, 1) - 1, "D")


def bare_season(
    first: np.datetime64,
    last: np.datetime64,
    *,
    root_depth_m: float = 0.3,
    deepest_m: float | None = None,
) -> CropSeason:
    """Bare soil from `first` to `last`, between two crops: an ordinary season without a plant.

    root_depth_m 0.02-10: depth of the soil that is accounted for [m], with a store below it down
    to deepest_m (default: none). Water leaves by evaporation and drainage alone, and the limit is
    all of TAW, so that it never calls for water. Source: FAO-56 chapter 11, bare soil.
    """
    days = int((last.astype("datetime64[D]") - first.astype("datetime64[D]")).astype(np.int64)) + 1
    return CropSeason(
        planting=first,
        stage_days=(max(days, 1), 0, 0, 0),
        k_ini=0.0,
        k_mid=0.0,
        k_end=0.0,
        kc_min=0.0,
        height_max_m=0.01,
        root_min_m=root_depth_m,
        root_max_m=root_depth_m if deepest_m is None else deepest_m,
        depletion_fraction=0.5,
        mad=1.0,
        climate_adjustment="none",
        end=last,
    )
