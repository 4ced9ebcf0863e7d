"""Water contents of a soil from its texture and organic matter (Saxton & Rawls 2006)."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats
from app.science.soil.capillary import METRES_PER_KPA, REACH_M, RisingSoil
from app.science.soil.profile import Layer

# Saxton & Rawls 2006 (Soil Sci. Soc. Am. J. 70:1569-1578): range the equations are meant for.
MOST_CLAY, MOST_ORGANIC_MATTER = 60.0, 8.0
# Near-pure sand would give a negative wilting point.
LEAST_WILTING_POINT = 0.005
MINERAL_DENSITY = 2.65
# Coarse sand would give an air entry below nothing [kPa]; gravel beyond this is no soil [%].
LEAST_AIR_ENTRY, MOST_GRAVEL = 0.2, 80.0


@dataclass(frozen=True, kw_only=True)
class TextureWater:
    """Water contents [m3 m-3], saturated conductivity [mm h-1], bulk density [g cm-3], air entry
    tension [kPa] and pore size index (slope of log content on log tension) [-]."""

    wilting_point: Floats
    field_capacity: Floats
    saturation: Floats
    conductivity: Floats
    bulk_density: Floats
    air_entry: Floats
    pore_index: Floats


def texture_water(
    sand: ArrayLike, clay: ArrayLike, organic_matter: ArrayLike = 2.5
) -> TextureWater:
    """Soil water characteristics from sand and clay [% by weight] and organic matter [%].

    sand 0-100, clay 0-60, sand + clay at most 100, organic_matter 0-8; shapes broadcast; NaN in,
    NaN out. Raises ValueError outside these ranges. Source: Saxton & Rawls 2006, table 1 (wilting
    point and field capacity checked against the text; saturation and conductivity from memory).
    """
    s = np.asarray(sand, dtype=np.float64) / 100.0
    c = np.asarray(clay, dtype=np.float64) / 100.0
    om = np.asarray(organic_matter, dtype=np.float64)
    _refuse("sand", s * 100.0, 100.0)
    _refuse("clay", c * 100.0, MOST_CLAY)
    _refuse("sand and clay together", (s + c) * 100.0, 100.0 + 1e-9)
    _refuse("organic matter", om, MOST_ORGANIC_MATTER)
    first = (
        -0.024 * s + 0.487 * c + 0.006 * om
        + 0.005 * s * om - 0.013 * c * om + 0.068 * s * c + 0.031
    )  # fmt: skip
    wilting = np.maximum(first + 0.14 * first - 0.02, LEAST_WILTING_POINT)
    first = (
        -0.251 * s + 0.195 * c + 0.011 * om
        + 0.006 * s * om - 0.027 * c * om + 0.452 * s * c + 0.299
    )  # fmt: skip
    capacity = first + 1.283 * first**2 - 0.374 * first - 0.015
    first = (
        0.278 * s + 0.034 * c + 0.022 * om
        - 0.018 * s * om - 0.027 * c * om - 0.584 * s * c + 0.078
    )  # fmt: skip
    drained = first + 0.636 * first - 0.107
    saturation = capacity + drained - 0.097 * s + 0.043
    first = (
        -21.67 * s - 27.93 * c - 81.97 * drained
        + 71.12 * s * drained + 8.29 * c * drained + 14.05 * s * c + 27.16
    )  # fmt: skip
    entry = np.maximum(first + 0.02 * first**2 - 0.113 * first - 0.70, LEAST_AIR_ENTRY)
    slope = (np.log(capacity) - np.log(wilting)) / (np.log(1500.0) - np.log(33.0))
    return TextureWater(
        wilting_point=np.asarray(wilting),
        field_capacity=np.asarray(capacity),
        saturation=np.asarray(saturation),
        conductivity=np.asarray(1930.0 * (saturation - capacity) ** (3.0 - slope)),
        bulk_density=np.asarray(MINERAL_DENSITY * (1.0 - saturation)),
        air_entry=np.asarray(entry),
        pore_index=np.asarray(slope),
    )


def gravel_volume(gravel: ArrayLike, bulk_density: ArrayLike) -> Floats:
    """Fraction of the soil's volume that is gravel.

    gravel [% by weight of the whole soil] 0-100; bulk_density of the fine earth [g cm-3]; shapes
    broadcast; NaN in, NaN out. Source: Saxton & Rawls 2006, eq 19 and 20 (from memory).
    """
    weight = np.asarray(gravel, dtype=np.float64) / 100.0
    _refuse("gravel", weight * 100.0, 100.0)
    alpha = np.asarray(bulk_density, dtype=np.float64) / MINERAL_DENSITY
    return np.asarray(alpha * weight / (1.0 - weight * (1.0 - alpha)))


def texture_layer(
    bottom_m: float,
    sand: float,
    clay: float,
    organic_matter: float = 2.5,
    gravel: float = 0.0,
) -> Layer:
    """A soil layer from its texture; gravel holds no water and takes its share of the volume.

    bottom_m [m]; sand, clay [% by weight of the fine earth], organic_matter [%] as in
    `texture_water`; gravel [% by weight of the whole soil] 0-80. Raises ValueError outside the
    ranges. Source: Saxton & Rawls 2006.
    """
    _refuse("gravel", np.asarray(gravel, dtype=np.float64), MOST_GRAVEL)
    water = texture_water(sand, clay, organic_matter)
    earth = 1.0 - float(gravel_volume(gravel, water.bulk_density))
    return Layer(
        bottom_m,
        field_capacity=earth * float(water.field_capacity),
        wilting_point=earth * float(water.wilting_point),
        saturation=earth * float(water.saturation),
    )


def rising_soil(
    sand: float, clay: float, organic_matter: float = 2.5, *, reach_m: float = REACH_M
) -> RisingSoil:
    """The soil above a water table from its texture; arguments as in `texture_water`; reach_m:
    the farthest distance to the roots at which rise counts [m]. Source: Saxton & Rawls 2006."""
    water = texture_water(sand, clay, organic_matter)
    return RisingSoil(
        conductivity_mm_d=24.0 * float(water.conductivity),
        air_entry_m=float(water.air_entry) * METRES_PER_KPA,
        pore_index=float(water.pore_index),
        reach_m=reach_m,
    )


def _refuse(name: str, values: Floats, most: float) -> None:
    wrong = (values < 0.0) | (values > most)
    if np.any(wrong):
        raise ValueError(
            f"{name} is {float(np.ravel(values)[np.argmax(np.ravel(wrong))]):g} %; "
            f"the texture equations hold from 0 to {most:g} %"
        )
