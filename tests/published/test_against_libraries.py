"""Sun and humidity against general-purpose libraries: pvlib (sun), MetPy (moist air).

Libraries: pvlib 0.16, MetPy 1.7. Tolerances carry their physical reason.
"""

import metpy.calc as mpcalc
import numpy as np
import pandas as pd
import pvlib
import pytest
from metpy.units import units

from app.science.energy import humidity, sun
from tests.published.typical_year import FILES, typical_year

DAYS = np.arange(1, 366)
# pvlib 0.16 under pandas 3; nothing of ours
PANDAS_DAY = "ignore:DatetimeIndex.dayofyear is deprecated"
# (latitude, longitude, hours of UTC offset): both typical years, and the southern tropics
PLACES = [(36.1, -79.95, -5), (55.317, -160.517, -9), (-20.0, 30.0, 2)]


def _radiation_of_sine_declination(latitude: float) -> np.ndarray:
    """Daily radiation above the air, integrated over hour angles with pvlib's own functions."""
    declination = pvlib.solarposition.declination_cooper69(DAYS)
    omega = np.radians((np.arange(2880) + 0.5) / 8.0 - 180.0)
    zenith = pvlib.solarposition.solar_zenith_analytical(
        np.radians(latitude), omega[:, None], declination
    )
    normal = pvlib.irradiance.get_extra_radiation(
        DAYS, solar_constant=4.92e6 / 3600.0, method="asce"
    )
    return (normal * np.maximum(np.cos(zenith), 0.0)).mean(axis=0) * 0.0864


@pytest.mark.parametrize("latitude", [-65.0, -20.0, 0.0, 36.1, 55.317, 66.0])
def test_extraterrestrial_radiation_same_declination(latitude: float) -> None:
    """Within 0.15 MJ m-2: eq 24 rounds the phase of that sine to 1.39, a tenth of a degree."""
    ours = sun.extraterrestrial_daily(latitude, DAYS)
    np.testing.assert_allclose(ours, _radiation_of_sine_declination(latitude), atol=0.15, rtol=0.0)


@pytest.mark.filterwarnings(PANDAS_DAY)
@pytest.mark.parametrize(("latitude", "longitude", "offset"), PLACES)
def test_extraterrestrial_radiation_against_almanac(
    latitude: float, longitude: float, offset: int
) -> None:
    """Within 0.8 MJ m-2 a day and 2.5 % a year of the ephemeris.

    The handbook's declination is a single sine, off by up to 1.5 degrees in autumn.
    """
    zone = f"Etc/GMT{-offset:+d}"
    times = pd.date_range("1990-01-01", "1991-01-01", freq="5min", inclusive="left", tz=zone)
    times = times + pd.Timedelta("150s")
    zenith = pvlib.solarposition.get_solarposition(times, latitude, longitude)["zenith"]
    normal = pvlib.irradiance.get_extra_radiation(times, solar_constant=4.92e6 / 3600.0)
    flat = normal.to_numpy() * np.maximum(np.cos(np.radians(zenith.to_numpy())), 0.0)
    almanac = flat.reshape(365, -1).mean(axis=1) * 0.0864
    ours = sun.extraterrestrial_daily(latitude, DAYS)
    np.testing.assert_allclose(ours, almanac, atol=0.8, rtol=0.0)
    assert abs(ours.sum() / almanac.sum() - 1.0) < 0.025
    # elevation at instants: the same degree, and the equation of time
    seconds = times.as_unit("s").asi8
    sine, distance = sun.elevation_at_instants(latitude, longitude, seconds)
    off = np.degrees(np.arcsin(sine)) - (90.0 - zenith.to_numpy())
    assert np.abs(off).max() < 1.5
    np.testing.assert_allclose(distance, normal.to_numpy() / (4.92e6 / 3600.0), rtol=0.004)


@pytest.mark.parametrize(("latitude", "longitude", "offset"), PLACES)
def test_day_length(latitude: float, longitude: float, offset: int) -> None:
    """Within 0.03 h of the geometric day of the same declination (a tenth of a degree, see above).

    The almanac's day is longer: refraction and the sun's radius lower the horizon by 0.833
    degrees, 7 to 15 minutes at these latitudes, and the declination differs by up to a degree.
    """
    ours = sun.day_length(latitude, DAYS)
    declination = pvlib.solarposition.declination_cooper69(DAYS)
    half = np.arccos(-np.tan(np.radians(latitude)) * np.tan(declination))
    np.testing.assert_allclose(ours, np.degrees(half) * 2.0 / 15.0, atol=0.03, rtol=0.0)
    days = pd.date_range("1990-01-01", periods=365, tz=f"Etc/GMT{-offset:+d}")
    almanac = pvlib.solarposition.sun_rise_set_transit_spa(days, latitude, longitude)
    hours = (almanac["sunset"] - almanac["sunrise"]).dt.total_seconds().to_numpy() / 3600.0
    assert (hours - ours).min() > 0.0
    assert (hours - ours).max() < 0.5


def test_declination_and_equation_of_time() -> None:
    """A single sine is within 1.5 degrees of the Fourier series, Sc within 1.5 minutes."""
    series = pvlib.solarposition.declination_spencer71(DAYS)
    assert np.degrees(np.abs(sun.declination(DAYS) - series)).max() < 1.5
    minutes = pvlib.solarposition.equation_of_time_spencer71(DAYS)
    assert np.abs(sun.seasonal_correction(DAYS) * 60.0 - minutes).max() < 1.5


@pytest.mark.parametrize("name", FILES)
def test_saturation_vapour_pressure(name: str) -> None:
    """Within 0.4 % above 0 degC and 1 % down to -20 degC of the real air of a year.

    Two fits to the same vapour table: the handbook's constants are tuned above freezing.
    """
    year = typical_year(name)
    t = np.concatenate((year.hourly_temperature, year.hourly_dew_point))
    t = t[t > -20.0]
    expected = mpcalc.saturation_vapor_pressure(units.Quantity(t, "degC"), phase="liquid")
    ours = humidity.saturation_vapour_pressure(t)
    error = np.abs(ours / expected.m_as("kPa") - 1.0)
    assert error[t >= 0.0].max() < 0.004
    assert error.max() < 0.01


@pytest.mark.parametrize("name", FILES)
def test_saturation_slope(name: str) -> None:
    """Within 0.6 % of MetPy's saturation pressure differentiated, above freezing."""
    t = typical_year(name).hourly_temperature
    t = t[t > 0.0]

    def at(shift: float) -> np.ndarray:
        warmed = units.Quantity(t + shift, "degC")
        return mpcalc.saturation_vapor_pressure(warmed, phase="liquid").m_as("kPa")

    numeric = (at(0.05) - at(-0.05)) / 0.1
    np.testing.assert_allclose(humidity.saturation_slope(t), numeric, rtol=0.006)


@pytest.mark.parametrize("name", FILES)
def test_dew_point(name: str) -> None:
    """Within 0.2 K of MetPy for the real humidity of a year, and back to the recorded dew point."""
    recorded = typical_year(name).hourly_dew_point
    recorded = recorded[recorded > -20.0]
    ea = humidity.saturation_vapour_pressure(recorded)
    ours = humidity.dew_point(ea)
    np.testing.assert_allclose(ours, mpcalc.dewpoint(units.Quantity(ea, "kPa")).m, atol=0.2)
    # 3-11 is printed with five digits: 0.02 K
    np.testing.assert_allclose(ours, recorded, atol=0.02)
