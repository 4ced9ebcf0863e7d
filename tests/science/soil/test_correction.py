"""Corrections by readings: weighed, in full, bounding, set aside; suspicion of one sign."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.science.ledger import block_ledgers, ensemble_depletion
from app.science.soil.correction import (
    correct,
    corrected_close,
    depletion_at,
    spread_of_range,
    suspicion,
)
from app.science.soil.readings import Measured
from tests.science.soil.fields import field, weather

READING = Measured(depletion_mm=60.0, error_mm=9.0, kind="value")


def test_the_gain_weighs_both_spreads() -> None:
    """Scalar Kalman filter: gain 144 / (144 + 81) = 0.64; variance left 0.36 x 144."""
    told = correct(40.0, 12.0, READING)
    assert told.gain == pytest.approx(0.64)
    assert told.correction_mm == pytest.approx(-12.8)
    assert told.after_mm == pytest.approx(52.8)
    assert told.after_spread_mm == pytest.approx(7.2)
    assert told.why == "weighed"
    assert (told.before_spread_mm, told.reading_spread_mm) == (12.0, 9.0)


@settings(max_examples=100, deadline=None)
@given(st.floats(-20, 200), st.floats(0, 60), st.floats(-20, 200), st.floats(0.1, 60))
def test_the_best_of_two_normal_estimates(
    ledger: float, spread: float, reading: float, error: float
) -> None:
    """The weighed close is the mean of both by inverse variance, no wider than either."""
    told = correct(ledger, spread, Measured(depletion_mm=reading, error_mm=error, kind="value"))
    low, high = sorted((ledger, reading))
    assert low - 1e-9 <= told.after_mm <= high + 1e-9
    assert told.after_spread_mm <= min(spread, error) + 1e-9
    assert told.after_mm == pytest.approx(ledger - told.correction_mm)
    if spread > 1e-3:
        weights = np.array([1.0 / spread**2, 1.0 / error**2])
        mean = float(np.average([ledger, reading], weights=weights))
        assert told.after_mm == pytest.approx(mean, abs=1e-6)


def test_full_trust_takes_it_all_and_none_nothing() -> None:
    full = correct(40.0, 12.0, READING, trust="full")
    assert (full.after_mm, full.gain, full.after_spread_mm) == (60.0, 1.0, 9.0)
    none = correct(40.0, 12.0, READING, trust="none")
    assert (none.after_mm, none.correction_mm, none.why) == (40.0, 0.0, "set_aside")
    assert none.after_spread_mm == 12.0
    sure = correct(40.0, 0.0, READING)
    assert sure.after_mm == 40.0
    with pytest.raises(ValueError, match="choose one of weighed, full, none"):
        correct(40.0, 12.0, READING, trust="half")
    with pytest.raises(ValueError, match="spread_mm is nan"):
        correct(40.0, float("nan"), READING)


def test_a_bound_moves_only_a_ledger_beyond_it() -> None:
    most, least = replace(READING, kind="at_most"), replace(READING, kind="at_least")
    assert correct(40.0, 12.0, most).why == "bound_held"
    assert correct(80.0, 12.0, least).why == "bound_held"
    assert correct(80.0, 12.0, most).after_mm == pytest.approx(80.0 - 0.64 * 20.0)
    assert correct(40.0, 12.0, least).after_mm == pytest.approx(52.8)
    assert correct(80.0, 12.0, most, trust="full").after_mm == 60.0
    assert correct(40.0, 12.0, most, trust="full").after_mm == 40.0
    assert correct(80.0, 12.0, replace(READING, kind="nothing")).correction_mm == 0.0
    missing = correct(80.0, 12.0, replace(READING, depletion_mm=float("nan")), trust="full")
    assert (missing.why, missing.after_mm) == ("missing", 80.0)


def test_the_ledger_closes_where_the_correction_says_and_all_members_shift_alike() -> None:
    plan, sky = field(40, coefficients="single"), weather(40)
    ledger = block_ledgers([plan], [sky])[0]
    low, high = ensemble_depletion(plan, sky, seed=4)
    spread = spread_of_range(float(low[20]), float(high[20]))
    reading = Measured(
        depletion_mm=float(ledger.depletion_mm[20]) - 15.0, error_mm=5.0, kind="value"
    )
    told = correct(float(ledger.depletion_mm[20]), spread, reading)
    assert 0.0 < told.correction_mm < 15.0
    shift = np.where(np.arange(40) == 20, told.correction_mm, 0.0)
    corrected = replace(plan, correction=shift)
    after = block_ledgers([corrected], [sky])[0]
    assert after.depletion_mm[20] == pytest.approx(told.after_mm)
    moved = ensemble_depletion(corrected, sky, seed=4)
    np.testing.assert_allclose(moved[0][20], low[20] - told.correction_mm)
    np.testing.assert_allclose(moved[1][20], high[20] - told.correction_mm)


def test_a_morning_reading_is_the_close_before() -> None:
    assert depletion_at(5.0, 30.0, 40.0) == 30.0
    assert depletion_at(6.0, 30.0, 40.0) == 30.0
    assert depletion_at(12.0, 30.0, 40.0) == 35.0
    assert depletion_at(20.0, 30.0, 40.0) == 40.0
    assert np.isnan(depletion_at(9.0, np.nan, 40.0))


def test_the_close_a_reading_corrects() -> None:
    day = np.datetime64("2025-07-01")
    assert corrected_close(day, 5.5) == np.datetime64("2025-06-30")
    assert corrected_close(day, 14.0) == day
    with pytest.raises(ValueError, match="hour is 25"):
        corrected_close(day, 25.0)


def test_spread_of_a_range() -> None:
    """p10 and p90 of a normal distribution lie 1.2816 standard deviations from its mean."""
    assert spread_of_range(20.0 - 1.2816 * 7.0, 20.0 + 1.2816 * 7.0) == pytest.approx(7.0, rel=1e-3)
    assert spread_of_range(20.0, 20.0) == 0.0
    assert np.isnan(spread_of_range(np.nan, 3.0))


def corrections(days: dict[int, float]) -> np.ndarray:
    series = np.zeros(100)
    for day, value in days.items():
        series[day] = value
    return series


def test_corrections_of_one_sign_all_season_raise_a_suspicion() -> None:
    """Five times 6 mm drier of 150 mm applied and 300 mm used by day 81: efficiency 0.8 of what
    was said, or Kc 1.1 of it, would explain it alone."""
    series = corrections(dict.fromkeys((10, 30, 45, 60, 80), -6.0))
    net, et = np.full(100, 150.0 / 81.0), np.full(100, 300.0 / 81.0)
    told = suspicion(series, net, et)
    assert told is not None
    assert (told.side, told.count, told.sum_mm) == ("drier", 5, -30.0)
    assert told.efficiency_factor == pytest.approx(0.8)
    assert told.kc_factor == pytest.approx(1.1)
    wetter = suspicion(-series, net * 0.0, et)
    assert wetter is not None
    assert wetter.side == "wetter"
    assert np.isnan(wetter.efficiency_factor)


def test_a_millimetre_counts() -> None:
    series = corrections(dict.fromkeys((10, 30, 45, 60, 80), 1.0))
    assert suspicion(series, np.ones(100), np.ones(100)) is not None
    assert suspicion(0.99 * series, np.ones(100), np.ones(100)) is None


@pytest.mark.parametrize(
    "days",
    [
        {},
        dict.fromkeys((10, 30, 60, 80), -6.0),  # four only
        dict.fromkeys((10, 12, 14, 16, 18), -6.0),  # within nine days
        {10: -6.0, 30: -6.0, 45: 6.0, 60: -6.0, 80: -6.0, 90: -6.0},  # both signs
        dict.fromkeys((10, 30, 45, 60, 80), -0.5),  # too small to tell
    ],
)
def test_no_suspicion_otherwise(days: dict[int, float]) -> None:
    assert suspicion(corrections(days), np.ones(100), np.ones(100)) is None
