"""One crop season as the water balance needs it."""

from dataclasses import dataclass

import numpy as np

COEFFICIENTS = ("dual", "single")
CLIMATE_ADJUSTMENTS = ("trailing", "stage_mean", "day", "none")


def check_range(name: str, value: float, low: float, high: float) -> None:
    """Refuse `value` outside `low`..`high` (or NaN) with a message that names the field."""
    if not low <= value <= high:
        raise ValueError(f"{name} is {value:g}; it must lie between {low:g} and {high:g}")


@dataclass(frozen=True, kw_only=True)
class CropSeason:
    """A crop from planting to harvest: stages, coefficients, height, roots, allowed depletion.

    planting: date; the planting day is day 1. stage_days: lengths of the initial, development,
    mid and late stages [d], 0 allowed but not all. coefficients: "dual" (k_* are basal, Kcb) or
    "single" (k_* are Kc). kc_min: Kc of dry bare soil, 0-0.5. height_max_m 0.01-30. root_min_m,
    root_max_m 0.02-10. depletion_fraction: p at ETc 5 mm/d, 0.01-0.95. mad: allowed depletion as
    a fraction of TAW, or None for RAW. perennial: roots and height stay at their maximum.
    climate_adjustment: trailing, stage_mean, day or none. end: last day (harvest, killing frost),
    default the last day of the late stage.
    Source: FAO-56 chapters 6 to 8. Raises ValueError naming the field.
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

    def __post_init__(self) -> None:
        if len(self.stage_days) != 4 or min(self.stage_days) < 0 or sum(self.stage_days) < 1:
            raise ValueError(
                f"stage_days is {self.stage_days}; give four lengths in days, none negative"
            )
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
        if self.mad is not None:
            check_range("mad", self.mad, 0.01, 1.0)
        if self.end is not None and self.end < self.planting:
            raise ValueError(f"end {self.end} is before planting {self.planting}")

    @property
    def last_day(self) -> np.datetime64:
        """Last day of the season: `end`, else the last day of the late stage."""
        last: np.datetime64 = self.planting.astype("datetime64[D]")
        last = last + np.timedelta64(sum(self.stage_days) - 1, "D")
        if self.end is not None:
            last = self.end.astype("datetime64[D]")
        return last
