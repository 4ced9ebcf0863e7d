"""Soft checks of single rows: they warn, and the value is used all the same.

Source: Global Network recommended QC tests V2.0 (BSRN), extremely rare limits; what is marked
working value has no published source.
"""

from collections.abc import Mapping

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Floats, floats
from app.science.constants import SOLAR_CONSTANT_W, WIND_FLOOR
from app.science.energy.day_rows import HIGH_SUN, sun_direction
from app.science.energy.records import Site

RARE_LONGWAVE = {"longwave_down": (60.0, 500.0), "longwave_up": (60.0, 700.0)}  # W m-2, BSRN
OFFSET_FROM = -2.0  # W m-2, BSRN lower limit of shortwave; at night it is the sensor's offset
SHORTWAVE_TELLS = 50.0  # W m-2, BSRN comparison tests apply above it
ALBEDO_RANGE = (0.05, 0.95)  # -, wet bare soil and fresh snow, FAO-56 p. 43
RH_DRY = 5.0  # %, from memory
STEPS = {  # per hour, between rows of at most an hour, working values
    "air_temperature": 10.0,  # K
    "pressure": 0.6,  # kPa
    "longwave_down": 150.0,  # W m-2
}


def soft_row_checks(
    site: Site, instants_mid_utc_s: ArrayLike, values: Mapping[str, ArrayLike]
) -> dict[str, Bools]:
    """Which values of which rows are extremely rare, or changed faster than weather does.

    Arguments: `site`; `instants_mid_utc_s` middle of each row's interval, in time order (rows,)
    [s since 1970-01-01 UTC]; `values` canonical quantity to (rows,) in the units of
    `science.quantities`. Returns "quantity/check" to (rows,) True where it warns; "offset" is the
    night offset of a thermopile, which is counted and not a fault. A missing value or partner
    never warns. Errors: ValueError naming the quantity whose shape differs.
    Source: BSRN extremely rare limits and comparison tests; FAO-56 p. 43; working values.
    """
    instants = np.asarray(instants_mid_utc_s).astype(np.int64)
    arrays = {name: floats(array) for name, array in values.items()}
    for name, array in arrays.items():
        if array.shape != instants.shape:
            raise ValueError(
                f"{name} has shape {array.shape}; the instants have shape {instants.shape}"
            )
    warned: dict[str, Bools] = {}
    down, up = arrays.get("shortwave_down"), arrays.get("shortwave_up")
    if down is not None or up is not None:
        _rare_shortwave(site, instants, down, up, warned)
    for name, (low, high) in RARE_LONGWAVE.items():
        if name in arrays:
            warned[f"{name}/rare"] = (arrays[name] < low) | (arrays[name] > high)
    if "relative_humidity" in arrays:
        warned["relative_humidity/very_dry"] = arrays["relative_humidity"] < RH_DRY
    if "wind_speed" in arrays:
        warned["wind_speed/low"] = _low_for_hours(arrays["wind_speed"], instants)
    for name, most in STEPS.items():
        if name in arrays:
            warned[f"{name}/step"] = _steps(arrays[name], instants, most)
    return warned


def _rare_shortwave(
    site: Site,
    instants: NDArray[np.int64],
    down: Floats | None,
    up: Floats | None,
    warned: dict[str, Bools],
) -> None:
    sine, _, _, factor = sun_direction(site.latitude_deg, site.longitude_deg, instants)
    beam = SOLAR_CONSTANT_W * factor * np.maximum(sine, 0.0) ** 1.2
    lit = sine > 0.0
    if down is not None:
        warned["shortwave_down/rare"] = (lit & (down < OFFSET_FROM)) | (down > 1.2 * beam + 50.0)
        warned["shortwave_down/offset"] = ~lit & (down < OFFSET_FROM)
    if up is not None:
        warned["shortwave_up/rare"] = (lit & (up < OFFSET_FROM)) | (up > beam + 50.0)
        warned["shortwave_up/offset"] = ~lit & (up < OFFSET_FROM)
    if down is not None and up is not None:
        tells = (sine > HIGH_SUN) & (down > SHORTWAVE_TELLS)
        low, high = ALBEDO_RANGE
        warned["shortwave_up/albedo"] = tells & ((up < low * down) | (up > high * down))


def _low_for_hours(wind: Floats, instants: NDArray[np.int64]) -> Bools:
    """Wind below 0.5 m/s through a whole UTC day of at least six rows: bearing or offset."""
    day = instants // 86400
    known = ~np.isnan(wind)
    told = np.zeros(wind.shape, dtype=np.bool_)
    if not known.any():
        return told
    unique, group = np.unique(day, return_inverse=True)
    most = np.full(unique.size, -np.inf)
    np.maximum.at(most, group[known], wind[known])
    enough = np.bincount(group[known], minlength=unique.size) >= 6
    return np.asarray(known & (enough & (most < WIND_FLOOR))[group])


def _steps(values: Floats, instants: NDArray[np.int64], most: float) -> Bools:
    """Where a value changed by more than `most` an hour, and by more than half of it at all."""
    told = np.zeros(values.shape, dtype=np.bool_)
    if values.size < 2:
        return told
    hours = np.diff(instants) / 3600.0
    change = np.abs(np.diff(values))
    near = (hours > 0.0) & (hours <= 1.0)
    told[1:] = near & (change > most * np.maximum(hours, 0.5))
    return told
