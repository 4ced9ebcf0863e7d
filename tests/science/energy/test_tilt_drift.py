"""Tilt, clock and level from clear days, and drift over months: planted in public records.

Real records: SURFRAD (a clear winter day), BSRN Payerne (June 2016, one clear day). The long
series are those of `tests/science/energy/long_series.py`.
"""

import numpy as np
import pytest

from app.science.energy.day_rows import day_rows
from app.science.energy.drift import bright_days, drift, median_slope
from app.science.energy.tilt import (
    ClearShape,
    UsualShape,
    clear_shape,
    shape_faults,
    usual_shape,
)
from tests.science.energy.long_series import (
    LAST_HALF,
    YEARS,
    last_half,
    made_series,
    typical_levels,
)
from tests.science.energy.planted import leaning, payerne_grid, surfrad_local
from tests.science.energy.records import ALAMOSA, PAYERNE
from tests.science.energy.test_day_checks import SURFRAD_WARNING

pytestmark = pytest.mark.filterwarnings(SURFRAD_WARNING)


def winter(east: float = 0.0, south: float = 0.0, minutes: int = 0) -> ClearShape:
    rows, grid = surfrad_local()
    shortwave = leaning(rows, grid, east, south)
    shortwave = np.roll(shortwave, minutes, axis=1)  # the clock runs ahead by so many minutes
    return clear_shape(ALAMOSA, rows, shortwave, grid["vapour_pressure"].mean(axis=1))


def as_level_last_month() -> UsualShape:
    clean = winter()
    return UsualShape(float(clean.tilt_east[0]), float(clean.level[0]), 3)


def test_clean_records_raise_nothing() -> None:
    told = winter()
    assert told.clear.all()
    assert abs(told.clock[0]) < 1.0
    assert abs(told.tilt_east[0]) < 1.0
    assert told.simple_level[0] == pytest.approx(1.0, abs=0.03)
    assert shape_faults(told)[0].tolist() == [""]
    rows, grid = payerne_grid()
    june = clear_shape(PAYERNE, rows, grid["shortwave_down"], grid["vapour_pressure"].mean(axis=1))
    assert rows.date[june.clear].astype(str).tolist() == ["2016-06-23"]
    assert set(shape_faults(june)[0]) == {""}


@pytest.mark.parametrize("east", [-5.0, 5.0])
def test_lean_to_east_or_west(east: float) -> None:
    """The figure is a lower bound: part of a lean passes for minutes of the clock."""
    code, figure = shape_faults(winter(east))
    assert code.tolist() == ["tilt"]
    assert 0.4 < figure[0] / east < 1.1


@pytest.mark.parametrize(("east", "south"), [(2.0, 0.0), (-2.0, 0.0), (0.0, 2.0), (0.0, -2.0)])
def test_two_degrees_are_found_against_the_sensors_own_usual(east: float, south: float) -> None:
    """The winter afternoon itself is a little brighter than its morning, as 0.9 degrees west."""
    code, figure = shape_faults(winter(east, south), as_level_last_month())
    assert code.tolist() == ["tilt" if east else "level"]
    if east:
        assert 0.5 < figure[0] / east < 1.1
    else:
        assert np.sign(figure[0]) == np.sign(south)


def test_five_degrees_south_shows_in_the_level() -> None:
    code, figure = shape_faults(winter(0.0, 5.0))
    assert code.tolist() == ["level"]
    assert figure[0] > 0.1


@pytest.mark.parametrize("minutes", [-60, -15, -10, 10, 15, 60])
def test_clock_is_told_from_a_lean(minutes: int) -> None:
    told = winter(minutes=minutes)
    code, figure = shape_faults(told)
    assert code.tolist() == ["clock"]
    assert figure[0] == pytest.approx(minutes, abs=1.0)
    assert abs(told.tilt_east[0]) < 1.2  # once the clock is set right the curve is level


