"""Station days from rows: the completeness rules of the Methods page, one by one.

The expected figures are plain arithmetic on the rows (sums and means done here another way); the
shares 90 %, 95 %, 80 % and 2 h are working values of the Methods page.
"""

import dataclasses
import datetime as dt

import numpy as np
import pytest

from app.intake import Rows, aggregate, fold
from app.science.energy.humidity import saturation_vapour_pressure
from app.science.energy.station_day import DailyWeather, Site

SITE = Site(46.8, 6.9, 490.0, 1.0)
DAY = np.datetime64("2025-06-10")
DAYS = np.array([DAY])
STUCK_IS_SEEN = ("wind_speed", "longwave_down")  # a constant day would be set aside as stuck


def rows_of(step: int = 900, days: int = 3, **values: object) -> Rows:
    """Rows of `days` days around DAY; each value a number or an array of one value a row."""
    n = days * 86400 // step
    start = (DAY - days // 2).astype("datetime64[s]").astype(np.int64) - 3600
    instant = start + step * np.arange(1, n + 1)
    columns = {
        name: np.broadcast_to(np.asarray(value, float), (n,)).copy()
        for name, value in values.items()
    }
    for name, value in values.items():
        if np.ndim(value) == 0 and name in STUCK_IS_SEEN:
            columns[name] += np.where(np.arange(n) % 2 == 0, 0.1, -0.1)
    return Rows(instant, np.arange(n, dtype=np.int32), np.full(n, step, np.int32), columns)


def slots(first: float, last: float, step: int = 900, days: int = 3) -> slice:
    """Rows of DAY whose intervals lie between two hours of the day."""
    start = days // 2 * 86400
    return slice(int((start + first * 3600) // step), int((start + last * 3600) // step))


def day_of(rows: Rows, site: Site = SITE) -> tuple[DailyWeather, list[tuple[str, str, float, str]]]:
    weather, notes = aggregate(rows, site, DAYS)
    assert all(note.day == dt.date(2025, 6, 10) for note in notes)
    return weather, [(note.what, note.quantity, note.figure, note.reason) for note in notes]


def clock(step: int = 900, days: int = 3) -> np.ndarray:
    """Hour of the day at mid-interval."""
    return (np.arange(days * 86400 // step) + 0.5) * step / 3600 % 24


def sun(step: int = 900) -> np.ndarray:
    """A clear June day [W m-2], zero at night."""
    return np.maximum(0.0, 850 * np.cos((clock(step) - 12.6) / 15.5 * np.pi)) * (
        np.abs(clock(step) - 12.6) < 7.7
    )


def air(step: int = 900) -> np.ndarray:
    return 15 + 7 * np.cos((clock(step) - 15) / 12 * np.pi)


@pytest.mark.parametrize("step", [300, 600, 900, 1800, 3600])
def test_a_whole_day(step: int) -> None:
    temperature = air(step)
    rows = rows_of(
        step,
        air_temperature=temperature,
        relative_humidity=60,
        wind_speed=2.5,
        shortwave_down=sun(step),
        longwave_down=320,
        rain=0.1,
        pressure=95.8,
    )
    weather, notes = day_of(rows)
    day = slots(0, 24, step)
    assert notes == []
    assert weather.tmax[0] == temperature[day].max()
    assert weather.tmin[0] == temperature[day].min()
    assert weather.tmean[0] == pytest.approx(temperature[day].mean())
    pressures = [0.6 * float(saturation_vapour_pressure(t)) for t in temperature[day]]
    assert weather.vapour_pressure[0] == pytest.approx(sum(pressures) / len(pressures))
    assert weather.rh_mean[0] == weather.rh_max[0] == weather.rh_min[0] == 60
    assert weather.wind[0] == pytest.approx(2.5)
    assert weather.shortwave_down[0] == pytest.approx(sun(step)[day].sum() * step / 1e6)
    assert weather.longwave_down[0] == pytest.approx(320 * 0.0864)
    assert weather.rain[0] == pytest.approx(0.1 * 86400 / step)
    assert weather.pressure[0] == pytest.approx(95.8)
    assert np.isnan([weather.net_radiation[0], weather.sunshine[0], weather.dew_point[0]]).all()


def test_the_mean_vapour_pressure_is_not_that_of_the_means() -> None:
    """A mean of vapour pressures: with warm dry and cool damp halves the two differ."""
    warm = np.where(clock() < 12, 10.0, 30.0)
    damp = np.where(clock() < 12, 90.0, 30.0)
    weather, _ = day_of(rows_of(air_temperature=warm, relative_humidity=damp))
    expected = (0.9 * saturation_vapour_pressure(10.0) + 0.3 * saturation_vapour_pressure(30.0)) / 2
    assert weather.vapour_pressure[0] == pytest.approx(float(expected))


def test_a_short_gap_is_bridged_in_a_straight_line_and_counted() -> None:
    rows = rows_of(air_temperature=np.arange(288.0) / 10)
    rows.values["air_temperature"][slots(10, 12)] = np.nan
    weather, notes = day_of(rows)
    assert weather.tmean[0] == pytest.approx(np.arange(96, 192).mean() / 10)
    assert notes == [("filled", "air_temperature", 8.0, "interpolated over at most 2 h")]


def test_a_gap_over_midnight_is_bridged_from_the_neighbouring_days() -> None:
    rows = rows_of(air_temperature=np.arange(288.0) / 10)
    rows.values["air_temperature"][slots(-0.75, 0.75)] = np.nan
    weather, notes = day_of(rows)
    assert weather.tmean[0] == pytest.approx(np.arange(96, 192).mean() / 10)
    assert weather.tmin[0] == pytest.approx(9.9)  # the lowest that was read, not interpolated
    assert [note[2] for note in notes] == [3.0]


def test_a_longer_gap_is_not_bridged() -> None:
    rows = rows_of(wind_speed=2.0)
    rows.values["wind_speed"][slots(10, 12.25)] = np.nan
    weather, notes = day_of(rows)
    assert weather.wind[0] == pytest.approx(2.0, abs=0.01)  # 9 of 96 missing: 90.6 % are there
    assert notes == []
    rows.values["wind_speed"][slots(10, 12.5)] = np.nan  # 10 of 96 missing: 89.6 %
    weather, notes = day_of(rows)
    assert np.isnan(weather.wind[0])
    assert notes == [("missing", "wind", 0.0, "only 89.6 % of the intervals, 90 % needed")]


def test_a_day_that_would_rest_on_interpolation_is_missing() -> None:
    every_other = np.where(np.arange(288) % 2 == 0, 2.0 + np.arange(288) % 3, np.nan)
    weather, notes = day_of(rows_of(wind_speed=every_other))
    assert np.isnan(weather.wind[0])
    assert ("missing", "wind", 0.0, "50 % would rest on interpolation") in notes


def test_extremes_need_each_quarter_of_the_day() -> None:
    """Four-hourly rows: six a day, one quarter empty leaves too little in any case."""
    rows = rows_of(air_temperature=air())
    rows.values["air_temperature"][slots(12, 18)] = np.nan
    weather, notes = day_of(rows)
    assert np.isnan(weather.tmax[0])
    assert {note[1] for note in notes if note[0] == "missing"} == {"tmax", "tmin", "tmean"}


def test_shortwave_needs_the_daylight_only() -> None:
    light = sun()
    rows = rows_of(shortwave_down=light)
    rows.values["shortwave_down"][slots(0, 3)] = np.nan
    rows.values["shortwave_down"][slots(22.5, 24)] = np.nan
    weather, notes = day_of(rows)
    assert weather.shortwave_down[0] == pytest.approx(light[slots(0, 24)].sum() * 900 / 1e6)
    assert [note for note in notes if note[0] == "missing"] == []
    rows.values["shortwave_down"][slots(11, 13.5)] = np.nan
    weather, notes = day_of(rows)
    assert np.isnan(weather.shortwave_down[0])
    assert any("of the daylight" in note[3] for note in notes)


def test_longwave_needs_most_of_the_night() -> None:
    """The sun is down about 8 h in June at 47 N; 2.25 h of it missing is more than a fifth."""
    rows = rows_of(longwave_down=310.0, net_radiation=100.0)
    rows.values["longwave_down"][slots(0.5, 2.75)] = np.nan
    weather, notes = day_of(rows)
    assert np.isnan(weather.longwave_down[0])
    assert weather.net_radiation[0] == pytest.approx(8.64)
    assert any("of the night" in note[3] for note in notes)
    rows = rows_of(longwave_down=310.0)
    rows.values["longwave_down"][slots(11, 13.25)] = np.nan
    weather, _ = day_of(rows)
    assert weather.longwave_down[0] == pytest.approx(310 * 0.0864, abs=0.01)


def test_night_offset_is_counted_and_zero_in_the_sum() -> None:
    light = sun()
    night = np.where(light == 0, -4.0, light)
    weather, notes = day_of(rows_of(shortwave_down=night))
    assert weather.shortwave_down[0] == pytest.approx(light[slots(0, 24)].sum() * 900 / 1e6)
    (what, quantity, figure, _) = notes[0]
    assert (what, quantity) == ("offset", "shortwave_down")
    assert 28 <= figure <= 36  # intervals of a June night
    small, notes = day_of(rows_of(shortwave_down=np.where(light == 0, -1.5, light)))
    assert small.shortwave_down[0] == weather.shortwave_down[0]
    assert notes == []


def test_a_value_that_fails_a_hard_check_is_set_aside_under_its_name() -> None:
    light = sun()
    light[slots(1, 1.5)] = 500.0  # sun at night: BSRN, physically possible limit
    weather, notes = day_of(rows_of(shortwave_down=light))
    assert ("set_aside", "shortwave_down", 2.0, "possible") in notes
    assert weather.shortwave_down[0] == pytest.approx(sun()[slots(0, 24)].sum() * 900 / 1e6)


def test_a_stuck_sensor_is_named_as_the_reason() -> None:
    weather, notes = day_of(rows_of(wind_speed=np.full(288, 2.0)))
    assert np.isnan(weather.wind[0])
    assert ("missing", "wind", 0.0, "no readings; 96 set aside (stuck)") in notes
    assert ("set_aside", "wind_speed", 96.0, "stuck") in notes


def test_humidity_above_100_is_clipped_and_above_105_set_aside() -> None:
    humid = np.full(288, 95.0)
    humid[slots(2, 4)] = 103.0
    humid[slots(4, 5)] = 108.0
    weather, notes = day_of(rows_of(air_temperature=air(), relative_humidity=humid))
    assert weather.rh_max[0] == 100.0
    assert ("clipped", "relative_humidity", 8.0, "above 100 %") in notes
    assert ("set_aside", "relative_humidity", 4.0, "above_saturation") in notes
    assert ("filled", "relative_humidity", 4.0, "interpolated over at most 2 h") in notes


def test_rain_needs_nine_tenths_and_nothing_is_made_up() -> None:
    rows = rows_of(rain=0.2)
    rows.values["rain"][slots(10, 12.25)] = np.nan
    weather, _ = day_of(rows)
    assert weather.rain[0] == pytest.approx(0.2 * 87)
    rows.values["rain"][slots(10, 12.75)] = np.nan
    weather, notes = day_of(rows)
    assert np.isnan(weather.rain[0])
    assert notes[0][:2] == ("missing", "rain")


def test_other_ways_to_the_vapour_pressure() -> None:
    from_dew_point, _ = day_of(rows_of(dew_point=8.0))
    assert from_dew_point.vapour_pressure[0] == pytest.approx(
        float(saturation_vapour_pressure(8.0))
    )
    assert from_dew_point.dew_point[0] == pytest.approx(8.0)
    temperature = 20 + np.arange(288) % 3
    from_deficit, _ = day_of(rows_of(air_temperature=temperature, vapour_pressure_deficit=1.0))
    expected = np.mean([float(saturation_vapour_pressure(t)) - 1.0 for t in (20, 21, 22)])
    assert from_deficit.vapour_pressure[0] == pytest.approx(expected)
    as_read, _ = day_of(rows_of(vapour_pressure=1.234, dew_point=8.0))
    assert as_read.vapour_pressure[0] == pytest.approx(1.234)


def test_daily_rows_pass_straight_through() -> None:
    rows = rows_of(
        86400, air_temperature_max=[20, 25, 21], air_temperature_min=[8, 12, 9],
        shortwave_down=[200, 250, 210], rain=[0, 12.4, 0], wind_speed=2.0,
        relative_humidity_max=[99, 104, 98],
    )  # fmt: skip
    weather, notes = day_of(rows)
    assert (weather.tmax[0], weather.tmin[0], weather.rain[0]) == (25, 12, 12.4)
    assert weather.shortwave_down[0] == pytest.approx(250 * 0.0864)
    assert weather.rh_max[0] == 100.0
    assert np.isnan(weather.tmean[0])
    assert notes == []


def test_a_daily_row_serves_where_the_finer_rows_do_not_suffice() -> None:
    fine = rows_of(air_temperature=air(), rain=0.0)
    fine.values["air_temperature"][slots(3, 15)] = np.nan
    daily = rows_of(86400, air_temperature_max=[1, 30, 1], rain=[5, 5, 5])
    weather, notes = day_of(fold([fine, daily]))
    assert weather.tmax[0] == 30  # only the daily row has it
    assert weather.rain[0] == 0.0  # the finer rows are complete
    assert np.isnan(weather.tmin[0])
    assert {note[1] for note in notes if note[0] == "missing"} == {"tmin", "tmean"}


def test_a_step_changed_at_noon_leaves_that_day_missing_and_the_next_whole() -> None:
    hourly, fine = rows_of(3600, wind_speed=2.0), rows_of(900, wind_speed=3.0)
    noon = slots(0, 12, 3600).stop
    early = Rows(*(a[:noon] for a in (hourly.instant, hourly.line, hourly.interval_s)),
                 {"wind_speed": hourly.values["wind_speed"][:noon]})  # fmt: skip
    at = slots(0, 12).stop
    late = Rows(*(a[at:] for a in (fine.instant, fine.line, fine.interval_s)),
                {"wind_speed": fine.values["wind_speed"][at:]})  # fmt: skip
    days = np.arange(DAY - 1, DAY + 2)
    weather, _ = aggregate(fold([early, late]), SITE, days)
    np.testing.assert_allclose(weather.wind, [2.0, np.nan, 3.0])


def test_jittered_clocks_and_odd_minutes_keep_their_day() -> None:
    rng = np.random.default_rng(5)
    rows = rows_of(wind_speed=2.0)
    shaken = dataclasses.replace(rows, instant=rows.instant + rng.integers(-40, 40, len(rows)))
    assert day_of(shaken)[0].wind[0] == pytest.approx(2.0)
    late = dataclasses.replace(rows, instant=rows.instant + 420)
    assert day_of(late)[0].wind[0] == pytest.approx(2.0)


def test_days_far_apart_are_no_neighbours() -> None:
    rows = rows_of(wind_speed=np.arange(288.0) % 7 + 1)
    days = np.array([DAY - 400, DAY, DAY + 400])
    weather, notes = aggregate(rows, SITE, days)
    assert np.isnan(weather.wind[[0, 2]]).all()
    assert weather.wind[1] == pytest.approx((np.arange(96, 192) % 7 + 1).mean())
    assert {note.reason for note in notes} == {"no readings"}


def test_no_rows_and_no_days() -> None:
    empty, notes = aggregate(Rows.none(), SITE, DAYS)
    assert np.isnan(empty.tmax[0])
    assert notes == []
    none, _ = aggregate(rows_of(rain=0.0), SITE, np.zeros(0, "datetime64[D]"))
    assert none.date.size == 0


def test_the_order_of_days_is_kept() -> None:
    rows = rows_of(rain=np.repeat([0.1, 0.2, 0.3], 96))
    weather, _ = aggregate(rows, SITE, np.array([DAY + 1, DAY - 1, DAY]))
    np.testing.assert_allclose(weather.rain, [28.8, 9.6, 19.2])


def test_heat_fluxes_of_a_crop_are_energies_of_the_day() -> None:
    """40 W/m2 through a day are 3.456 MJ/m2; with a fifth of the night missing there is none."""
    rows = rows_of(soil_heat_flux=40.0, sensible_heat=-25.0, latent_heat=100.0)
    weather, _ = day_of(rows)
    assert weather.soil_heat_flux[0] == pytest.approx(3.456)
    assert weather.sensible_heat[0] == pytest.approx(-2.16)
    assert weather.latent_heat[0] == pytest.approx(8.64)
    rows.values["soil_heat_flux"][slots(0, 5)] = np.nan
    weather, notes = day_of(rows)
    assert np.isnan(weather.soil_heat_flux[0])
    assert any(what == "missing" and name == "soil_heat_flux" for what, name, _, _ in notes)


def test_vapour_pressure_from_the_wet_bulb() -> None:
    """FAO-56 Example 4: 25.6 degC dry, 19.5 degC wet, at 1200 m (87.9 kPa): ea 1.91 kPa."""
    site = Site(46.8, 6.9, 1200.0, 1.0)
    air = 25.6 + np.where(np.arange(288) % 2 == 0, 0.05, -0.05)  # a constant day would be stuck
    weather, _ = day_of(rows_of(air_temperature=air, wet_bulb=19.5), site)
    assert weather.vapour_pressure[0] == pytest.approx(1.91, abs=0.005)
    # where pressure is measured it is used
    rows = rows_of(air_temperature=air, wet_bulb=19.5, pressure=87.9)
    assert day_of(rows, SITE)[0].vapour_pressure[0] == pytest.approx(1.91, abs=0.005)
