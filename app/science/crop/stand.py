"""Coefficients of trees, vines and rows: from cover, height, row direction, ground cover."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.crop.cover import (
    density_coefficient,
    effective_cover_round,
    effective_cover_rows,
    sin_noon_elevation,
)
from app.science.crop.ranges import check_range

SHAPES = ("even", "rows", "round")
FULL = ("height", "table")
# Sine of the lowest noon sun that still shades by geometry; below it all ground is shaded.
LEAST_SINE = 0.02


@dataclass(frozen=True, kw_only=True)
class Canopy:
    """How a stand covers its ground.

    shape: "even" (shade is the cover itself), "rows", or "round" crowns. For rows: width_m of the
    canopy 0.05-30 and row_azimuth_deg, the rows' direction from north 0-180. latitude_deg -90 to
    90 for rows and round. ground_cover_kcb 0-1.3: Kcb of live cover between the plants, or None.
    multiplier 1-2: shade's weight in the density coefficient. full: Kcb of full cover from
    "height" or the season's own "table" value. stomatal 0.1-1: factor Fr of stomatal control.
    Source: FAO-56 eq 98 to 102 and their notes; Irrigation Science 28:17-34 (2009), from memory.
    Raises ValueError naming the field.
    """

    shape: str = "even"
    width_m: float | None = None
    row_azimuth_deg: float = 90.0
    latitude_deg: float | None = None
    ground_cover_kcb: float | None = None
    multiplier: float = 1.5
    full: str = "height"
    stomatal: float = 1.0

    def __post_init__(self) -> None:
        if self.shape not in SHAPES:
            raise ValueError(f"shape is {self.shape!r}; choose one of {', '.join(SHAPES)}")
        if self.full not in FULL:
            raise ValueError(f"full is {self.full!r}; choose {' or '.join(FULL)}")
        if self.shape != "even" and self.latitude_deg is None:
            raise ValueError(f"latitude_deg is missing; {self.shape} need it for the noon sun")
        if self.shape == "rows" and self.width_m is None:
            raise ValueError("width_m is missing; rows need the width of their canopy")
        for name, low, high in (
            ("width_m", 0.05, 30.0),
            ("row_azimuth_deg", 0.0, 180.0),
            ("latitude_deg", -90.0, 90.0),
            ("ground_cover_kcb", 0.0, 1.3),
            ("multiplier", 1.0, 2.0),
            ("stomatal", 0.1, 1.0),
        ):
            value = getattr(self, name)
            if value is not None:
                check_range(name, value, low, high)


def effective_cover(
    canopy: Canopy, cover: ArrayLike, height: ArrayLike, day_of_year: ArrayLike
) -> Floats:
    """Fraction of ground shaded or covered near noon, 0-1.

    cover 0-1; height [m]; day_of_year 1-366; shapes broadcast; NaN in, NaN out. Rows count their
    height by the cosine of their angle from east-west. Source: FAO-56, note to eq 98.
    """
    fc, tall, day = np.broadcast_arrays(floats(cover), floats(height), floats(day_of_year))
    if canopy.shape == "even" or canopy.latitude_deg is None:
        return np.asarray(fc + 0.0 * (tall + day))
    sine = np.maximum(sin_noon_elevation(canopy.latitude_deg, day), LEAST_SINE)
    if canopy.shape == "round":
        return np.asarray(effective_cover_round(fc, sine) + 0.0 * tall)
    from_east = np.deg2rad(90.0 - canopy.row_azimuth_deg)
    ratio = tall * abs(float(np.cos(from_east))) / (canopy.width_m or 1.0)
    return effective_cover_rows(fc, ratio, np.arcsin(sine))


def stand_kcb(
    canopy: Canopy,
    cover: ArrayLike,
    height: ArrayLike,
    day_of_year: ArrayLike,
    full: ArrayLike,
    kc_min: ArrayLike = 0.15,
) -> Floats:
    """Kcb of a stand by its density coefficient.

    cover 0-1; height [m]; day_of_year 1-366; full: Kcb at full cover, climate included; kc_min
    [-]; shapes broadcast; NaN in, NaN out. With live ground cover its Kcb takes the place of
    kc_min, and at least half of the difference to full cover counts. Source: Irrigation Science
    28:17-34 (2009), from memory; stomatal factor of FAO-56 eq 102.
    """
    tall = floats(height)
    shade = effective_cover(canopy, cover, tall, day_of_year)
    density = density_coefficient(shade, tall, canopy.multiplier)
    most = floats(full) * canopy.stomatal
    if canopy.ground_cover_kcb is None:
        return np.asarray(floats(kc_min) + density * (most - floats(kc_min)))
    ground = canopy.ground_cover_kcb
    return np.asarray(ground + density * np.maximum(most - ground, (most - ground) / 2.0))