@pytest.mark.parametrize("minutes", [-60, -30, -15, 15, 30, 60])
def test_clock_on_the_clear_day_of_payerne(minutes: int) -> None:
    """Rows of a quarter of an hour time a sunrise within a few minutes."""
    rows, grid = payerne_grid()
    day = rows.date == np.datetime64("2016-06-23")
    late = np.roll(grid["shortwave_down"].reshape(-1), minutes // 15).reshape(29, 96)
    shape = clear_shape(PAYERNE, rows, late, grid["vapour_pressure"].mean(axis=1))
    code, figure = shape_faults(shape)
    assert code[day].tolist() == ["clock"]
    assert figure[day][0] == pytest.approx(minutes, abs=3.0)
    assert set(code[~day]) <= {"", "clock"}


def test_lean_moves_the_midpoint_by_less_than_two_minutes_a_degree() -> None:
    level = winter().clock[0]
    for east in (-5.0, -2.0, 2.0, 5.0):
        assert abs(winter(east).clock[0] - level) < 2.0 * abs(east)


@pytest.mark.parametrize("minutes", [-5, -4, 4, 5])
def test_a_few_minutes_are_never_called_a_lean(minutes: int) -> None:
    assert shape_faults(winter(minutes=minutes))[0][0] in ("", "clock")
    assert shape_faults(winter(minutes=minutes), as_level_last_month())[0][0] in ("", "clock")


def test_coarse_or_missing_rows() -> None:
    rows, grid = surfrad_local()
    ea = grid["vapour_pressure"].mean(axis=1)
    hours = day_rows(ALAMOSA, rows.date, 24)
    coarse = clear_shape(ALAMOSA, hours, grid["shortwave_down"].reshape(1, 24, 60).mean(2), ea)
    assert coarse.clear.all()
    assert np.isnan(coarse.clock).all()
    gap = grid["shortwave_down"].copy()
    gap[0, 700] = np.nan
    assert not clear_shape(ALAMOSA, rows, gap, ea).clear.any()
    dead = clear_shape(ALAMOSA, rows, np.zeros((1, 1440)), ea)
    assert not dead.clear.any()
    assert shape_faults(dead)[0].tolist() == [""]
    none = day_rows(ALAMOSA, rows.date[:0], 1440)
    assert clear_shape(ALAMOSA, none, np.zeros((0, 1440)), ea[:0]).clear.shape == (0,)


def test_usual_wants_three_clear_days() -> None:
    one = winter()
    assert usual_shape(one) is None
    three = ClearShape(*(np.repeat(getattr(one, n), 3) for n in one.__dict__))
    told = usual_shape(three)
    assert told is not None
    assert told.days == 3
    assert told.level == one.level[0]


# Drift ------------------------------------------------------------------------------------------


def test_drift_of_four_percent_in_six_months() -> None:
    """The second year's last half sinks by 4 %; the year before says what its season should be."""
    level, clear = made_series()
    assert 60 < clear.sum() < 300
    clean = last_half(level)
    assert not clean.drifting
    assert abs(clean.change) < 0.015
    for share in (0.04, -0.04):
        told = last_half(level * (1.0 + share * LAST_HALF))
        assert told.drifting
        assert told.change == pytest.approx(share, abs=0.012)
        assert told.clear_days >= 8


def test_drift_of_one_percent_a_month_without_a_past() -> None:
    """A year of it, planted in a real typical year, passes what the season of the air can do."""
    date, shape = typical_levels("723170TYA.CSV")
    told = drift(date, shape.level * (1.0 - 0.01 * np.arange(365) / 30.4), shape.clear)
    assert told.drifting
    assert told.rate == pytest.approx(-0.01, abs=0.006)
    level, clear = made_series()
    season = slice(0, 274)  # the made series' own season, from winter to summer
    assert not drift(YEARS[season], level[season], clear[season]).drifting


def test_drift_against_a_neighbour_that_saw_the_same_sky() -> None:
    level, clear = made_series()
    part = slice(0, 120)
    sunk = level[part] * (1.0 - 0.01 * np.arange(120) / 30.4)
    told = drift(YEARS[part], sunk, clear[part], level[part])
    assert told.drifting
    assert told.rate == pytest.approx(-0.01, abs=0.001)


def test_too_few_clear_days_is_an_answer() -> None:
    rows, grid = payerne_grid()
    june = clear_shape(PAYERNE, rows, grid["shortwave_down"], grid["vapour_pressure"].mean(axis=1))
    told = drift(rows.date, june.level, june.clear)
    assert told.reason == "few_clear_days"
    assert told.clear_days == 1
    assert not told.drifting
    assert np.isnan(told.rate)
    level, clear = made_series()
    few = clear & (np.cumsum(clear) <= 7)
    assert drift(YEARS, level, few).reason == "few_clear_days"
    short = slice(0, 55)  # many clear days, but not over sixty
    assert drift(YEARS[short], level[short], np.ones(55, bool)).reason == "few_clear_days"


@pytest.mark.parametrize("name", ["723170TYA.CSV", "703165TY.csv"])
def test_real_typical_years_do_not_raise_an_alarm(name: str) -> None:
    """NREL typical years as they stand: haze and season of real air are not drift."""
    date, shape = typical_levels(name)
    for part in (slice(0, 182), slice(90, 272), slice(182, 365), slice(0, 365)):
        assert not drift(date[part], shape.level[part], shape.clear[part]).drifting
    assert (shape_faults(shape)[0] != "").sum() <= 365 / 30


def test_median_slope_against_numpy() -> None:
    rng = np.random.default_rng(2)
    x = np.arange(60.0)
    y = 0.02 * x + rng.normal(0.0, 0.1, 60)
    slope, error = median_slope(x, y)
    (fit, _), cov = np.polyfit(x, y, 1, cov=True)
    assert slope == pytest.approx(fit, abs=error)
    assert error == pytest.approx(np.sqrt(cov[0, 0]), rel=0.4)
    assert np.isnan(median_slope(np.ones(5), y[:5])[0])


def test_bright_days_of_a_daily_record() -> None:
    date = np.datetime64("2024-01-01") + np.arange(120)
    rng = np.random.default_rng(4)
    ratio = rng.choice([0.4, 0.6, 0.97], 120) * rng.normal(1.0, 0.01, 120)
    assert ((ratio > 0.9) == bright_days(date, ratio)).all()
    assert not bright_days(date[:10], ratio[:10]).any()
