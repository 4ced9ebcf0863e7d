"""Differences of a register and their sharing out: by hand, and by what must hold."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.science.metering import passed, shared_out

NO = np.zeros(4, np.bool_)


def test_a_register_rolls_over_and_is_set_anew() -> None:
    """By hand: from 999 900 over 1 000 000 to 150 is 250."""
    told = passed([999_000, 999_900, 150, 20], np.array([False, False, False, True]), 1e6)
    assert told == pytest.approx([np.nan, 900, 250, np.nan], nan_ok=True)


def test_a_lower_register_that_does_not_roll_over_tells_nothing() -> None:
    assert passed([10, 30, 5, 6], NO) == pytest.approx([np.nan, 20, np.nan, 1], nan_ok=True)
    assert np.isnan(passed([7.0], NO[:1])).all()
    assert passed([], NO[:0]).size == 0


@given(
    start=st.integers(0, 999_999),
    steps=st.lists(st.integers(0, 900_000), min_size=1, max_size=30),
)
def test_differences_add_up_to_what_passed_whatever_the_turns(start: int, steps: list[int]) -> None:
    register = (start + np.concatenate([[0], np.cumsum(steps)])) % 1_000_000
    told = passed(register, np.zeros(register.size, np.bool_), 1e6)
    assert told[1:] == pytest.approx(steps)


@given(
    volume=st.floats(0, 1e7),
    weights=st.lists(st.floats(0, 1e5), min_size=1, max_size=20).filter(lambda w: sum(w) > 1e-3),
)
def test_parts_add_up_and_keep_the_ratio_of_hours_times_flow(
    volume: float, weights: list[float]
) -> None:
    parts = shared_out(volume, weights)
    assert parts.sum() == pytest.approx(volume, rel=1e-9, abs=1e-6)
    assert (parts >= 0).all()
    assert parts * sum(weights) == pytest.approx(np.array(weights) * volume, rel=1e-9, abs=1e-3)


def test_no_weight_shares_nothing() -> None:
    assert np.isnan(shared_out(100, [0, 0])).all()
