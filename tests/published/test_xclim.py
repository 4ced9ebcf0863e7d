"""Daily reference ET against xclim's FAO_PM98 on two years of real weather.

xclim 0.62, an independent implementation of FAO-56 eq 6 for climate data. It fixes the air pressure
at 101.325 kPa, takes no soil heat flux, and takes the slope from the mean of e0 at both extremes
where eq 13 takes it at the mean temperature; pressure and net radiation are handed over alike.
"""

import importlib.util

import numpy as np
import pandas as pd
import pytest

from app.science.constants import FAO56
from app.science.energy import humidity, longwave, shortwave, sun, wind
from app.science.energy.reference_et import reference_et_daily
from tests.published.typical_year import FILES, TypicalYear, typical_year

pytestmark = [
    pytest.mark.skipif(
        importlib.util.find_spec("xclim") is None,
        reason="xclim is not installed: pip install '.[test,climate]' to compare reference ET",
    ),
    # xclim 0.62 under pandas 3; nothing of ours
    pytest.mark.filterwarnings("ignore:The 'name' property is deprecated"),
]

SEA_LEVEL = 101.325  # kPa, fixed inside xclim


def both(year: TypicalYear, tmax: np.ndarray, tmin: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Our ETo and xclim's from the same temperatures, humidity, wind and net radiation [mm]."""
    import xarray as xr
    from xclim.indices import potential_evapotranspiration

    ea = humidity.vapour_pressure_rh_mean(tmax, tmin, year.rh_mean)
    ra = sun.extraterrestrial_daily(year.latitude, np.arange(1, 366))
    ratio = longwave.clear_sky_ratio(year.shortwave, shortwave.clear_sky(ra, year.elevation))
    rn = shortwave.net_shortwave(year.shortwave) - longwave.net_longwave_daily(
        tmax, tmin, ea, ratio, FAO56
    )
    u2 = wind.wind_at_2m(year.wind_10m, 10.0)
    ours = reference_et_daily(tmax, tmin, ea, rn, u2, SEA_LEVEL, constants=FAO56)

    time = pd.date_range("1990-01-01", periods=365)

    def series(values: np.ndarray, unit: str) -> xr.DataArray:
        return xr.DataArray(values, dims="time", coords={"time": time}, attrs={"units": unit})

    none = series(np.zeros(365), "W m-2")
    flux = potential_evapotranspiration(
        tasmin=series(tmin, "degC"),
        tasmax=series(tmax, "degC"),
        tas=series((tmax + tmin) / 2.0, "degC"),
        lat=xr.DataArray(year.latitude, attrs={"units": "degrees_north"}),
        hurs=series(year.rh_mean, "%"),
        rsds=series(rn / 0.0864, "W m-2"),  # net radiation in one piece
        rsus=none,
        rlds=none,
        rlus=none,
        sfcWind=series(year.wind_10m, "m s-1"),
        method="FAO_PM98",
    )
    return ours, flux.to_numpy() * 86400.0


@pytest.mark.parametrize("name", FILES)
def test_same_day_temperature(name: str) -> None:
    """With both extremes at their mean the slopes agree: 0.003 mm (fits of e0 differ by 0.1 %)."""
    year = typical_year(name)
    middle = (year.tmax + year.tmin) / 2.0
    ours, theirs = both(year, middle, middle)
    np.testing.assert_allclose(ours, theirs, atol=0.003, rtol=0.0)


@pytest.mark.parametrize("name", FILES)
def test_real_days(name: str) -> None:
    """As recorded: 0.15 mm a day and 0.6 % a year, the slope of the mean against the mean slope."""
    year = typical_year(name)
    ours, theirs = both(year, year.tmax, year.tmin)
    assert ours.sum() > 400.0
    np.testing.assert_allclose(ours, theirs, atol=0.15, rtol=0.0)
    assert abs(theirs.sum() / ours.sum() - 1.0) < 0.006
