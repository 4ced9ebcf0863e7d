"""Runoff of a day's rain by the NRCS curve number."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats

# NRCS National Engineering Handbook (USDA-SCS 1985, NEH-4), antecedent runoff condition table:
# average (II), dry (I) and wet (III) curve numbers; 0 added as the table's limit.
AVERAGE = (0.0, 30.0, 40.0, 50.0, 60.0, 70.0, 80.0, 90.0, 100.0)
DRY = (0.0, 15.0, 22.0, 31.0, 40.0, 51.0, 63.0, 78.0, 100.0)
WET = (0.0, 50.0, 60.0, 70.0, 78.0, 85.0, 91.0, 96.0, 100.0)
# Initial abstraction over retention (NEH 630 chapter 10).
ABSTRACTION = 0.2


def dry_curve_number(curve_number: ArrayLike) -> Floats:
    """Curve number for dry soil (condition I) from the average one, 0-100, linear between the
    table's rows. NaN in, NaN out. Source: NEH-4 (USDA-SCS 1985)."""
    return np.asarray(np.interp(np.asarray(curve_number, dtype=np.float64), AVERAGE, DRY))


def wet_curve_number(curve_number: ArrayLike) -> Floats:
    """Curve number for wet soil (condition III) from the average one, 0-100, linear between the
    table's rows. NaN in, NaN out. Source: NEH-4 (USDA-SCS 1985)."""
    return np.asarray(np.interp(np.asarray(curve_number, dtype=np.float64), AVERAGE, WET))


def retention(curve_number: ArrayLike) -> Floats:
    """Potential retention S [mm] = 25400 / CN - 254; curve_number above 0 to 100.

    NaN in, NaN out. Source: NEH 630 chapter 10.
    """
    return np.asarray(25400.0 / np.asarray(curve_number, dtype=np.float64) - 254.0)


def runoff(rain: ArrayLike, curve_number: ArrayLike) -> Floats:
    """Runoff [mm] of `rain` [mm d-1] on soil of `curve_number`; shapes broadcast; NaN in, NaN out.

    Source: NEH 630 chapter 10: (P - 0.2 S)^2 / (P + 0.8 S) above 0.2 S.
    """
    depth = np.asarray(rain, dtype=np.float64)
    held = retention(curve_number)
    over = np.maximum(depth - ABSTRACTION * held, 0.0)
    below = np.maximum(depth + (1.0 - ABSTRACTION) * held, 1e-9)
    return np.asarray(over * over / below)


def wetness_bounds(tew: ArrayLike, rew: ArrayLike) -> tuple[Floats, Floats]:
    """Depletions [mm] of the evaporation layer at which the soil counts as wet (condition III,
    at or below) and as dry (condition I, at or above); between them the curve number is linear.

    Source: J. Irrig. Drain. Eng. 131:2-13 (2005), from memory: 0.5 REW and 0.7 REW + 0.3 TEW.
    """
    ready, total = np.asarray(rew, dtype=np.float64), np.asarray(tew, dtype=np.float64)
    return np.asarray(0.5 * ready), np.asarray(0.7 * ready + 0.3 * total)
