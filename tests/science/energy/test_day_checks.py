"""Checks of whole days: silent on real days, each fault named, set aside and told with its figure.

Methods: ASCE-EWRI Appendix D, FAO-56 Annex 5, BSRN tests V2.0; the planted faults are ours
(regression).
"""

from dataclasses import replace

import numpy as np
import pytest

from app.science.energy.day_checks import CHECKS, check_days, tokens
from app.science.energy.longwave import black_body_daily
from app.science.energy.records import DailyWeather, Site
from app.science.energy.shortwave import clear_sky
from app.science.energy.sun import day_of_year, extraterrestrial_daily
from tests.published.typical_year import FILES, typical_year
from tests.science.energy.records import ALAMOSA, PAYERNE, daily, payerne_days, surfrad_rows

SURFRAD_WARNING = "ignore:The inplace keyword in DataFrame.rename is deprecated"


def checked(site: Site, weather: DailyWeather) -> tuple[DailyWeather, list[str]]:
    ra = extraterrestrial_daily(site.latitude_deg, day_of_year(weather.date))
    told = check_days(site, weather, ra, clear_sky(ra, site.elevation_m))
    return told.weather, tokens(told.findings, weather.date.size)


def ordinary(days: int = 12) -> DailyWeather:
    """Plain summer days at Payerne with every variable, none of it doubtful."""
    date = np.datetime64("2021-06-01") + np.arange(days)
    wave = np.sin(np.arange(days))
    black = black_body_daily(np.full(days, 25.0), np.full(days, 12.0))
    return replace(
        DailyWeather.missing(date),
        tmax=25.0 + wave,
        tmin=12.0 + wave,
        tmean=18.2 + wave,
        rh_max=92.0 + wave,
        rh_min=48.0 + wave,
        rh_mean=70.0 + wave,
        vapour_pressure=1.4 + 0.05 * wave,
        dew_point=12.0 + 0.5 * wave,
        wind=2.0 + 0.3 * wave,
        shortwave_down=22.0 + 3.0 * wave,
        shortwave_up=0.22 * (22.0 + 3.0 * wave),
        longwave_down=black - 60.0 * 0.0864,
        longwave_up=black + 6.0 * 0.0864,
        net_radiation=0.78 * (22.0 + 3.0 * wave) - 66.0 * 0.0864,
        sunshine=9.0 + wave,
        pressure=95.5 + 0.2 * wave,
        rain=np.zeros(days),
    )


def test_ordinary_days_raise_nothing() -> None:
    weather = ordinary()
    after, flags = checked(PAYERNE, weather)
    assert set(flags) == {""}
    np.testing.assert_array_equal(after.longwave_down, weather.longwave_down)


