"""Packing, unpacking and folding: nothing is lost, later wins, NaN never overwrites."""

import datetime as dt

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from app.intake import Clock, IntakeError, Rows, fold, pack, station_day, unpack

CLOCK = Clock(-5.0)
ANY = st.one_of(
    st.floats(width=64, allow_infinity=False),
    st.integers(-3000, 3000).map(lambda whole: whole / 10),
    st.just(float("nan")),
    st.just(-0.0),
)


def rows_of(instant: np.ndarray, interval_s: int = 900, **values: np.ndarray) -> Rows:
    n = instant.size
    line = np.arange(1, n + 1, dtype=np.int32)
    return Rows(instant.astype(np.int64), line, np.full(n, interval_s, np.int32), values)


def same(a: Rows, b: Rows) -> None:
    np.testing.assert_array_equal(a.instant, b.instant)
    np.testing.assert_array_equal(a.line, b.line)
    np.testing.assert_array_equal(a.interval_s, b.interval_s)
    for name in {*a.values, *b.values}:
        absent = np.full(len(a), np.nan)
        left, right = a.values.get(name, absent), b.values.get(name, absent)
        np.testing.assert_array_equal(left.view(np.int64)[~np.isnan(left)],
                                      right.view(np.int64)[~np.isnan(right)])  # fmt: skip
        np.testing.assert_array_equal(np.isnan(left), np.isnan(right))


@settings(max_examples=50, deadline=None)
@given(st.data())
def test_unpacked_is_what_was_packed_to_the_last_bit(data: st.DataObject) -> None:
    n = data.draw(st.integers(1, 30))
    steps = data.draw(hnp.arrays(np.int64, n, elements=st.integers(1, 40_000)))
    start = data.draw(st.integers(-(10**9), 4 * 10**9))
    values = {
        name: data.draw(hnp.arrays(np.float64, n, elements=ANY)) for name in ("rain", "wind_speed")
    }
    rows = rows_of(start + np.cumsum(steps), **values)
    packs = pack(rows, CLOCK)
    same(fold([unpack(day.blob) for day in packs]), rows)
    assert sum(day.rows for day in packs) == n
    assert [day.blob for day in pack(rows, CLOCK)] == [day.blob for day in packs]


def test_a_day_ends_at_local_midnight_and_a_daily_row_is_its_own_day() -> None:
    local_midnight = np.datetime64("2025-05-14T05:00", "s").astype(np.int64)  # 00:00 at UTC-5
    quarter = rows_of(local_midnight + np.array([-900, 0, 900]), rain=np.array([1.0, 2.0, 3.0]))
    days = {day.day: day.rows for day in pack(quarter, CLOCK)}
    assert days == {dt.date(2025, 5, 13): 2, dt.date(2025, 5, 14): 1}
    daily = rows_of(np.array([local_midnight]), 86400, rain=np.array([1.0]))
    assert pack(daily, CLOCK)[0].day == dt.date(2025, 5, 13)
    assert station_day(daily.instant, daily.interval_s, CLOCK)[0] == 20221


def test_a_day_of_quarter_hours_is_small() -> None:
    rng = np.random.default_rng(1)
    t = np.arange(96)
    rows = rows_of(
        1_747_000_000 + 900 * t,
        air_temperature=np.round(15 + 8 * np.sin(t / 15) + rng.normal(0, 0.2, 96), 1),
        relative_humidity=np.round(60 + 20 * np.cos(t / 15), 0),
        shortwave_down=np.round(np.maximum(0, 900 * np.sin((t - 24) / 15)), 0),
        rain=np.zeros(96),
    )
    packs = pack(rows, CLOCK)
    assert sum(len(day.blob) for day in packs) < 0.25 * 96 * 4 * 8


def test_later_wins_and_nan_never_overwrites() -> None:
    first = rows_of(np.array([100, 200, 300]), rain=np.array([1.0, np.nan, 3.0]))
    second = rows_of(
        np.array([200, 300, 400]), rain=np.array([2.0, np.nan, 4.0]), wind_speed=np.array([7.0] * 3)
    )
    both = fold([first, second])
    np.testing.assert_array_equal(both.instant, [100, 200, 300, 400])
    np.testing.assert_array_equal(both.values["rain"], [1, 2, 3, 4])
    np.testing.assert_array_equal(both.values["wind_speed"], [np.nan, 7, 7, 7])
    np.testing.assert_array_equal(both.line, [1, 1, 2, 3])
    again = fold([both, second])
    same(again, both)


def test_rows_of_different_steps_do_not_mix() -> None:
    hourly = rows_of(np.array([3600, 7200]), 3600, rain=np.array([1.0, 2.0]))
    daily = rows_of(np.array([7200]), 86400, rain=np.array([9.0]))
    both = fold([daily, hourly])
    np.testing.assert_array_equal(both.instant, [3600, 7200, 7200])
    np.testing.assert_array_equal(both.interval_s, [3600, 3600, 86400])
    np.testing.assert_array_equal(both.values["rain"], [1, 2, 9])


def test_nothing_folds_to_nothing() -> None:
    assert len(fold([])) == 0
    assert len(fold([Rows.none(), Rows.none()])) == 0
    assert pack(Rows.none(), CLOCK) == []


@pytest.mark.parametrize("damage", [b"", b"RBD1", b"RBD1xxxx", b"nonsense" * 9])
def test_a_damaged_blob_is_named(damage: bytes) -> None:
    with pytest.raises(IntakeError, match="damaged"):
        unpack(damage)
    blob = pack(rows_of(np.array([100]), rain=np.array([1.0])), CLOCK)[0].blob
    with pytest.raises(IntakeError, match="damaged"):
        unpack(blob[:-5])
