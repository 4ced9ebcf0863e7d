"""Coefficients of stands that differ from the table's: cover, height, mulch, mixtures."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.crop.climate import climate_term
from app.science.energy.sun import declination

# FAO-56 eq 97: extinction of radiation in the canopy.
EXTINCTION = 0.7
# FAO-56 Example 47 solves eq 97 for LAI with 1.4 in place of 1 / 0.7.
LAI_PER_LOG = 1.4
# FAO-56 eq 105: ceiling of a windbreak's coefficient.
WINDBREAK_MOST = 2.5


def sin_noon_elevation(latitude_deg: ArrayLike, day_of_year: ArrayLike) -> Floats:
    """Sine of the sun's elevation at solar noon.

    latitude_deg -90..90; day_of_year 1-366; shapes broadcast; NaN in, NaN out. Source: FAO-56
    eq 24 and the note to eq 98 (sin eta = sin phi sin delta + cos phi cos delta).
    """
    latitude, delta = np.deg2rad(floats(latitude_deg)), declination(day_of_year)
    return np.asarray(np.sin(latitude) * np.sin(delta) + np.cos(latitude) * np.cos(delta))


def effective_cover_rows(
    cover: ArrayLike, height_width_ratio: ArrayLike, elevation_rad: ArrayLike
) -> Floats:
    """Fraction of ground shaded or covered near noon by row crops.

    cover 0-1; height_width_ratio: canopy height (by the rows' angle from east-west) over width;
    elevation_rad [rad] of the noon sun; shapes broadcast; NaN in, NaN out. Source: FAO-56,
    note to eq 98.
    """
    shade = 1.0 + floats(height_width_ratio) / np.tan(floats(elevation_rad))
    return np.asarray(np.minimum(floats(cover) * shade, 1.0))


def effective_cover_round(cover: ArrayLike, sin_elevation: ArrayLike) -> Floats:
    """Fraction of ground shaded near noon by round crowns: cover / sin(elevation), at most 1.

    Shapes broadcast; NaN in, NaN out. Source: FAO-56, note to eq 98.
    """
    return np.asarray(np.minimum(floats(cover) / floats(sin_elevation), 1.0))


def kcb_full(wind_2m: ArrayLike, rh_min: ArrayLike, height: ArrayLike) -> Floats:
    """Kcb of a full stand of unlisted vegetation at mid-season.

    wind_2m [m s-1], rh_min [%], height [m]; shapes broadcast; NaN in, NaN out. Source: FAO-56
    eq 100 and 101.
    """
    return np.minimum(1.0 + 0.1 * floats(height), 1.20) + climate_term(wind_2m, rh_min, height)


def kcb_from_cover(
    cover: ArrayLike,
    effective_cover: ArrayLike,
    height: ArrayLike,
    full: ArrayLike,
    kc_min: ArrayLike = 0.15,
) -> Floats:
    """Mid-season Kcb of a sparse stand from ground cover and height.

    cover, effective_cover 0-1; height [m]; full: Kcb at full cover [-]; kc_min [-]; shapes
    broadcast; NaN in, NaN out. Source: FAO-56 eq 98.
    """
    fc, effective = floats(cover), floats(effective_cover)
    density = np.minimum(np.minimum(1.0, 2.0 * fc), effective ** (1.0 / (1.0 + floats(height))))
    return np.asarray(floats(kc_min) + (floats(full) - floats(kc_min)) * density)


def density_coefficient(
    effective_cover: ArrayLike, height: ArrayLike, canopy_multiplier: ArrayLike = 1.5
) -> Floats:
    """Density coefficient Kd, 0-1, from effective cover and height [m].

    canopy_multiplier 1.5-2.0; shapes broadcast; NaN in, NaN out. Source: Irrigation Science
    28:17-34 (2009), from memory.
    """
    effective = floats(effective_cover)
    return np.asarray(
        np.minimum(
            np.minimum(1.0, floats(canopy_multiplier) * effective),
            effective ** (1.0 / (1.0 + floats(height))),
        )
    )


def kcb_from_lai(lai: ArrayLike, full: ArrayLike, kc_min: ArrayLike = 0.15) -> Floats:
    """Kcb from leaf area index (FAO-56 eq 97).

    lai >= 0; full: Kcb at full cover [-]; shapes broadcast; NaN in, NaN out.
    """
    return np.asarray(
        floats(kc_min) + (floats(full) - floats(kc_min)) * (1.0 - np.exp(-EXTINCTION * floats(lai)))
    )


def lai_from_kcb(kcb: ArrayLike, full: ArrayLike, kc_min: ArrayLike = 0.15) -> Floats:
    """Leaf area index that gives `kcb`: eq 97 solved for LAI, with the print's rounded constant.

    kc_min <= kcb < full; shapes broadcast; NaN in, NaN out. Source: FAO-56 Example 47.
    """
    share = (floats(kcb) - floats(kc_min)) / (floats(full) - floats(kc_min))
    return np.asarray(-LAI_PER_LOG * np.log(1.0 - share))


def sparse_stand_reduction(cover: ArrayLike, dense: ArrayLike) -> Floats:
    """Reduction Acm [-] of Kc or Kcb in a thin stand of an annual crop.

    cover and dense: fraction of cover, or LAI, of this stand and of a dense one; shapes
    broadcast; NaN in, NaN out. Source: FAO-56 eq 94 to 96.
    """
    return np.asarray(1.0 - np.sqrt(floats(cover) / floats(dense)))


def stomatal_factor(
    leaf_resistance: ArrayLike, slope: ArrayLike, gamma: ArrayLike, wind_2m: ArrayLike
) -> Floats:
    """Factor Fr [-] on Kcb for stomatal control.

    leaf_resistance rl [s m-1] (100 for most crops); slope of the vapour pressure curve and
    psychrometric constant gamma [kPa degC-1]; wind_2m [m s-1]; shapes broadcast; NaN in, NaN out.
    Source: FAO-56 eq 102.
    """
    d, g, u2 = floats(slope), floats(gamma), floats(wind_2m)
    open_stomata = d + g * (1.0 + 0.34 * u2)
    return np.asarray(open_stomata / (d + g * (1.0 + 0.34 * u2 * floats(leaf_resistance) / 100.0)))


def mulched(coefficient: ArrayLike, reduction: ArrayLike) -> Floats:
    """Coefficient under plastic mulch: less by `reduction` (Kc 0.10-0.30, Kcb 0.05-0.15).

    Shapes broadcast; NaN in, NaN out. Source: FAO-56 chapter 10, Example 45.
    """
    return np.asarray(floats(coefficient) * (1.0 - floats(reduction)))


def intercropped(
    fractions: tuple[float, float], heights: tuple[float, float], kcs: tuple[float, float]
) -> float:
    """Kc of two intercropped species weighted by ground fraction and height [m] (FAO-56 eq 104)."""
    weights = [f * h for f, h in zip(fractions, heights, strict=True)]
    return sum(w * k for w, k in zip(weights, kcs, strict=True)) / sum(weights)


def windbreak(canopy_height: ArrayLike, width: ArrayLike, stomatal: ArrayLike = 1.0) -> Floats:
    """Kc of a narrow strip of tall vegetation: at most 1.2 + Fr h / width, ceiling 2.5.

    canopy_height and width [m]; stomatal Fr [-]; shapes broadcast; NaN in, NaN out. Source:
    FAO-56 eq 105.
    """
    tall = floats(stomatal) * floats(canopy_height) / floats(width)
    return np.asarray(np.minimum(1.2 + tall, WINDBREAK_MOST))
