"""What rows and people say of days, carried into the ladder; taught days by hours; regression on
planted faults in BSRN Payerne, June 2016."""

from dataclasses import replace

import numpy as np
import pytest

from app.science.energy.day_checks import Marks
from app.science.energy.hourly import hourly_days
from app.science.energy.longwave import longwave_with_body
from app.science.energy.records import DailyWeather
from app.science.energy.sensor_faults import sensor_faults
from app.science.energy.station_day import explain_rung, station_days
from app.science.energy.taught import Lessons
from app.science.energy.watch import watch_rows
from tests.science.energy.detection import frost, swapped, without_body
from tests.science.energy.planted import Grid, payerne_grid
from tests.science.energy.records import PAYERNE, payerne_days
from tests.science.energy.test_day_checks import ordinary
from tests.science.energy.test_hourly import UTC, payerne_hours, payerne_utc_days
from tests.science.energy.test_ladder import without

ELSEWHERE = replace(PAYERNE, reference_surface=False)
FLUXES = ("shortwave_down", "shortwave_up", "longwave_down", "longwave_up")


def days_of(grid: Grid) -> DailyWeather:
    """Payerne's days with the four components summed from the (planted) rows."""
    sums = {name: grid[name].mean(axis=1) * 0.0864 for name in FLUXES}
    return replace(without(payerne_days(), "net_radiation"), **sums)


def test_frosted_days_stay_on_their_rung_and_near_the_truth() -> None:
    rows, grid = payerne_grid()
    truth = station_days(ELSEWHERE, days_of(grid))
    planted = frost(ELSEWHERE, rows, grid)
    told = watch_rows(ELSEWHERE, rows, planted)
    assert told.replaced is not None
    bare = station_days(ELSEWHERE, days_of(planted))
    mended = planted | {"longwave_down": told.replaced.longwave_down}
    days = station_days(
        ELSEWHERE, days_of(mended), watched=told.findings, rn_widening=told.rn_widening(29)
    )
    assert set(days.rung) == {2}
    hours = told.replaced.hours > 0.0
    assert hours.sum() >= 7
    off = np.abs(days.rn - truth.rn)[hours]
    assert off.mean() < 0.4 * np.abs(bare.rn - truth.rn)[hours].mean()
    assert (days.rn_uncertainty[hours] > truth.rn_uncertainty[hours]).all()
    assert all("window_hours=4" in flags for flags in days.flags[hours])
    np.testing.assert_array_equal(days.rn[~hours], bare.rn[~hours])


def test_swapped_sensors_are_set_aside_by_day() -> None:
    rows, grid = payerne_grid()
    planted = swapped(PAYERNE, rows, grid)
    told = watch_rows(PAYERNE, rows, planted)
    days = station_days(PAYERNE, days_of(planted), watched=told.findings)
    assert set(days.rung) == {8}
    assert dict(explain_rung(days.why_not[0]))[2] == ("downward and upward shortwave look swapped")
    assert all("shortwave_swapped=" in flags for flags in days.flags)


def test_missing_body_term_takes_the_next_rung() -> None:
    rows, grid = payerne_grid()
    told = sensor_faults(rows, without_body(PAYERNE, rows, grid))
    days = station_days(PAYERNE, days_of(grid), watched=tuple(told))
    assert set(days.rung) == {5}
    assert "2:failed:body_term_missing" in days.why_not[0]


def test_a_person_has_the_last_word() -> None:
    weather = ordinary(4)
    one, two = np.arange(4) == 1, np.arange(4) == 2
    bright = replace(weather, shortwave_down=np.where(two, 45.0, weather.shortwave_down))
    plain = station_days(PAYERNE, without(bright, "net_radiation"))
    assert plain.rung.tolist() == [1, 1, 7, 1]
    marks = Marks(bad={"longwave_down": one}, good={"shortwave_down": two})
    days = station_days(PAYERNE, without(bright, "net_radiation"), marks=marks)
    assert days.rung.tolist() == [1, 5, 1, 1]
    assert "1:failed:marked_bad" in days.why_not[1]
    assert dict(explain_rung(days.why_not[1]))[1] == "marked as not to be used"
    assert days.flags[2].count("shortwave_above_clear_sky") == 1  # it shows, and is used
    assert days.flags[1].startswith("marked_bad=1")
    untouched = station_days(PAYERNE, without(bright, "net_radiation"), marks=Marks())
    np.testing.assert_array_equal(untouched.rn, plain.rn)


def test_good_marks_leave_the_rest_of_a_pair_set_aside() -> None:
    weather = ordinary(3)
    capped = replace(weather, shortwave_up=weather.shortwave_down + 1.0)
    all_days = np.ones(3, dtype=bool)
    marks = Marks(good={"shortwave_down": all_days})
    days = station_days(PAYERNE, without(capped, "net_radiation"), marks=marks)
    assert set(days.rung) == {2}
    assert "1:failed:upward_above_downward" in days.why_not[0]
    assert days.flags[0].count("upward_above_downward") == 1


def test_hours_of_a_taught_day_add_up_to_it() -> None:
    weather = payerne_hours()
    gone = np.full((30, 24), np.nan)
    modelled = replace(weather, longwave_down=gone)
    elsewhere = replace(UTC, reference_surface=False)
    days = station_days(UTC, payerne_utc_days())
    plain = hourly_days(elsewhere, modelled)
    rung = np.where(np.arange(30) < 15, 4, 5).astype(np.int8)
    told = hourly_days(elsewhere, modelled, day_rung=rung, day_rn=days.rn)
    np.testing.assert_allclose(told.rn.sum(axis=1)[:15], days.rn[:15])
    np.testing.assert_array_equal(told.rn[15:], plain.rn[15:])
    assert told.rung.tolist() == [4] * 15 + [5] * 15
    measured = hourly_days(UTC, weather).eto_sum
    assert (
        abs(told.eto_sum - measured)[:15].mean() < 0.5 * abs(plain.eto_sum - measured)[:15].mean()
    )


def test_lessons_go_on() -> None:
    date = np.datetime64("2024-03-01") + np.arange(10)
    early = Lessons(date[:6], np.arange(6.0), np.arange(6.0))
    late = Lessons(date[4:], np.arange(6.0) + 10.0, np.arange(6.0))
    both = early.then(late)
    assert both.date.tolist() == date.tolist()
    assert both.modelled.tolist() == [0, 1, 2, 3, 10, 11, 12, 13, 14, 15]
    nothing = Lessons(date[:0], np.zeros(0), np.zeros(0))
    assert early.then(nothing).date.size == 6
    assert nothing.then(early).date.size == 6


def test_pyrgeometer_with_its_body() -> None:
    """A body at 20 degC emits 419 W m-2 (Stefan-Boltzmann); a signal of -90 leaves 329."""
    assert longwave_with_body(-90.0, 20.0) == pytest.approx(5.67e-8 * 293.16**4 - 90.0)
    assert np.isnan(longwave_with_body(np.nan, 20.0))
