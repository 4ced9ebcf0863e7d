"""Evaporation from the surface layer: the dual crop coefficient's formulas."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.crop.climate import climate_term

# FAO-56 eq 72: Kc max of a wet surface before the climate term.
WET_SURFACE_KC = 1.2
# FAO-56 eq 75 and 76: bounds that keep the fractions computable.
LEAST_FRACTION, MOST_COVER, LEAST_SPAN = 0.01, 0.99, 0.01
# FAO-56 chapter 7: rain above 3-4 mm wets the whole surface.
WETTING_RAIN_MM = 3.0
# How irrigation and wetting rain of one day share the surface.
SAME_DAY = ("irrigation", "weighted")


def total_evaporable_water(
    field_capacity: ArrayLike, wilting_point: ArrayLike, depth: ArrayLike
) -> Floats:
    """TEW [mm] of a surface layer of `depth` [m]; water contents [m3 m-3].

    Shapes broadcast; NaN in, NaN out. Source: FAO-56 eq 73.
    """
    return np.asarray(
        1000.0 * (floats(field_capacity) - 0.5 * floats(wilting_point)) * floats(depth)
    )


def kc_max(kcb: ArrayLike, wind_2m: ArrayLike, rh_min: ArrayLike, height: ArrayLike) -> Floats:
    """Upper limit of Kc after wetting [-].

    kcb [-]; wind_2m [m s-1]; rh_min [%]; height [m]; shapes broadcast; NaN in, NaN out; the
    climate term is held to the range of eq 62. Source: FAO-56 eq 72.
    """
    climate = WET_SURFACE_KC + climate_term(wind_2m, rh_min, height)
    return np.asarray(np.maximum(climate, floats(kcb) + 0.05))


def cover_fraction(
    kcb: ArrayLike, kc_max: ArrayLike, height: ArrayLike, kc_min: ArrayLike
) -> Floats:
    """Fraction of soil covered by vegetation, 0-0.99, from Kcb.

    kcb, kc_max, kc_min [-]; height [m]; shapes broadcast; NaN in, NaN out. Source: FAO-56 eq 76
    (both differences at least 0.01 below the line, 0 above it).
    """
    over = np.maximum(floats(kcb) - floats(kc_min), 0.0)
    span = np.maximum(floats(kc_max) - floats(kc_min), LEAST_SPAN)
    return np.asarray(np.minimum((over / span) ** (1.0 + 0.5 * floats(height)), MOST_COVER))


def exposed_wetted_fraction(cover: ArrayLike, wetted: ArrayLike) -> Floats:
    """Fraction few of soil both exposed and wetted, 0.01-1 (FAO-56 eq 75).

    cover fc and wetted fw, 0-1; shapes broadcast; NaN in, NaN out.
    """
    return np.asarray(np.clip(np.minimum(1.0 - floats(cover), floats(wetted)), LEAST_FRACTION, 1.0))


def under_canopy(wetted: ArrayLike, cover: ArrayLike) -> Floats:
    """Wetted fraction seen by the sun where emitters stand under the canopy: fw (1 - 2/3 fc)
    (FAO-56, note to eq 75). Shapes broadcast; NaN in, NaN out."""
    return np.asarray(floats(wetted) * (1.0 - 2.0 / 3.0 * floats(cover)))


def evaporation_reduction(depletion: ArrayLike, tew: ArrayLike, rew: ArrayLike) -> Floats:
    """Kr, 0-1, from the layer's depletion De; depletion, tew > rew [mm].

    Shapes broadcast; NaN in, NaN out. Source: FAO-56 eq 74.
    """
    return np.asarray(
        np.clip((floats(tew) - floats(depletion)) / (floats(tew) - floats(rew)), 0.0, 1.0)
    )


def evaporation_coefficient(
    reduction: ArrayLike, kc_max: ArrayLike, kcb: ArrayLike, exposed: ArrayLike
) -> Floats:
    """Ke [-] = min(Kr (Kc max - Kcb), few Kc max) (FAO-56 eq 71).

    Shapes broadcast; NaN in, NaN out.
    """
    return np.asarray(
        np.minimum(
            floats(reduction) * (floats(kc_max) - floats(kcb)), floats(exposed) * floats(kc_max)
        )
    )


def rew_from_texture(sand: ArrayLike, clay: ArrayLike) -> Floats:
    """Readily evaporable water [mm] from sand and clay [%].

    Shapes broadcast; NaN in, NaN out. Source: relation quoted in J. Irrig. Drain. Eng. 131:2-13
    (2005), from memory.
    """
    sa, cl = floats(sand), floats(clay)
    fine = np.where(cl > 50.0, 11.0 - 0.06 * cl, 8.0 + 0.08 * cl)
    return np.asarray(np.where(sa > 80.0, 20.0 - 0.15 * sa, fine) + 0.0 * (sa + cl))


def wetted_fraction_series(
    rain: Floats, irrigation_fw: Floats, opening: float = 1.0
) -> tuple[Floats, Floats]:
    """Wetted fraction of each day and whether an irrigation set it.

    rain [mm] and irrigation_fw (NaN for no event), each (days, ...). An irrigation sets its own
    fraction, else rain of 3 mm or more sets 1, else yesterday's holds; before any, `opening`.
    Returns fw and a 0/1 array. Source: FAO-56 chapter 7, table 20.
    """
    irrigated = ~np.isnan(irrigation_fw)
    days = np.arange(rain.shape[0]).reshape((-1,) + (1,) * (rain.ndim - 1))
    last = np.maximum.accumulate(np.where(irrigated | (rain >= WETTING_RAIN_MM), days, -1), axis=0)
    event = np.where(irrigated, irrigation_fw, 1.0)
    known = last >= 0
    index = np.maximum(last, 0)
    fw = np.where(known, np.take_along_axis(event, index, axis=0), opening)
    by_irrigation = known & np.take_along_axis(irrigated, index, axis=0)
    return np.clip(fw, LEAST_FRACTION, 1.0), by_irrigation.astype(np.float64)


def weighted_fraction(depths: ArrayLike, fractions: ArrayLike) -> Floats:
    """Wetted fraction of events together: the mean of their fractions by their depths.

    depths [mm over the field] >= 0 and fractions 0-1, events along the first axis, any shape
    after it; NaN for no event. NaN where nothing fell. Source: FAO-56 chapter 7, rain and
    irrigation "in proportion to the infiltration from each" (from memory); the same rule is used
    for several irrigations of one day (working value).
    """
    depth, part = np.broadcast_arrays(floats(depths), floats(fractions))
    here = ~np.isnan(depth) & ~np.isnan(part)
    water = np.where(here, depth, 0.0)
    total, wetted = water[0] * 0.0, water[0] * 0.0
    for one, share in zip(water, np.where(here, part, 0.0), strict=True):
        total, wetted = total + one, wetted + one * share
    return np.asarray(
        np.divide(wetted, total, out=np.full(np.shape(total), np.nan), where=total > 0.0)
    )


def lines_fraction(fractions: ArrayLike) -> Floats:
    """Wetted fraction of emitters or lines at different places run together: the sum of their
    fractions (first axis), at most 1. NaN in, NaN out. Source: geometry."""
    return np.asarray(np.minimum(np.sum(floats(fractions), axis=0), 1.0))


def emitter_fraction(
    emitters: ArrayLike, spacing_m: ArrayLike, width_m: ArrayLike, area_m2: ArrayLike
) -> Floats:
    """Fraction wetted by one straight line of emitters a plant row, 0.01-1.

    emitters a plant; spacing_m between them [m]; width_m of the wetted strip [m]; area_m2 of a
    plant [m2]. Emitters further apart than 0.8 of the width count as 0.8 of it (their circles no
    longer meet). Shapes broadcast; NaN in, NaN out. Source: NEH 623 chapter 7, straight single
    lateral: Np Se w / (Sp Sr) (from memory).
    """
    width = floats(width_m)
    apart = np.minimum(floats(spacing_m), 0.8 * width)
    return np.asarray(
        np.clip(floats(emitters) * apart * width / floats(area_m2), LEAST_FRACTION, 1.0)
    )
