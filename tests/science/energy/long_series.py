"""Clear days of long series, for drift.

One is made by us: pvlib's clear sky (simplified Solis) with the dew point and clouds of an NREL
typical year, and noise of 1 % a day. The others are NREL typical years as they stand.
"""

from functools import cache
from pathlib import Path

import numpy as np
import pvlib

from app.science.energy.day_rows import day_rows
from app.science.energy.drift import Drift, drift, expected_level
from app.science.energy.humidity import saturation_vapour_pressure
from app.science.energy.records import Site
from app.science.energy.tilt import ClearShape, clear_shape

GREENSBORO = Site(36.1, -79.95, 273.0, -5.0)
YEARS = np.arange("2021-01-01", "2023-01-01", dtype="datetime64[D]")
LAST_HALF = np.clip((YEARS - np.datetime64("2022-07-01")).astype(float) / 184.0, 0.0, 1.0)


@cache
def made_series() -> tuple[np.ndarray, np.ndarray]:
    """Level and clear of two years of half-hours, without drift."""
    path = Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"
    table, _ = pvlib.iotools.read_tmy3(path, coerce_year=1990, map_variables=True)
    dew = table["temp_dew"].to_numpy(dtype=float).reshape(365, 24)
    measured = table["ghi"].to_numpy(dtype=float).reshape(365, 24)
    typical = day_rows(GREENSBORO, np.datetime64("1990-01-01") + np.arange(365), 24)
    cloud = measured.sum(axis=1) / typical.clear.sum(axis=1)
    ea_of_day = saturation_vapour_pressure(dew).mean(axis=1)
    # the second year's weather comes four days later than the first's
    pick = np.r_[np.arange(365), (np.arange(365) - 4) % 365]
    ea, cloud = ea_of_day[pick], cloud[pick]
    rows = day_rows(GREENSBORO, YEARS, 48)
    elevation = np.degrees(np.arcsin(rows.up))
    water_cm = (0.14 * ea * 98.0 + 2.1) / 10.0
    sky = pvlib.clearsky.simplified_solis(
        elevation, aod700=0.1, precipitable_water=water_cm[:, None], pressure=98000.0
    )["ghi"]
    rng = np.random.default_rng(5)
    patches = rng.uniform(0.3, 1.0, rows.up.shape)
    shortwave = np.where((cloud > 0.85)[:, None], sky, sky * patches)
    shortwave = np.nan_to_num(shortwave) * rng.normal(1.0, 0.01, YEARS.size)[:, None]
    shape = clear_shape(GREENSBORO, rows, shortwave, ea)
    return shape.level, shape.clear


def last_half(level: np.ndarray) -> Drift:
    """Drift over the last six months of the made series, the year before as what is usual."""
    clear = made_series()[1]
    half = np.datetime64("2022-07-01") <= YEARS
    expected = expected_level(YEARS, level, clear)
    return drift(YEARS[half], level[half], clear[half], expected[half])


@cache
def typical_levels(name: str) -> tuple[np.ndarray, ClearShape]:
    """Clear days of an NREL typical year, hourly."""
    path = Path(pvlib.__file__).parent / "data" / name
    table, head = pvlib.iotools.read_tmy3(path, coerce_year=1990, map_variables=True)
    site = Site(head["latitude"], head["longitude"], head["altitude"], head["TZ"])
    date = np.datetime64("1990-01-01") + np.arange(365)
    dew = table["temp_dew"].to_numpy(dtype=float).reshape(365, 24)
    shape = clear_shape(
        site,
        day_rows(site, date, 24),
        table["ghi"].to_numpy(dtype=float).reshape(365, 24),
        saturation_vapour_pressure(dew).mean(axis=1),
    )
    return date, shape
