"""Salt: what irrigation water leaves in the soil, and the water that washes it out."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.soil.root_zone import leaching_requirement

# A smaller leaching requirement is met by the losses of every irrigation (NEH 623, from memory).
LEAST_REQUIREMENT = 0.1
# Share of the net depth still counted where leaching is added (NEH 623, from memory).
LEACHED_NET = 0.9
# LR no higher than this can be asked for.
MOST_REQUIREMENT = 0.9


def soil_salinity(ec_water: ArrayLike, leaching_fraction: ArrayLike) -> Floats:
    """Salinity ECe of the root zone [dS m-1] that irrigation settles at.

    ec_water [dS m-1] >= 0; leaching_fraction above 0 to 1: share of the water that passes the
    roots; shapes broadcast; NaN in, NaN out. Source: FAO-56 eq 93: (1 + LF) / LF x ECiw / 5.
    """
    part = floats(leaching_fraction)
    return np.asarray((1.0 + part) / part * floats(ec_water) / 5.0)


def most_salinity(threshold: ArrayLike, slope: ArrayLike) -> Floats:
    """ECe [dS m-1] at which yield ends: threshold + 100 / slope (FAO-56 eq 89 at Ya = 0).

    threshold [dS m-1]; slope b > 0 [% per dS m-1]; shapes broadcast; NaN in, NaN out.
    """
    return np.asarray(floats(threshold) + 100.0 / floats(slope))


def salinity_yield(ece: ArrayLike, threshold: ArrayLike, slope: ArrayLike) -> Floats:
    """Yield over its maximum, 0-1, under salinity alone.

    ece and threshold [dS m-1]; slope b [% per dS m-1]; shapes broadcast; NaN in, NaN out.
    Source: FAO-56 eq 89.
    """
    over = np.maximum(floats(ece) - floats(threshold), 0.0)
    return np.asarray(np.clip(1.0 - floats(slope) / 100.0 * over, 0.0, 1.0))


def drip_leaching_requirement(ec_water: ArrayLike, ece_most: ArrayLike) -> Floats:
    """Leaching requirement LR, 0-0.9, of frequent drip irrigation.

    ec_water; ece_most, salinity at which yield ends (`most_salinity`) [dS m-1]; shapes broadcast;
    NaN in, NaN out. Source: FAO-29, ECiw / (2 max ECe) (from memory).
    """
    ratio = floats(ec_water) / (2.0 * floats(ece_most))
    return np.asarray(np.clip(ratio, 0.0, MOST_REQUIREMENT))


def gross_with_leaching(net: ArrayLike, efficiency: ArrayLike, requirement: ArrayLike) -> Floats:
    """Gross depth [mm] that refills `net` [mm] and leaches.

    efficiency above 0 to 1; requirement LR 0-0.9; shapes broadcast; NaN in, NaN out. Up to 0.1
    net / efficiency; above it 0.9 net / ((1 - LR) efficiency), never less. Source: NEH 623
    (from memory).
    """
    lr, part = floats(requirement), floats(efficiency)
    plain = floats(net) / part
    leaching = LEACHED_NET * floats(net) / ((1.0 - lr) * part)
    return np.asarray(np.where(lr > LEAST_REQUIREMENT, np.maximum(leaching, plain), plain + 0 * lr))


def above_threshold(ec_water: float, leaching_fraction: float, threshold: float) -> float:
    """How far [dS m-1] the salinity that irrigation settles at lies above the crop's threshold;
    0 for not at all. Arguments as in `soil_salinity` and `salinity_yield`; NaN in, NaN out."""
    return float(np.maximum(soil_salinity(ec_water, leaching_fraction) - threshold, 0.0))


__all__ = [
    "above_threshold",
    "drip_leaching_requirement",
    "gross_with_leaching",
    "leaching_requirement",
    "most_salinity",
    "salinity_yield",
    "soil_salinity",
]
