"""Covered window, snow on the dome, night offset: clean public records raise next to nothing, and
frost planted in them is found. Real records: BSRN Payerne (June 2016), SURFRAD (1 January 2016).
"""

import numpy as np
import pandas as pd
import pvlib
import pytest

from app.science.energy.day_rows import DayRows, day_rows, sun_direction
from app.science.energy.longwave import fourth_power_kelvin
from app.science.energy.window import (
    CoveredWindow,
    covered_window,
    dome_days,
    morning_ratio,
    replace_covered,
)
from tests.science.energy.planted import Grid, payerne_grid, surfrad_grid
from tests.science.energy.records import PAYERNE
from tests.science.energy.test_day_checks import SURFRAD_WARNING

NAMES = ("longwave_down", "air_temperature", "shortwave_down")


def judged(rows: DayRows, grid: Grid, neighbour: np.ndarray | None = None) -> CoveredWindow:
    return covered_window(rows, *(grid[name] for name in NAMES), neighbour)


def black(grid: Grid) -> np.ndarray:
    return 5.67e-8 * fourth_power_kelvin(grid["air_temperature"])


def frosted(rows: DayRows, grid: Grid, before_h: float = 3.0, after_h: float = 1.0) -> Grid:
    """Each dawn's window covered from `before_h` before sunrise to `after_h` after it."""
    sunrise = np.argmax(~rows.night & rows.morning, axis=1)[:, None]
    at = (np.arange(rows.up.shape[1]) - sunrise) * rows.interval_s / 3600.0
    covered = (at >= -before_h) & (at < after_h)
    return grid | {"longwave_down": np.where(covered, black(grid) - 2.0, grid["longwave_down"])}


@pytest.mark.filterwarnings("ignore:DatetimeIndex.dayofyear is deprecated")
@pytest.mark.parametrize(("latitude", "longitude"), [(46.8, 6.9), (-35.0, 149.0), (60.0, -150.0)])
def test_sun_direction_against_pvlib(latitude: float, longitude: float) -> None:
    """pvlib 0.16 (NREL SPA): 0.02 degrees in elevation, 0.1 in azimuth, 0.1 % in distance."""
    times = pd.date_range("2015-01-01", "2025-01-01", freq="37h", tz="UTC")
    theirs = pvlib.solarposition.get_solarposition(times, latitude, longitude)
    up, east, south, factor = sun_direction(latitude, longitude, times.as_unit("s").asi8)
    elevation = np.degrees(np.arcsin(up))
    assert np.abs(elevation - theirs["elevation"]).max() < 0.02
    azimuth = np.degrees(np.arctan2(east, -south)) % 360.0
    off = (azimuth - theirs["azimuth"] + 180.0) % 360.0 - 180.0
    assert np.abs(off[np.abs(elevation) < 70.0]).max() < 0.1
    au = pvlib.solarposition.nrel_earthsun_distance(times)
    np.testing.assert_allclose(factor, 1.0 / au**2, rtol=1e-3)


@pytest.mark.filterwarnings(SURFRAD_WARNING)
def test_clean_records_raise_nothing() -> None:
    """Three misty dawns are undecidable, never covered; the clear winter day is silent."""
    rows, grid = payerne_grid()
    told = judged(rows, grid)
    assert not told.covered.any()
    misty = rows.date[told.undecidable_hours > 0.0].astype(str).tolist()
    assert misty == ["2016-06-03", "2016-06-06", "2016-06-22"]
    winter = judged(*surfrad_grid())
    assert not winter.covered.any()
    assert not winter.undecidable.any()


def test_frost_is_found_on_every_dawn_with_a_bright_morning() -> None:
    rows, grid = payerne_grid()
    bright = morning_ratio(rows, grid["shortwave_down"]) >= 0.6
    assert 7 <= bright.sum() <= 12
    told = judged(rows, frosted(rows, grid))
    np.testing.assert_allclose(told.covered_hours[bright], 4.0, atol=0.3)
    assert (told.covered_hours[~bright] == 0.0).all()
    assert (told.undecidable_hours[~bright] >= 3.7).all()
    np.testing.assert_allclose(told.gap[bright], -2.0, atol=0.5)
    seen = judged(rows, frosted(rows, grid), np.ones(29, dtype=bool))
    assert (seen.covered_hours >= 3.7).all()  # a neighbour saw an open sky each morning
    short = judged(rows, frosted(rows, grid, 0.5, 0.25))
    assert not short.covered[bright].any()


