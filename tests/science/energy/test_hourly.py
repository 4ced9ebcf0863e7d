"""Hours of a station day: against a public record, the daily equation, and printed Greeley rows."""

import csv
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from app.science.constants import FAO56
from app.science.energy import longwave as lw
from app.science.energy.hourly import (
    HourlyWeather,
    et_by_hours,
    hourly_cloud,
    hourly_days,
    hourly_sun,
    hours_from_rows,
)
from app.science.energy.humidity import saturation_vapour_pressure
from app.science.energy.records import DailyWeather, Site
from app.science.energy.shortwave import clear_sky
from app.science.energy.station_day import station_days
from tests.science.energy.records import PAYERNE, payerne_rows

UTC = replace(PAYERNE, utc_offset_h=0.0)
GREELEY = Site(40.41, -104.78, 1462.4, -7.0, wind_height_m=3.0)
SERIES = Path(__file__).parents[2] / "published" / "examples_series.csv"


def payerne_hours() -> HourlyWeather:
    """30 days of hourly means by UTC; wind was not measured and is taken as 2 m/s."""
    v = payerne_rows().values

    def hours(name: str) -> np.ndarray:
        return v[name].reshape(30, 24, 4).mean(axis=2)

    date = np.datetime64("2016-06-01") + np.arange(30)
    moist = np.minimum(v["relative_humidity"], 100.0) / 100.0
    ea = saturation_vapour_pressure(v["air_temperature"]) * moist
    fluxes = ("shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "net_radiation")
    return replace(
        HourlyWeather.missing(date),
        temperature=hours("air_temperature"),
        vapour_pressure=ea.reshape(30, 24, 4).mean(axis=2),
        wind=np.full((30, 24), 2.0),
        **{name: hours(name) * 0.0036 for name in fluxes},
    )


def payerne_utc_days() -> DailyWeather:
    v = payerne_rows().values

    def each(name: str, how: str) -> np.ndarray:
        return getattr(v[name].reshape(30, 96), how)(axis=1)

    fluxes = ("shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "net_radiation")
    return replace(
        DailyWeather.missing(np.datetime64("2016-06-01") + np.arange(30)),
        tmax=each("air_temperature", "max"),
        tmin=each("air_temperature", "min"),
        rh_max=each("relative_humidity", "max"),
        rh_min=each("relative_humidity", "min"),
        wind=np.full(30, 2.0),
        **{name: each(name, "mean") * 0.0864 for name in fluxes},
    )


def greeley() -> tuple[HourlyWeather, dict[tuple[int, int], tuple[float, float]]]:
    """1 and 2 July 2000 from hour 16 to hour 12, and the recomputed ET by (day, hour)."""
    date = np.array(["2000-07-01", "2000-07-02"], dtype="datetime64[D]")
    arrays = {n: np.full((2, 24), np.nan) for n in ("T_degC", "ea_kPa", "Rs_MJ", "u3_ms")}
    told = {}
    with SERIES.open(encoding="utf-8", newline="") as lines:
        for row in csv.DictReader(lines):
            if row["example"] == "Greeley hourly":
                day, hour = int(row["day"]), int(row["hour_ending"])
                for name, array in arrays.items():
                    array[day - 1, hour - 1] = float(row[name])
                told[day, hour] = (float(row["ETos_mm"]), float(row["ETrs_mm"]))
    weather = replace(
        HourlyWeather.missing(date),
        temperature=arrays["T_degC"],
        vapour_pressure=arrays["ea_kPa"],
        shortwave_down=arrays["Rs_MJ"],
        wind=arrays["u3_ms"],
    )
    return weather, told


def test_greeley_afternoon_to_the_next_noon() -> None:
    """ASCE-EWRI (2005) Appendix C, Greeley, 21 hours (from memory): every hour of an independent
    scalar computation within 0.001 mm, the carried night included. Calm hours (below 0.5 m/s at
    2 m) differ by up to 0.006 mm, for the appendix's rows are without the floor of Appendix D."""
    weather, told = greeley()
    hours = hourly_days(GREELEY, weather)
    assert len(told) == 21
    calm = weather.wind * 0.92 < 0.5
    for (day, hour), (eto, etr) in told.items():
        at = day - 1, hour - 1
        within = 0.006 if calm[at] else 0.001
        assert abs(hours.eto[at] - eto) <= within, (day, hour)
        assert abs(hours.etr[at] - etr) <= within, (day, hour)
    assert hours.rung.tolist() == [0, 0]  # neither day is whole
    assert np.isnan(hours.eto_sum).all()


def test_payerne_hours_against_measured() -> None:
    """BSRN Payerne, June 2016: the model's hours high by 0.081, RMSE 0.103 MJ m-2 h-1 (figures of
    an independent scalar computation, each within 1 %)."""
    weather = payerne_hours()
    hours = hourly_days(UTC, weather)
    assert set(hours.rung) == {1}
    off = hours.rn_modelled - hours.rn
    assert off.mean() == pytest.approx(0.081, rel=0.01)
    assert np.sqrt((off**2).mean()) == pytest.approx(0.103, rel=0.01)


def test_payerne_days_against_measured() -> None:
    """BSRN Payerne, June 2016, 30 UTC days, u2 = 2 m/s, ea from RHmax and RHmin: figures of an
    independent scalar computation, each within 1 %."""
    weather = payerne_utc_days()
    measured = station_days(UTC, weather)
    elsewhere = replace(UTC, reference_surface=False)
    gone = np.full(30, np.nan)
    model = station_days(elsewhere, replace(weather, longwave_down=gone))
    assert set(measured.rung) == {1}
    assert set(model.rung) == {5}
    off = model.rn - measured.rn
    assert off.mean() == pytest.approx(1.36, rel=0.01)
    assert model.rn.sum() / measured.rn.sum() == pytest.approx(1.126, abs=0.001)
    assert np.sqrt((off**2).mean()) == pytest.approx(1.49, rel=0.01)
    assert model.eto.sum() == pytest.approx(108.5, rel=0.001)
    assert measured.eto.sum() == pytest.approx(99.8, rel=0.001)
    sky = station_days(elsewhere, weather).rn
    assert np.sqrt(((sky - measured.rn) ** 2).mean()) == pytest.approx(0.47, rel=0.01)


def test_hours_and_day_agree_within_what_is_usual() -> None:
    """Hourly sums lie within some percent of the daily equation (common practice, no source)."""
    hours, days = hourly_days(UTC, payerne_hours()), station_days(UTC, payerne_utc_days())
    assert 0.90 < hours.eto_sum.sum() / days.eto.sum() < 1.05
    assert np.corrcoef(hours.eto_sum, days.eto)[0, 1] > 0.98


def test_rungs_of_hours() -> None:
    weather = payerne_hours()
    elsewhere = replace(UTC, reference_surface=False)
    assert set(hourly_days(elsewhere, weather).rung) == {2}
    gone = np.full((30, 24), np.nan)
    assert set(hourly_days(UTC, replace(weather, longwave_down=gone)).rung) == {3}
    one = weather.longwave_down.copy()
    one[3, 11] = np.nan  # one hour of one day takes that whole day down the ladder
    rung = hourly_days(elsewhere, replace(weather, longwave_down=one)).rung
    assert rung.tolist() == [5 if d == 3 else 2 for d in range(30)]
    cold = replace(weather, temperature=np.where(np.arange(24) == 5, np.nan, weather.temperature))
    assert set(hourly_days(UTC, cold).rung) == {0}


def test_fao_constants_know_the_short_surface_only() -> None:
    """FAO-56 hourly (Cd 0.34 day and night) lies a few percent below ASCE-EWRI by day."""
    weather = payerne_hours()
    asce, fao = hourly_days(UTC, weather), hourly_days(UTC, weather, FAO56)
    assert np.isnan(fao.etr).all()
    assert 0.9 < fao.eto_sum.sum() / asce.eto_sum.sum() < 1.0


def test_low_sun_takes_the_last_cloudiness() -> None:
    """ASCE-EWRI: below 0.3 rad fcd is the last one computed above it; the day before changes the
    night, the day after changes nothing."""
    weather = payerne_hours()
    ra, sine = hourly_sun(UTC, weather.date)
    rso = clear_sky(ra, UTC.elevation_m)
    cloud = hourly_cloud(weather.date, weather.shortwave_down, rso, sine)
    own = lw.cloudiness(lw.clear_sky_ratio(weather.shortwave_down, rso))
    low = sine < np.sin(0.3)
    np.testing.assert_array_equal(cloud[~low], own[~low])
    flat, dark = cloud.reshape(-1), low.reshape(-1)
    for i in np.flatnonzero(dark[24:]) + 24:
        assert flat[i] == flat[i - 1]
    again = hourly_cloud(weather.date[:9], weather.shortwave_down[:9], rso[:9], sine[:9])
    np.testing.assert_array_equal(cloud[:9], again)


def test_cloudiness_is_not_carried_over_a_gap() -> None:
    weather = payerne_hours()
    ra, sine = hourly_sun(UTC, weather.date)
    rso = clear_sky(ra, UTC.elevation_m)
    rs = weather.shortwave_down.copy()
    rs[1:4] = np.nan
    cloud = hourly_cloud(weather.date, rs, rso, sine)
    of_day = lw.cloudiness(rs[4].sum() / rso[4].sum())
    np.testing.assert_allclose(cloud[4, :3], of_day)
    assert np.isnan(cloud[2, 12:]).all()


def test_incomplete_day_takes_the_ratio_of_the_days_before() -> None:
    hours, days = hourly_days(UTC, payerne_hours()), station_days(UTC, payerne_utc_days())
    eto = hours.eto_sum.copy()
    eto[[2, 20]] = np.nan
    served = et_by_hours(hours.date, eto, hours.etr_sum, days.eto, days.etr)
    ratio = np.median(np.delete(eto / days.eto, [2, 20])[:19])
    assert served.eto[20] == pytest.approx(days.eto[20] * ratio)
    assert served.flags[20] == f"hourly_incomplete={ratio:.3g}"
    assert served.eto[2] == days.eto[2]  # two days before it are too few for a ratio
    assert served.flags[2] == "hourly_without_ratio=1"
    assert (served.flags[served.by_hours] == "").all()
    np.testing.assert_array_equal(served.etr, hours.etr_sum)
    first = slice(0, 21)
    early = et_by_hours(
        hours.date[first], eto[first], hours.etr_sum[first], days.eto[first], days.etr[first]
    )
    np.testing.assert_array_equal(early.eto, served.eto[first])


def test_high_latitude_winter_has_cloudiness() -> None:
    site = Site(64.0, 25.0, 100.0, 2.0)
    date = np.datetime64("2024-12-10") + np.arange(5)
    ra, sine = hourly_sun(site, date)
    rso = clear_sky(ra, 100.0)
    cloud = hourly_cloud(date, 0.5 * rso, rso, sine)
    np.testing.assert_allclose(cloud, 1.35 * 0.5 - 0.35)


def test_hours_of_rows() -> None:
    """Quarter hours of the record make the hours the tests above use."""
    v = payerne_rows().values
    expected = payerne_hours()
    grid = {name: values.reshape(30, 96).copy() for name, values in v.items()}
    moist = np.minimum(grid["relative_humidity"], 100.0) / 100.0
    grid["vapour_pressure"] = saturation_vapour_pressure(grid["air_temperature"]) * moist
    grid["shortwave_down"][2, 40] = np.nan
    hours = hours_from_rows(expected.date, grid)
    gap = np.zeros((30, 24), dtype=bool)
    gap[2, 10] = True
    np.testing.assert_array_equal(np.isnan(hours.shortwave_down), gap)
    for name in ("temperature", "vapour_pressure", "longwave_down", "net_radiation"):
        np.testing.assert_allclose(getattr(hours, name), getattr(expected, name), rtol=1e-12)
    assert np.isnan(hours.wind).all()  # it was not measured
    with pytest.raises(ValueError, match="air_temperature has 8 rows a day"):
        hours_from_rows(expected.date, {"air_temperature": np.zeros((30, 8))})


def test_shape_is_refused_by_name() -> None:
    with pytest.raises(ValueError, match="wind has shape"):
        replace(payerne_hours(), wind=np.zeros(30))


def test_no_days() -> None:
    hours = hourly_days(UTC, HourlyWeather.missing(np.array([], dtype="datetime64[D]")))
    assert hours.eto.shape == (0, 24)
    assert hours.rung.shape == (0,)
