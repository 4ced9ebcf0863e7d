"""Readings of soil water: what they say of the root zone's depletion."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.crop.ranges import check_range
from app.science.soil.profile import Layer, Profile
from app.science.soil.retention import FIELD_CAPACITY_KPA, content_error, water_content

# Error of an uncalibrated reading [m3 m-3], its spatial part included (working value).
UNCALIBRATED = 0.03
# A reading speaks for so much soil below it [m] where none lies deeper; roots below that are
# taken as dry as it is, with so many times its error (working values).
REACH_M, UNSEEN = 0.15, 2.0


@dataclass(frozen=True, kw_only=True)
class DepthReading:
    """Water content [m3 m-3] at `depth_m` (the middle of a sample), 0.01-10 m, and its error
    [m3 m-3], above 0 to 0.3. range_end: "" within the instrument's range, "wet" where it shows its
    wettest (the soil may be wetter), "dry" where it shows its driest. Raises ValueError naming the
    field."""

    depth_m: float
    content: float
    error: float = UNCALIBRATED
    range_end: str = ""

    def __post_init__(self) -> None:
        check_range("depth_m", self.depth_m, 0.01, 10.0)
        check_range("content", self.content, 0.0, 1.0)
        check_range("error", self.error, 1e-6, 0.3)
        if self.range_end not in ("", "wet", "dry"):
            raise ValueError(f"range_end is {self.range_end!r}; choose wet, dry or nothing")


@dataclass(frozen=True, kw_only=True)
class Measured:
    """Depletion of the root zone [mm] by readings, its standard error [mm], and what it is:
    "value", "at_most" or "at_least" (readings outside the instrument's range only bound), or
    "nothing" (both ends at once)."""

    depletion_mm: float
    error_mm: float
    kind: str


def gravimetric(content: ArrayLike, bulk_density: ArrayLike) -> Floats:
    """Water content by volume [m3 m-3] from that by weight [kg kg-1] and the dry bulk density
    [g cm-3]; shapes broadcast; NaN in, NaN out. Source: definition (water 1 g cm-3)."""
    return np.asarray(floats(content) * floats(bulk_density))


def by_count_ratio(ratio: ArrayLike, slope: ArrayLike, intercept: ArrayLike) -> Floats:
    """Water content [m3 m-3] of a neutron probe: slope x count ratio + intercept, both of its
    calibration in this soil; shapes broadcast; NaN in, NaN out. Source: common practice, no
    source."""
    return np.asarray(floats(slope) * floats(ratio) + floats(intercept))


def by_content(
    depth_m: float,
    content: float,
    *,
    error: float = UNCALIBRATED,
    driest: float = 0.0,
    wettest: float = 1.0,
) -> DepthReading:
    """A reading by volume; at or beyond `driest` or `wettest` [m3 m-3], the ends of the
    instrument's range, it only bounds. Raises ValueError as `DepthReading` does."""
    end = "wet" if content >= wettest else "dry" if content <= driest else ""
    return DepthReading(depth_m=depth_m, content=content, error=error, range_end=end)


def by_tension(
    depth_m: float,
    tension_kpa: float,
    profile: Profile,
    *,
    relative_error: float = 0.1,
    curve_error: float = UNCALIBRATED,
    driest_kpa: float = 80.0,
    wettest_kpa: float = 0.0,
    field_capacity_kpa: float = FIELD_CAPACITY_KPA,
) -> DepthReading:
    """A reading of tension [kPa, positive] through the retention curve of the layer it stands in.

    relative_error of the tension; curve_error [m3 m-3] of the curve; both add as squares. At or
    beyond driest_kpa (80, where a water-filled cup lets air in) or wettest_kpa it only bounds.
    Raises ValueError for a negative tension. Source: Saxton & Rawls 2006; the range is common
    practice, no source.
    """
    check_range("tension_kpa", tension_kpa, 0.0, 1e6)
    layer = layer_at(profile, depth_m)
    content = water_content(tension_kpa, layer, field_capacity_kpa=field_capacity_kpa)
    own = content_error(tension_kpa, relative_error, layer, field_capacity_kpa=field_capacity_kpa)
    end = "dry" if tension_kpa >= driest_kpa else "wet" if tension_kpa <= wettest_kpa else ""
    return DepthReading(
        depth_m=depth_m,
        content=float(content),
        error=float(np.hypot(own, curve_error)),
        range_end=end,
    )


def layer_at(profile: Profile, depth_m: float) -> Layer:
    """The layer of `profile` at `depth_m`; the last one goes on below its bottom."""
    for layer in profile.layers:
        if depth_m <= layer.bottom_m:
            return layer
    return profile.layers[-1]


def measured_depletion(
    readings: Sequence[DepthReading],
    profile: Profile,
    root_depth_m: float,
    *,
    root_wetted_fraction: float = 1.0,
) -> Measured:
    """Depletion of the root zone [mm] by readings at one place and time.

    readings: one or more depths, in any order; those below the roots are left out unless all are.
    Each speaks for the soil halfway to the next; the highest up to the surface, the deepest 0.15 m
    down, and from there to root_depth_m at the same share of available water with twice its error.
    Errors of several depths count as one (fully correlated). The result is held between 0 (above
    field capacity: the soil's excess, where it drains over days) and TAW. Raises ValueError for
    no reading or two at one depth. Source: FAO-56 eq 86 and 87, over the layers.
    """
    used = sorted(
        [r for r in readings if r.depth_m <= root_depth_m] or readings, key=lambda r: r.depth_m
    )
    if not used:
        raise ValueError("no reading is given; a depletion needs at least one depth")
    if any(a.depth_m == b.depth_m for a, b in pairwise(used)):
        raise ValueError(f"two readings at one depth, {[r.depth_m for r in used]} m: give one each")
    depletion, error = 0.0, 0.0
    for top, bottom, reading, times in _spans(used, root_depth_m):
        share = _dryness(reading, layer_at(profile, reading.depth_m))
        for layer, thick in _through(profile, top, bottom):
            available = layer.field_capacity - layer.wilting_point
            depletion += 1000.0 * share * available * thick
            error += 1000.0 * times * reading.error * thick
    taw = float(profile.taw(root_depth_m))
    above = float(profile.saturation_excess(root_depth_m)) if profile.drainage_days > 0.0 else 0.0
    held = min(max(depletion, -above), taw)
    return Measured(
        depletion_mm=root_wetted_fraction * held,
        error_mm=root_wetted_fraction * error,
        kind=_kind({reading.range_end for reading in used}),
    )


def depletion_by_layer(readings: Sequence[DepthReading], profile: Profile) -> tuple[float, ...]:
    """Depletion of each layer of `profile` as a share of its available water, 0-1, by readings.

    readings: one or more depths; a layer takes the mean over its thickness of what they say, each
    speaking for the soil halfway to the next, the last for all below it. For the opening of a
    ledger (`subsoil_layer_depletion`). Raises ValueError for no reading. Source: FAO-56 eq 86, by
    layer.
    """
    if not readings:
        raise ValueError("no reading is given; a depletion needs at least one depth")
    used = sorted(readings, key=lambda r: r.depth_m)
    cuts = [0.0, *((a.depth_m + b.depth_m) / 2.0 for a, b in pairwise(used)), np.inf]
    shares, top = [], 0.0
    for layer in profile.layers:
        told = 0.0
        for reading, (above, below) in zip(used, pairwise(cuts), strict=True):
            thick = min(below, layer.bottom_m) - max(above, top)
            if thick > 0.0:
                share = _dryness(reading, layer_at(profile, reading.depth_m))
                told += min(max(share, 0.0), 1.0) * thick
        shares.append(told / (layer.bottom_m - top))
        top = layer.bottom_m
    return tuple(shares)


def _dryness(reading: DepthReading, layer: Layer) -> float:
    """Depletion as a share of the layer's available water; carried to other layers by it."""
    available = layer.field_capacity - layer.wilting_point
    return (layer.field_capacity - reading.content) / available


def _spans(
    readings: Sequence[DepthReading], root_depth_m: float
) -> list[tuple[float, float, DepthReading, float]]:
    """Top, bottom [m], reading and factor on its error, down to the roots' end."""
    halves = [(a.depth_m + b.depth_m) / 2.0 for a, b in pairwise(readings)]
    tops, deepest = [0.0, *halves], readings[-1]
    ends = [*halves, max(deepest.depth_m + REACH_M, tops[-1])]
    spans = [(t, b, r, 1.0) for t, b, r in zip(tops, ends, readings, strict=True)]
    spans.append((ends[-1], root_depth_m, deepest, UNSEEN))
    cut = [(t, min(b, root_depth_m), r, f) for t, b, r, f in spans]
    return [span for span in cut if span[1] > span[0]]


def _through(profile: Profile, top: float, bottom: float) -> list[tuple[Layer, float]]:
    """The layers between two depths [m] and how thick each is there [m]."""
    found, above = [], 0.0
    for layer in profile.layers:
        end = layer.bottom_m if layer is not profile.layers[-1] else np.inf
        thick = min(bottom, end) - max(top, above)
        if thick > 0.0:
            found.append((layer, float(thick)))
        above = end
    return found


def _kind(ends: set[str]) -> str:
    if {"wet", "dry"} <= ends:
        return "nothing"
    return "at_most" if "wet" in ends else "at_least" if "dry" in ends else "value"
