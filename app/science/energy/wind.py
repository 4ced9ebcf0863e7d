"""Wind speed at two metres."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Floats, floats
from app.science.constants import WIND_ASSUMED

WIND_RUNGS = ("none", "measured", "neighbours", "assumed 2 m/s")
# Standard uncertainty of a day's wind by wind rung, share of u2: working values.
WIND_SHARE = np.array([np.nan, 0.05, 0.20, 0.40])


def wind_height_factor(height: ArrayLike) -> Floats:
    """Factor that brings wind over grass from a height to 2 m by the logarithmic profile.

    Arguments: `height` z, any shape [m, above 0.1]. Returns the factor [-], exactly 1 at 2 m;
    NaN where z is NaN or not above 0.1. Source: FAO-56 eq 47; ASCE-EWRI eq 33.
    """
    z = floats(height)
    factor = 4.87 / np.log(67.8 * np.where(z > 0.1, z, np.nan) - 5.42)
    return np.where(z == 2.0, 1.0, factor)


def wind_at_2m(wind: ArrayLike, height: ArrayLike) -> Floats:
    """Wind speed u2 at 2 m from the speed at another height over grass.

    Arguments, shapes that broadcast: `wind` uz [m s-1]; `height` z [m, above 0.1]. Returns u2
    [m s-1]. NaN gives NaN. Source: FAO-56 eq 47; ASCE-EWRI eq 33.
    """
    return floats(wind) * wind_height_factor(height)


def best_wind(
    wind: ArrayLike, height: float, neighbours: Floats | None = None
) -> tuple[Floats, NDArray[np.int8]]:
    """Wind at 2 m of each day: measured, else the neighbours', else 2 m/s, and its rung.

    Arguments: `wind` (days,) [m s-1 at `height`], NaN where not measured; `height` [m];
    `neighbours` (days,) interpolated at 2 m [m s-1]. Returns u2 [m s-1] and the rung (1 measured,
    2 neighbours, 3 assumed).
    Source: FAO-56 chapter 3, missing wind speed data.
    """
    u2 = wind_at_2m(wind, height)
    missing = np.isnan(u2)
    rung = np.where(missing, np.int8(3), np.int8(1))
    assumed = np.full(u2.shape, WIND_ASSUMED)
    if neighbours is not None:
        near = ~np.isnan(neighbours)
        rung = np.where(missing & near, np.int8(2), rung)
        assumed = np.where(near, neighbours, assumed)
    return np.where(missing, assumed, u2), rung
