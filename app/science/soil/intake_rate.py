"""Whether water is applied faster than the soil takes it in."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats

# Basic infiltration rate [mm h-1], lower and upper of each class. Source: FAO Irrigation Water
# Management, Training Manual 5 (Irrigation Methods), Annex 2, from memory; a class it does not
# list takes the nearest listed one's (working value). Sand has no printed upper bound.
BASIC_RATES = {
    "sand": (30.0, 50.0),
    "loamy_sand": (30.0, 50.0),
    "sandy_loam": (20.0, 30.0),
    "loam": (10.0, 20.0),
    "silt_loam": (10.0, 20.0),
    "silt": (10.0, 20.0),
    "sandy_clay_loam": (5.0, 10.0),
    "clay_loam": (5.0, 10.0),
    "silty_clay_loam": (5.0, 10.0),
    "sandy_clay": (1.0, 5.0),
    "silty_clay": (1.0, 5.0),
    "clay": (1.0, 5.0),
}


@dataclass(frozen=True, kw_only=True)
class IntakeWarning:
    """Water falls at `rate_mm_h`, more than the soil's basic `intake_mm_h`: `excess` of it, 0-1,
    stands or runs once the soil is wet."""

    rate_mm_h: float
    intake_mm_h: float
    excess: float


def local_rate(rate: ArrayLike, wetted_fraction: ArrayLike) -> Floats:
    """Rate [mm h-1] where the water falls: over the field by the wetted fraction 0.01-1.

    Shapes broadcast; NaN in, NaN out. Source: FAO-56 eq 61, for a rate.
    """
    return np.asarray(floats(rate) / floats(wetted_fraction))


def intake_warning(
    rate_mm_h: float, intake_mm_h: float, *, wetted_fraction: float = 1.0
) -> IntakeWarning | None:
    """Warning where an application is faster than the soil's intake; None where it is not.

    rate_mm_h gross over the field and intake_mm_h basic (long-run) intake, both above 0;
    wetted_fraction 0.01-1 of the surface. ValueError for a figure that is not above 0. A short
    application may soak in all the same: intake starts higher than its basic rate. Source: FAO
    Irrigation Water Management, Training Manual 5 (from memory).
    """
    for name, value in (("rate_mm_h", rate_mm_h), ("intake_mm_h", intake_mm_h)):
        if not value > 0.0:
            raise ValueError(f"{name} is {value:g}; it must be above 0")
    rate = float(local_rate(rate_mm_h, wetted_fraction))
    if rate <= intake_mm_h:
        return None
    return IntakeWarning(rate_mm_h=rate, intake_mm_h=intake_mm_h, excess=1.0 - intake_mm_h / rate)