@pytest.mark.filterwarnings(SURFRAD_WARNING)
def test_frost_on_the_winter_morning() -> None:
    """One-minute rows; and a window covered all day long, proven by its own bright hours."""
    rows, grid = surfrad_grid()
    told = judged(rows, frosted(rows, grid))
    assert told.covered_hours[0] == pytest.approx(4.0, abs=0.05)
    all_day = judged(rows, grid | {"longwave_down": black(grid) - 1.0})
    assert all_day.covered_hours[0] > 23.0


def test_replaced_hours_come_near_what_was_measured() -> None:
    """Covered dawns at Payerne: the model's downward longwave is nearer than the frosted window."""
    rows, grid = payerne_grid()
    planted = frosted(rows, grid)
    told = judged(rows, planted)
    served = replace_covered(
        rows, told, planted["longwave_down"], grid["air_temperature"], grid["vapour_pressure"]
    )
    where = told.covered
    off = served.longwave_down[where] - grid["longwave_down"][where]
    frost = planted["longwave_down"][where] - grid["longwave_down"][where]
    assert np.sqrt((off**2).mean()) < 0.35 * np.sqrt((frost**2).mean())
    np.testing.assert_array_equal(served.longwave_down[~where], planted["longwave_down"][~where])
    np.testing.assert_array_equal(served.hours, told.covered_hours)
    np.testing.assert_allclose(served.widening, served.hours * 20.0 * 0.0036)
    assert not served.too_many.any()


def test_more_than_a_quarter_of_the_day_is_not_replaced() -> None:
    rows, grid = payerne_grid()
    planted = frosted(rows, grid, 4.0, 4.0)
    told = judged(rows, planted)
    served = replace_covered(
        rows, told, planted["longwave_down"], grid["air_temperature"], grid["vapour_pressure"]
    )
    bright = told.covered_hours > 0.0
    assert bright.sum() >= 7
    np.testing.assert_array_equal(served.too_many, told.covered_hours > 6.0)
    assert served.too_many[bright].sum() >= 7
    assert np.isnan(served.longwave_down[served.too_many][:, 20]).all()
    assert (served.hours[served.too_many] == 0.0).all()


def test_evening_mist_that_lifted_long_before_dawn_is_undecidable() -> None:
    rows, grid = payerne_grid()
    at = np.arange(96)
    evening = (at >= 84) | (at < 4)  # 21:00 to 01:00
    planted = grid | {"longwave_down": np.where(evening, black(grid), grid["longwave_down"])}
    told = judged(rows, planted)
    assert not told.covered.any()
    assert (told.undecidable_hours >= 3.9)[1:-1].all()


def test_no_spell_across_missing_days() -> None:
    rows, grid = payerne_grid()
    some = np.array([0, 20])  # neither is followed by the other
    apart = day_rows(PAYERNE, rows.date[some], 96)
    two = {name: values[some].copy() for name, values in grid.items()}
    edge = np.zeros((2, 96), dtype=bool)
    edge[0, -2:] = edge[1, :2] = True  # half an hour on either side
    planted = two | {"longwave_down": np.where(edge, black(two), two["longwave_down"])}
    told = judged(apart, planted)
    assert not told.undecidable[edge].any()


@pytest.mark.filterwarnings(SURFRAD_WARNING)
def test_night_offset_and_snow() -> None:
    """SURFRAD: a quarter of the day's good minutes read below -2 W/m2 at night."""
    rows, grid = surfrad_grid()
    told = dome_days(rows, grid["shortwave_down"], grid["shortwave_up"])
    assert 0.2 < told.offset_rows[0] / 1440.0 < 0.3
    assert -4.0 < told.offset[0] < -2.0
    assert told.snow_hours[0] == 0.0
    june, clean = payerne_grid()
    none = dome_days(june, clean["shortwave_down"], clean["shortwave_up"])
    assert none.snow_hours.sum() == 0.0
    assert none.offset_rows.sum() == 0
    assert np.isnan(none.offset).all()
    capped = np.where(june.morning, 0.3 * clean["shortwave_up"], clean["shortwave_down"])
    snow = dome_days(june, capped, clean["shortwave_up"])
    assert (snow.snow_hours > 1.0).sum() > 20


def test_empty_and_missing() -> None:
    rows, _ = payerne_grid()
    gone = {name: np.full((29, 96), np.nan) for name in NAMES}
    told = judged(rows, gone)
    assert not told.covered.any()
    assert np.isnan(told.morning_ratio).all()
    none = day_rows(PAYERNE, rows.date[:0], 96)
    assert judged(none, {name: np.zeros((0, 96)) for name in NAMES}).covered.shape == (0, 96)
    with pytest.raises(ValueError, match="rows_a_day is 7"):
        day_rows(PAYERNE, rows.date, 7)