def test_real_month_loses_nothing() -> None:
    """BSRN Payerne, June 2016: 29 whole days, no hard check bites."""
    weather = payerne_days()
    after, _ = checked(PAYERNE, weather)
    for name in ("shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "tmax"):
        np.testing.assert_array_equal(getattr(after, name), getattr(weather, name))


@pytest.mark.filterwarnings(SURFRAD_WARNING)
def test_clear_winter_day_at_altitude_loses_nothing() -> None:
    """SURFRAD, 1 January 2016: clear, dry, 2317 m; the envelope must not cut it off."""
    record = surfrad_rows()
    weather = daily(record, 0.0, 1440)
    after, flags = checked(replace(ALAMOSA, utc_offset_h=0.0), weather)
    assert after.shortwave_down == weather.shortwave_down
    assert after.longwave_down == weather.longwave_down
    assert "covered" not in flags[0]


@pytest.mark.parametrize("name", FILES)
def test_typical_years_lose_no_day_of_sun(name: str) -> None:
    """Two years of NREL TMY3 solar radiation: at most 1 day in 365 above the envelope."""
    year = typical_year(name)
    site = Site(year.latitude, year.longitude, year.elevation, round(year.longitude / 15.0))
    date = np.datetime64("1990-01-01") + np.arange(365)
    weather = replace(
        DailyWeather.missing(date),
        tmax=year.tmax,
        tmin=year.tmin,
        wind=year.wind_10m,
        shortwave_down=year.shortwave,
    )
    after, _ = checked(site, weather)
    assert np.isnan(after.shortwave_down).sum() <= 1
    assert not np.isnan(after.tmax).any()


# (fields changed on day 4, check that must fail, fields it must set aside)
FAULTS = [
    ({"tmax": 5.0}, "temperature_inverted", {"tmax", "tmin"}),
    ({"tmax": 13.0, "tmin": 13.0}, "temperature_flat", {"tmax", "tmin"}),
    ({"tmean": 31.0}, "temperature_mean_outside", {"tmean"}),
    ({"rh_max": 107.0}, "humidity_above_saturation", {"rh_max"}),
    ({"rh_min": -1.0}, "humidity_negative", {"rh_min"}),
    ({"rh_max": 30.0}, "humidity_inverted", {"rh_max", "rh_min"}),
    ({"dew_point": 30.0}, "dew_point_above_air", {"dew_point"}),
    ({"vapour_pressure": 4.0}, "vapour_above_saturation", {"vapour_pressure"}),
    ({"wind": 0.0}, "wind_stuck", {"wind"}),
    ({"wind": -1.0}, "wind_negative", {"wind"}),
    ({"rain": -0.2}, "rain_negative", {"rain"}),
    (
        {"shortwave_down": 39.0, "shortwave_up": 8.0},
        "shortwave_above_clear_sky",
        {"shortwave_down"},
    ),
    ({"shortwave_down": 0.3, "shortwave_up": 0.06}, "shortwave_too_dark", {"shortwave_down"}),
    (
        {"shortwave_down": 6.0, "shortwave_up": 15.0},
        "upward_above_downward",
        {"shortwave_down", "shortwave_up"},
    ),
    ({"shortwave_up": 14.0}, "albedo_not_grass", {"shortwave_up"}),
    ({"longwave_down": 2.0}, "longwave_down_impossible", {"longwave_down"}),
    ({"longwave_up": 80.0}, "longwave_up_impossible", {"longwave_up"}),
    ({"longwave_down": 38.5}, "longwave_down_against_air", {"longwave_down"}),
    ({"longwave_up": 50.0}, "longwave_up_against_air", {"longwave_up"}),
    ({"net_radiation": 26.0}, "net_impossible", {"net_radiation"}),
    ({"sunshine": 18.0}, "sunshine_too_long", {"sunshine"}),
]


@pytest.mark.parametrize(("change", "check", "aside"), FAULTS, ids=[f[1] for f in FAULTS])
def test_fault_is_set_aside(change: dict[str, float], check: str, aside: set[str]) -> None:
    clean = ordinary()
    where = np.arange(clean.date.size) == 4
    bad = replace(clean, **{n: np.where(where, v, getattr(clean, n)) for n, v in change.items()})
    after, flags = checked(PAYERNE, bad)
    assert f"{check}=" in flags[4]
    lost = {
        name
        for name in vars(clean)
        if name != "date"
        and np.isnan(getattr(after, name)[4])
        and not np.isnan(getattr(clean, name)[4])
    }
    assert lost == aside
    for name in aside:  # the other days keep theirs
        np.testing.assert_array_equal(getattr(after, name)[~where], getattr(clean, name)[~where])


@pytest.mark.parametrize(
    ("change", "check"),
    [
        ({"tmean": 22.0}, "temperature_mean_far"),
        ({"tmax": 45.0, "tmin": 30.0, "tmean": 37.0}, "temperature_step"),
        ({"rh_min": 3.0}, "humidity_very_dry"),
        ({"wind": 0.3}, "wind_low"),
        ({"shortwave_down": 34.5, "shortwave_up": 7.0}, "shortwave_above_clear_sky"),
        ({"net_radiation": 8.0}, "net_against_components"),
        ({"pressure": 101.3}, "pressure_against_elevation"),
    ],
)
def test_doubt_warns_and_keeps(change: dict[str, float], check: str) -> None:
    clean = ordinary()
    where = np.arange(clean.date.size) == 4
    odd = replace(clean, **{n: np.where(where, v, getattr(clean, n)) for n, v in change.items()})
    after, flags = checked(PAYERNE, odd)
    assert f"{check}=" in flags[4]
    for name in change:
        np.testing.assert_array_equal(getattr(after, name), getattr(odd, name))


def test_flag_carries_its_figure() -> None:
    weather = replace(ordinary(1), shortwave_down=np.array([39.0]))
    _, flags = checked(PAYERNE, weather)
    figure = float(flags[0].split("shortwave_above_clear_sky=")[1].split()[0])
    assert 1.15 < figure < 1.35


def test_covered_window_under_an_open_sky() -> None:
    """Frost on the longwave window reads like a black body while the sun shines all day."""
    clean = payerne_days()
    black = black_body_daily(clean.tmax, clean.tmin)
    frosted = replace(clean, longwave_down=black - 4.0 * 0.0864)
    after, flags = checked(PAYERNE, frosted)
    ra = extraterrestrial_daily(PAYERNE.latitude_deg, day_of_year(clean.date))
    sunny = clean.shortwave_down / clear_sky(ra, PAYERNE.elevation_m) > 0.7
    assert sunny.sum() == 12
    np.testing.assert_array_equal(np.isnan(after.longwave_down), sunny)
    assert all(("window_covered=" in text) == s for text, s in zip(flags, sunny, strict=True))


def test_same_wind_for_days_is_stuck() -> None:
    clean = ordinary()
    stuck = (np.arange(12) >= 3) & (np.arange(12) < 8)
    after, _ = checked(PAYERNE, replace(clean, wind=np.where(stuck, 1.7, clean.wind)))
    np.testing.assert_array_equal(np.isnan(after.wind), stuck)
    four = (np.arange(12) >= 3) & (np.arange(12) < 7)
    after, _ = checked(PAYERNE, replace(clean, wind=np.where(four, 1.7, clean.wind)))
    assert not np.isnan(after.wind).any()


def test_snow_under_the_radiometer_only_matters_on_a_reference_site() -> None:
    snowy = replace(ordinary(1), shortwave_up=np.array([15.0]))
    assert np.isnan(checked(PAYERNE, snowy)[0].shortwave_up[0])
    elsewhere = replace(PAYERNE, reference_surface=False)
    assert checked(elsewhere, snowy)[0].shortwave_up[0] == 15.0


def test_step_needs_consecutive_days() -> None:
    weather = ordinary(2)
    jump = replace(weather, tmax=np.array([25.0, 45.0]), tmin=np.array([12.0, 30.0]))
    assert "temperature_step" in checked(PAYERNE, jump)[1][1]
    apart = replace(jump, date=np.array(["2021-06-01", "2021-06-20"], "datetime64[D]"))
    assert "temperature_step" not in checked(PAYERNE, apart)[1][1]


def test_missing_and_empty_days_raise_nothing() -> None:
    date = np.datetime64("2021-06-01") + np.arange(3)
    assert checked(PAYERNE, DailyWeather.missing(date))[1] == ["", "", ""]
    assert checked(PAYERNE, DailyWeather.missing(date[:0]))[1] == []


def test_every_check_has_plain_words() -> None:
    """Each check that can appear above is explained, and none is explained that cannot."""
    planted = {fault[1] for fault in FAULTS} | {
        *("temperature_mean_far", "temperature_step", "humidity_very_dry", "wind_low"),
        *("net_against_components", "pressure_against_elevation", "window_covered"),
        *("shortwave_up_negative", "longwave_pair_apart"),
    }
    assert planted == set(CHECKS)
