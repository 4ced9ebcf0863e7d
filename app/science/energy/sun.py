"""The sun: its place in the sky, day length, and radiation above the atmosphere."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Days, Floats, floats
from app.science.constants import SOLAR_CONSTANT_HOUR


def day_of_year(date: Days) -> NDArray[np.int64]:
    """Day number J of a date, 1 to 366.

    Arguments: `date`, any shape [datetime64]. Returns J. Source: definition, FAO-56 Annex 2.
    """
    days = np.asarray(date).astype("datetime64[D]")
    first = days.astype("datetime64[Y]").astype("datetime64[D]")
    return np.asarray((days - first).astype(np.int64) + 1)


def inverse_distance(day: ArrayLike) -> Floats:
    """Inverse relative Earth-Sun distance squared d_r.

    Arguments: `day` J, any shape [1..366]. Returns d_r [-]. Source: FAO-56 eq 23.
    """
    j = floats(day)
    return np.asarray(1.0 + 0.033 * np.cos(2.0 * np.pi / 365.0 * j))


def declination(day: ArrayLike) -> Floats:
    """Solar declination delta.

    Arguments: `day` J, any shape [1..366]. Returns delta [rad]. Source: FAO-56 eq 24.
    """
    j = floats(day)
    return np.asarray(0.409 * np.sin(2.0 * np.pi / 365.0 * j - 1.39))


def sunset_hour_angle(latitude_deg: ArrayLike, day: ArrayLike) -> Floats:
    """Sunset hour angle omega_s; 0 through the polar night, pi through the polar day.

    Arguments, shapes that broadcast: `latitude_deg` [-90..90]; `day` J [1..366]. Returns omega_s
    [rad]. NaN gives NaN. Source: FAO-56 eq 25.
    """
    latitude = np.radians(floats(latitude_deg))
    cosine = -np.tan(latitude) * np.tan(declination(day))
    return np.asarray(np.arccos(np.clip(cosine, -1.0, 1.0)))


def day_length(latitude_deg: ArrayLike, day: ArrayLike) -> Floats:
    """Possible hours of sunshine N.

    Arguments, shapes that broadcast: `latitude_deg` [-90..90]; `day` J [1..366]. Returns N
    [h, 0..24]. NaN gives NaN. Source: FAO-56 eq 34.
    """
    return sunset_hour_angle(latitude_deg, day) * (24.0 / np.pi)


def extraterrestrial_daily(latitude_deg: ArrayLike, day: ArrayLike) -> Floats:
    """Extraterrestrial radiation Ra of a day on the horizontal.

    Arguments, shapes that broadcast: `latitude_deg` [-90..90]; `day` J [1..366]. Returns Ra
    [MJ m-2 d-1, not below 0]. NaN gives NaN. Source: FAO-56 eq 21; ASCE-EWRI eq 21.
    """
    latitude = np.radians(floats(latitude_deg))
    delta = declination(day)
    sunset = sunset_hour_angle(latitude_deg, day)
    angles = sunset * np.sin(latitude) * np.sin(delta) + np.cos(latitude) * np.cos(delta) * np.sin(
        sunset
    )
    ra = 24.0 / np.pi * SOLAR_CONSTANT_HOUR * inverse_distance(day) * angles
    return np.asarray(np.maximum(ra, 0.0))


def seasonal_correction(day: ArrayLike) -> Floats:
    """Seasonal correction Sc of solar time (the equation of time).

    Arguments: `day` J, any shape [1..366]. Returns Sc [h]. Source: FAO-56 eq 32, 33.
    """
    b = 2.0 * np.pi * (floats(day) - 81.0) / 364.0
    return np.asarray(0.1645 * np.sin(2.0 * b) - 0.1255 * np.cos(b) - 0.025 * np.sin(b))


def hour_angle(
    clock_h: ArrayLike, day: ArrayLike, longitude_deg: ArrayLike, utc_offset_h: ArrayLike
) -> Floats:
    """Solar hour angle omega at a moment of standard clock time, 0 at solar noon.

    Arguments, shapes that broadcast: `clock_h` [h of the station day]; `day` J; `longitude_deg`
    [east positive]; `utc_offset_h`. Returns omega [rad, -pi..pi]. NaN gives NaN.
    Source: FAO-56 eq 31 (the zone's centre is 15 degrees an hour of offset).
    """
    hours = floats(clock_h) - floats(utc_offset_h)
    solar = hours + floats(longitude_deg) / 15.0 + seasonal_correction(day)
    angle = np.pi / 12.0 * (solar - 12.0)
    return np.asarray((angle + np.pi) % (2.0 * np.pi) - np.pi)


def sine_of_elevation(latitude_deg: ArrayLike, day: ArrayLike, omega: ArrayLike) -> Floats:
    """Sine of the sun's elevation, negative below the horizon.

    Arguments, shapes that broadcast: `latitude_deg` [-90..90]; `day` J; `omega` [rad]. Returns
    sin(beta) [-]. NaN gives NaN. Source: FAO-56 Annex 3 eq 3-15; ASCE-EWRI eq 62.
    """
    latitude = np.radians(floats(latitude_deg))
    delta = declination(day)
    return np.asarray(
        np.sin(latitude) * np.sin(delta) + np.cos(latitude) * np.cos(delta) * np.cos(omega)
    )


def daily_sine_of_elevation(latitude_deg: ArrayLike, day: ArrayLike) -> Floats:
    """Sine of the sun's elevation averaged over a day, weighted by extraterrestrial radiation.

    Arguments, shapes that broadcast: `latitude_deg` [-90..90]; `day` J. Returns sin(beta_24) [-],
    not below 0. NaN gives NaN. Source: FAO-56 Annex 3 eq 3-16.
    """
    latitude = np.radians(floats(latitude_deg))
    season = np.sin(2.0 * np.pi / 365.0 * floats(day) - 1.39)
    angle = 0.85 + 0.3 * latitude * season - 0.42 * latitude * latitude
    return np.asarray(np.sin(np.maximum(angle, 0.0)))


def extraterrestrial_period(
    latitude_deg: ArrayLike, day: ArrayLike, omega_mid: ArrayLike, length_h: ArrayLike = 1.0
) -> Floats:
    """Extraterrestrial radiation Ra of an hour or shorter period.

    Arguments, shapes that broadcast: `latitude_deg` [-90..90]; `day` J; `omega_mid` hour angle at
    the middle of the period [rad]; `length_h` [h]. Returns Ra [MJ m-2 per period, not below 0].
    Only the part between sunrise and sunset counts. NaN gives NaN.
    Source: FAO-56 eq 28-30; ASCE-EWRI eq 48-57.
    """
    latitude = np.radians(floats(latitude_deg))
    delta = declination(day)
    sunset = sunset_hour_angle(latitude_deg, day)
    half = np.pi / 24.0 * floats(length_h)
    middle = floats(omega_mid)
    begin = np.clip(middle - half, -sunset, sunset)
    end = np.clip(middle + half, -sunset, sunset)
    angles = (end - begin) * np.sin(latitude) * np.sin(delta) + np.cos(latitude) * np.cos(delta) * (
        np.sin(end) - np.sin(begin)
    )
    ra = 12.0 / np.pi * SOLAR_CONSTANT_HOUR * inverse_distance(day) * angles
    return np.asarray(np.maximum(ra, 0.0))


def elevation_at_instants(
    latitude_deg: float, longitude_deg: float, instants_utc_s: ArrayLike
) -> tuple[Floats, Floats]:
    """Sine of the sun's elevation and Earth-Sun factor d_r at instants.

    Arguments: `latitude_deg`, `longitude_deg` [east positive]; `instants_utc_s`, any shape
    [seconds since 1970-01-01 UTC]. Returns sin(beta) and d_r [-].
    Source: FAO-56 eq 23, 24, 31-33 (within about 1.5 degrees of an almanac, for eq 24 is off by
    up to a degree in autumn).
    """
    seconds = np.asarray(instants_utc_s).astype(np.int64)
    # the solar day the instant falls in at this longitude
    solar_day = (seconds + round(longitude_deg * 240.0)) // 86400
    day = day_of_year(solar_day.astype("datetime64[D]"))
    clock = (seconds - solar_day * 86400) / 3600.0
    omega = hour_angle(clock, day, longitude_deg, 0.0)
    return sine_of_elevation(latitude_deg, day, omega), inverse_distance(day)
