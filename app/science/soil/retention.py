"""Water content from tension and back, by the retention curve of a soil layer."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.soil.profile import Layer

# Tensions of field capacity and wilting point [kPa]: Saxton & Rawls 2006.
FIELD_CAPACITY_KPA, WILTING_POINT_KPA = 33.0, 1500.0


def water_content(
    tension: ArrayLike, layer: Layer, *, field_capacity_kpa: float = FIELD_CAPACITY_KPA
) -> Floats:
    """Water content [m3 m-3] of `layer` at `tension` [kPa, positive, any shape].

    field_capacity_kpa: tension at which the layer's field capacity holds (33; 10 for sands). From
    field capacity to the dry end content falls as a power of tension through field capacity and
    wilting point; wetter, it rises linearly to saturation at no tension. NaN in, NaN out. Source:
    Saxton & Rawls 2006, eq 11 and 12 (from memory), with no air entry.
    """
    suction = floats(tension)
    wet, full = layer.field_capacity, layer.saturation
    slope = _slope(layer, field_capacity_kpa)
    held = wet * (np.maximum(suction, field_capacity_kpa) / field_capacity_kpa) ** -slope
    above = full + (wet - full) * np.maximum(suction, 0.0) / field_capacity_kpa
    return np.asarray(np.where(suction < field_capacity_kpa, above, held))


def tension(
    content: ArrayLike, layer: Layer, *, field_capacity_kpa: float = FIELD_CAPACITY_KPA
) -> Floats:
    """Tension [kPa] of `layer` at a water content [m3 m-3, above 0, any shape]; the inverse of
    `water_content`. NaN in, NaN out."""
    theta = floats(content)
    wet, full = layer.field_capacity, layer.saturation
    slope = _slope(layer, field_capacity_kpa)
    dry_side = field_capacity_kpa * (np.minimum(theta, wet) / wet) ** (-1.0 / slope)
    wet_side = field_capacity_kpa * np.maximum(full - theta, 0.0) / (full - wet)
    return np.asarray(np.where(theta > wet, wet_side, dry_side))


def content_error(
    tension: ArrayLike,
    relative_error: float,
    layer: Layer,
    *,
    field_capacity_kpa: float = FIELD_CAPACITY_KPA,
) -> Floats:
    """Error of water content [m3 m-3] that a `relative_error` of tension brings at `tension`.

    Arguments as in `water_content`; NaN in, NaN out. Half of the difference between both ends.
    """
    suction = floats(tension)
    ends = [
        water_content(suction * factor, layer, field_capacity_kpa=field_capacity_kpa)
        for factor in (1.0 - min(relative_error, 0.99), 1.0 + relative_error)
    ]
    return np.asarray((ends[0] - ends[1]) / 2.0)


def _slope(layer: Layer, field_capacity_kpa: float) -> float:
    """Fall of log content with log tension between field capacity and wilting point."""
    dry = max(layer.wilting_point, 1e-3)
    span = np.log(WILTING_POINT_KPA) - np.log(field_capacity_kpa)
    return float((np.log(layer.field_capacity) - np.log(dry)) / span)
