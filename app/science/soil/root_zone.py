"""Water held for the roots, when they run short, and what salt adds to it."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats

# FAO-56 chapter 8, table 22: p holds at 5 mm/d and moves 0.04 for each mm/d, within 0.1-0.8.
P_SLOPE, P_ETC, P_LEAST, P_MOST = 0.04, 5.0, 0.1, 0.8


def total_available_water(
    field_capacity: ArrayLike, wilting_point: ArrayLike, root_depth: ArrayLike
) -> Floats:
    """TAW [mm] of a uniform soil; water contents [m3 m-3], root_depth [m] (FAO-56 eq 82).

    Shapes broadcast; NaN in, NaN out.
    """
    return np.asarray(
        1000.0 * (floats(field_capacity) - floats(wilting_point)) * floats(root_depth)
    )


def depletion_fraction(table_p: ArrayLike, etc: ArrayLike) -> Floats:
    """Depletion fraction p of a day, 0.1-0.8, from the table's p and the day's unstressed ETc
    [mm d-1]. Shapes broadcast; NaN in, NaN out. Source: FAO-56 table 22, note 2."""
    return np.asarray(np.clip(floats(table_p) + P_SLOPE * (P_ETC - floats(etc)), P_LEAST, P_MOST))


def readily_available_water(p: ArrayLike, taw: ArrayLike) -> Floats:
    """RAW [mm] = p TAW (FAO-56 eq 83). Shapes broadcast; NaN in, NaN out."""
    return np.asarray(floats(p) * floats(taw))


def stress_coefficient(depletion: ArrayLike, taw: ArrayLike, raw: ArrayLike) -> Floats:
    """Ks, 0-1; depletion, taw > raw [mm]; shapes broadcast; NaN in, NaN out (FAO-56 eq 84)."""
    return np.asarray(
        np.clip((floats(taw) - floats(depletion)) / (floats(taw) - floats(raw)), 0.0, 1.0)
    )


def salinity_stress(
    ece: ArrayLike, threshold: ArrayLike, slope: ArrayLike, ky: ArrayLike
) -> Floats:
    """Factor of salinity on Kcb, 0-1, to be multiplied by the Ks of water stress.

    ece and threshold [dS m-1] of the saturation extract; slope b [% per dS m-1]; ky yield response
    factor [-]. Meant for whole seasons and ece below threshold + 50/b. Shapes broadcast; NaN in,
    NaN out. Source: FAO-56 eq 91 and 92.
    """
    over = np.maximum(floats(ece) - floats(threshold), 0.0)
    return np.asarray(np.clip(1.0 - floats(slope) / (100.0 * floats(ky)) * over, 0.0, 1.0))


def leaching_requirement(ec_water: ArrayLike, ece_threshold: ArrayLike) -> Floats:
    """Leaching requirement LR, 0-0.9, of surface and sprinkler irrigation.

    ec_water of the irrigation water, ece_threshold of the crop [dS m-1]. Where the water is too
    salty for the formula LR is 0.9. Shapes broadcast; NaN in, NaN out. Source: FAO-29, quoted in
    FAO-56 chapter 8: ECiw / (5 ECe - ECiw).
    """
    water, crop = floats(ec_water), floats(ece_threshold)
    room = 5.0 * crop - water
    ratio = water / np.where(room > 0.0, room, np.nan)
    bounded = np.where(room > 0.0, np.clip(ratio, 0.0, 0.9), 0.9)
    return np.asarray(np.where(np.isnan(water + crop), np.nan, bounded))


def yield_share(et_actual: ArrayLike, et_potential: ArrayLike, ky: ArrayLike) -> Floats:
    """Yield over its maximum, 0-1, from seasonal ET [mm] and Ky (FAO-56 eq 90).

    Shapes broadcast; NaN in, NaN out.
    """
    short = 1.0 - floats(et_actual) / floats(et_potential)
    return np.asarray(np.clip(1.0 - floats(ky) * short, 0.0, 1.0))


def yield_by_stages(et_actual: ArrayLike, et_potential: ArrayLike, ky: ArrayLike) -> Floats:
    """Yield over its maximum, 0-1, from the ET of each stage.

    et_actual, et_potential [mm] and ky [-] of each stage along the first axis; a stage without
    potential ET counts for nothing. NaN in, NaN out. Source: product over stages of 1 - Ky (1 -
    ETa / ETc), a common form of FAO-33's relation, from memory.
    """
    actual, potential, response = np.broadcast_arrays(
        floats(et_actual), floats(et_potential), floats(ky)
    )
    share = np.ones(actual.shape[1:])
    for eta, etc, k in zip(actual, potential, response, strict=True):
        ratio = np.where(etc == 0.0, 1.0 + 0.0 * eta, eta / np.where(etc == 0.0, 1.0, etc))
        share = share * np.clip(1.0 - k * (1.0 - ratio), 0.0, 1.0)
    return np.asarray(share)


def stress_from_yield(yield_actual: ArrayLike, yield_most: ArrayLike, ky: ArrayLike) -> Floats:
    """Seasonal mean Ks that explains a yield (FAO-56 eq 103); yields in one unit.

    Shapes broadcast; NaN in, NaN out.
    """
    return np.asarray(1.0 - (1.0 - floats(yield_actual) / floats(yield_most)) / floats(ky))
