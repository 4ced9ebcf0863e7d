"""Rows of one step laid out by local standard day, and the sun over them."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Days, Floats
from app.science.constants import SOLAR_CONSTANT_W
from app.science.energy.records import Site

_J2000 = 946728000  # s since 1970 of 1 January 2000, 12:00
HIGH_SUN = float(np.sin(np.radians(10.0)))  # below it ratios of shortwave say little (METHODS, 3)


def sun_direction(
    latitude_deg: float, longitude_deg: float, instants_utc_s: ArrayLike
) -> tuple[Floats, Floats, Floats, Floats]:
    """Direction of the sun by the almanac's low-precision formulas, for judging sensors.

    Arguments: `latitude_deg` [-90..90], `longitude_deg` [east positive]; `instants_utc_s`, any
    shape [s since 1970-01-01 UTC]. Returns direction cosines up (sine of the elevation, no
    refraction), east, south, and the Earth-Sun factor (mean distance over distance, squared), each
    of that shape [-]. Good to about 0.02 degrees, 1950-2050.
    Source: low-precision formulas for the Sun of The Astronomical Almanac (from memory).
    """
    days = (np.asarray(instants_utc_s, dtype=np.float64) - _J2000) / 86400.0
    mean_longitude = np.radians((280.460 + 0.9856474 * days) % 360.0)
    anomaly = np.radians((357.528 + 0.9856003 * days) % 360.0)
    longitude = mean_longitude + np.radians(1.915 * np.sin(anomaly) + 0.020 * np.sin(2.0 * anomaly))
    tilt = np.radians(23.439 - 0.0000004 * days)
    ascension = np.arctan2(np.cos(tilt) * np.sin(longitude), np.cos(longitude))
    declination = np.arcsin(np.sin(tilt) * np.sin(longitude))
    distance = 1.00014 - 0.01671 * np.cos(anomaly) - 0.00014 * np.cos(2.0 * anomaly)
    sidereal = np.radians((280.46062 + 360.98564737 * days + longitude_deg) % 360.0)
    hour = sidereal - ascension
    latitude = np.radians(latitude_deg)
    up = np.sin(latitude) * np.sin(declination) + np.cos(latitude) * np.cos(declination) * np.cos(
        hour
    )
    east = -np.cos(declination) * np.sin(hour)
    south = np.sin(latitude) * np.cos(declination) * np.cos(hour) - np.cos(latitude) * np.sin(
        declination
    )
    return np.asarray(up), np.asarray(east), np.asarray(south), np.asarray(1.0 / distance**2)


@dataclass(frozen=True)
class DayRows:
    """The sun over rows of one step on local standard days; arrays (days, rows of a day).

    `date` (days,) in time order; `interval_s` step [s]; `middle` of each row [UTC s]; `up`,
    `east`, `south` direction cosines of the sun [-]; `beam` extraterrestrial normal irradiance,
    `clear` simple clear-sky shortwave [W m-2].
    """

    date: Days
    interval_s: float
    middle: NDArray[np.int64]
    up: Floats
    east: Floats
    south: Floats
    beam: Floats
    clear: Floats

    @property
    def night(self) -> Bools:
        """Where the sun is below the horizon at mid-row."""
        return np.asarray(self.up <= 0.0)

    @property
    def high(self) -> Bools:
        """Where the sun stands above 10 degrees."""
        return np.asarray(self.up > HIGH_SUN)

    @property
    def morning(self) -> Bools:
        """Rows up to the day's highest sun."""
        if self.up.size == 0:
            return np.zeros(self.up.shape, dtype=np.bool_)
        noon = np.argmax(self.up, axis=1)[:, None]
        return np.asarray(np.arange(self.up.shape[1]) <= noon)


def day_rows(site: Site, date: Days, rows_a_day: int) -> DayRows:
    """The sun over the rows of local standard days.

    Arguments: `site`; `date` (days,); `rows_a_day` [24..1440, a divisor of 86400 s]. Returns
    DayRows; row i covers i/n to (i+1)/n of the day, the sun taken at its middle.
    Errors: ValueError for a number of rows that does not divide the day.
    Source: FAO-56 eq 37 for the clear sky.
    """
    if rows_a_day < 1 or 86400 % rows_a_day:
        raise ValueError(f"rows_a_day is {rows_a_day}; it must divide a day of 86400 s")
    interval = 86400 // rows_a_day
    day = np.asarray(date).astype("datetime64[D]")
    start = day.astype(np.int64) * 86400 - round(site.utc_offset_h * 3600.0)
    middle = start[:, None] + np.arange(rows_a_day) * interval + interval // 2
    up, east, south, factor = sun_direction(site.latitude_deg, site.longitude_deg, middle)
    beam = SOLAR_CONSTANT_W * factor
    clear = (0.75 + 2e-5 * site.elevation_m) * beam * np.maximum(up, 0.0)
    return DayRows(day, float(interval), middle, up, east, south, beam, clear)
