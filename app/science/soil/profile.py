"""The layered soil profile and what it holds down to a root depth."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats
from app.science.crop.season import check_range


@dataclass(frozen=True)
class Layer:
    """One soil layer down to `bottom_m`; water contents at field capacity, wilting point and
    saturation in m3 m-3 (0-1, wilting point < field capacity < saturation)."""

    bottom_m: float
    field_capacity: float
    wilting_point: float
    saturation: float

    def __post_init__(self) -> None:
        check_range("bottom_m", self.bottom_m, 0.01, 20.0)
        check_range("wilting_point", self.wilting_point, 0.0, 0.9)
        if not self.wilting_point < self.field_capacity < self.saturation <= 1.0:
            raise ValueError(
                f"a layer needs wilting point < field capacity < saturation <= 1; got "
                f"{self.wilting_point:g}, {self.field_capacity:g}, {self.saturation:g}"
            )


@dataclass(frozen=True, kw_only=True)
class Profile:
    """Soil layers from the surface down, the evaporation layer, runoff and drainage.

    layers: bottoms increasing; below the last one its soil goes on. evaporation_depth_m: Ze,
    0.05-0.30. rew_mm: readily evaporable water, 0-`tew`. tew_mm: total evaporable water, or None
    for FAO-56 eq 73 on the top layer. curve_number: 1-100 for average wetness, or None for no
    runoff. drainage_days: 0 drains to field capacity the same day, N > 0 over N + 1 days.
    Raises ValueError naming the field.
    """

    layers: tuple[Layer, ...]
    evaporation_depth_m: float = 0.10
    rew_mm: float
    tew_mm: float | None = None
    curve_number: float | None = None
    drainage_days: float = 0.0

    def __post_init__(self) -> None:
        if not self.layers:
            raise ValueError("layers is empty; a profile needs at least one layer")
        bottoms = [layer.bottom_m for layer in self.layers]
        if any(b <= a for a, b in pairwise(bottoms)):
            raise ValueError(f"layer bottoms must increase from the surface down; got {bottoms}")
        check_range("evaporation_depth_m", self.evaporation_depth_m, 0.05, 0.30)
        check_range("rew_mm", self.rew_mm, 0.0, 100.0)
        if not self.rew_mm < self.tew:
            raise ValueError(
                f"rew_mm is {self.rew_mm:g}; it must be less than the total evaporable water, "
                f"{self.tew:.1f} mm"
            )
        if self.curve_number is not None:
            check_range("curve_number", self.curve_number, 1.0, 100.0)
        check_range("drainage_days", self.drainage_days, 0.0, 30.0)

    @property
    def tew(self) -> float:
        """Total evaporable water [mm]: as given, else 1000 (FC - 0.5 WP) Ze (FAO-56 eq 73)."""
        if self.tew_mm is not None:
            return self.tew_mm
        top = self.layers[0]
        held = top.field_capacity - 0.5 * top.wilting_point
        return 1000.0 * held * self.evaporation_depth_m

    def taw(self, root_depth: ArrayLike) -> Floats:
        """Total available water down to `root_depth` [m, any shape] in mm; NaN in, NaN out
        (FAO-56 eq 82 over the layers)."""
        return self._held(root_depth, [x.field_capacity - x.wilting_point for x in self.layers])

    def saturation_excess(self, root_depth: ArrayLike) -> Floats:
        """Water between field capacity and saturation down to `root_depth` [m] in mm; NaN in,
        NaN out."""
        return self._held(root_depth, [x.saturation - x.field_capacity for x in self.layers])

    def _held(self, root_depth: ArrayLike, contents: list[float]) -> Floats:
        depth = np.asarray(root_depth, dtype=np.float64)
        total = np.zeros_like(depth)
        top = 0.0
        for layer, content in zip(self.layers, contents, strict=True):
            bottom = layer.bottom_m if layer is not self.layers[-1] else np.inf
            total = total + 1000.0 * content * np.clip(depth - top, 0.0, bottom - top)
            top = layer.bottom_m
        return total
