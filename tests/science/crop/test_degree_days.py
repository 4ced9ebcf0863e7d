"""Degree days: three methods, and a season that goes by them."""

from dataclasses import replace

import numpy as np
import pytest

from app.science.crop.curve import coefficient_on, season_curve
from app.science.crop.degree_days import DegreeDays, degree_days, usual_stage_sums
from app.science.crop.seen import StageSeen
from app.science.ledger import block_ledgers
from tests.science.crop.test_curve import MAIZE
from tests.science.soil.fields import field, weather


def test_means_and_clipped_means() -> None:
    """Agricultural and Forest Meteorology 87:291-300 (1997), methods 1 and 2, from memory: on a
    day of 20 and 4 degC above a base of 10 the first gives 2, the second 5."""
    assert float(degree_days(20.0, 4.0, 10.0)) == 2.0
    assert float(degree_days(20.0, 4.0, 10.0, method="clipped")) == 5.0
    assert float(degree_days(36.0, 20.0, 10.0, 30.0)) == 18.0
    assert float(degree_days(36.0, 20.0, 10.0, 30.0, "clipped")) == 15.0
    assert float(degree_days(9.0, 3.0, 10.0)) == 0.0


@pytest.mark.parametrize(
    ("high", "low"),
    [(30.0, 12.0), (20.0, 2.0), (38.0, 5.0), (34.0, 31.0), (8.0, 1.0), (15.0, 15.0)],
)
def test_the_sine_is_its_own_integral(high: float, low: float) -> None:
    """Ecology 50:514-517 (1969), from memory: a sine between the day's extremes, held between
    base 10 and upper 30 degC; summed here in 20,000 steps."""
    angle = (np.arange(20_000) + 0.5) / 20_000 * 2.0 * np.pi
    course = (high + low) / 2.0 + (high - low) / 2.0 * np.sin(angle)
    expected = float(np.mean(np.clip(course, 10.0, 30.0) - 10.0))
    got = float(degree_days(high, low, 10.0, 30.0, "sine"))
    assert got == pytest.approx(expected, abs=1e-4)
    open_top = float(np.mean(np.maximum(course - 10.0, 0.0)))
    assert float(degree_days(high, low, 10.0, method="sine")) == pytest.approx(open_top, abs=1e-4)


@pytest.mark.parametrize("method", ["mean", "clipped", "sine"])
def test_scalar_is_array_nan_stays_and_bounds_hold(method: str) -> None:
    rng = np.random.default_rng(4)
    low = rng.uniform(-20.0, 35.0, 300)
    high = low + rng.uniform(0.0, 25.0, 300)
    many = degree_days(high, low, 8.0, 32.0, method)
    assert ((many >= 0.0) & (many <= 24.0)).all()
    assert float(degree_days(high[7], low[7], 8.0, 32.0, method)) == many[7]
    holed = degree_days([30.0, np.nan, 30.0], [10.0, 10.0, np.nan], 8.0, 32.0, method)
    assert np.isnan(holed).tolist() == [False, True, True]


WARM = DegreeDays(base_c=10.0, upper_c=30.0, stage_sums=(100.0, 300.0, 400.0, 200.0))
BY_WARMTH = replace(MAIZE, degree_days=WARM)


def test_the_curve_follows_the_sum_of_warmth() -> None:
    """Uneven days: Kcb is that of FAO-56 eq 66 with degree days in place of days."""
    rng = np.random.default_rng(6)
    days = 120
    warmth = rng.uniform(2.0, 16.0, days)
    date = MAIZE.planting + np.arange(-5, days - 5)
    c = season_curve(BY_WARMTH, date, np.full(days, 2.0), np.full(days, 45.0), warmth=warmth)
    total = np.cumsum(warmth[5:])
    grown = np.clip((total - 100.0) / 300.0, 0.0, 1.0)
    aged = np.clip((total - 800.0) / 200.0, 0.0, 1.0)
    expected = 0.15 + grown - 0.65 * aged
    ripe = int(np.argmax(total >= 1000.0))  # that day is the last
    np.testing.assert_allclose(c.coefficient[5 : 6 + ripe], expected[: ripe + 1])
    assert not c.in_season[:5].any()
    assert c.in_season[5 : 6 + ripe].all()
    assert not c.in_season[6 + ripe :].any()
    assert (np.diff(c.root_depth) >= 0.0).all()
    assert c.root_depth[-1] == 1.0


def test_even_warmth_is_the_curve_by_days() -> None:
    even = DegreeDays(base_c=10.0, stage_sums=(300.0, 400.0, 500.0, 300.0))
    days = 150
    c = season_curve(
        replace(MAIZE, degree_days=even),
        MAIZE.planting + np.arange(days),
        np.full(days, 2.0),
        np.full(days, 45.0),
        warmth=np.full(days, 10.0),
    )
    expected = coefficient_on(np.arange(1, days + 1), MAIZE.stage_days, 0.15, 1.15, 0.5)
    np.testing.assert_allclose(c.coefficient, expected)


def test_a_ledger_that_starts_later_counts_the_warmth_before() -> None:
    days, late = 100, 30
    rng = np.random.default_rng(9)
    warmth = rng.uniform(2.0, 16.0, days)
    seen = StageSeen(date=MAIZE.planting + 20, stage=2)
    date, calm, damp = MAIZE.planting + np.arange(days), np.full(days, 2.0), np.full(days, 45.0)
    for season, since in ((BY_WARMTH, 0), (replace(BY_WARMTH, stages_seen=(seen,)), 20)):
        whole = season_curve(season, date, calm, damp, warmth=warmth)
        rest = season_curve(
            season,
            date[late:],
            calm[late:],
            damp[late:],
            warmth=warmth[late:],
            warmth_before=float(warmth[since:late].sum()),
        )
        np.testing.assert_allclose(rest.coefficient, whole.coefficient[late:])


def test_the_ledger_takes_warmth_from_its_temperatures() -> None:
    plan = field(60, perennial=False, k=0.8)
    season = replace(
        plan.season, k_ini=0.2, degree_days=replace(WARM, stage_sums=(20, 100, 900, 0))
    )
    warm, cool = (
        replace(weather(60), tmax=np.full(60, t + 10.0), tmin=np.full(60, t)) for t in (20.0, 8.0)
    )
    quick, slow = block_ledgers([replace(plan, season=season)] * 2, [warm, cool])
    assert quick.kcb[10] == pytest.approx(0.8)
    assert slow.kcb[10] == pytest.approx(0.2 + 0.6 * (33.0 - 20.0) / 100.0)
    with pytest.raises(ValueError, match="tmax of block 0 is missing or has gaps"):
        block_ledgers([replace(plan, season=season)], [weather(60)])
    gap = np.where(np.arange(60) == 3, np.nan, 20.0)
    with pytest.raises(ValueError, match="tmin of block 0"):
        block_ledgers([replace(plan, season=season)], [replace(warm, tmin=gap)])


def test_stage_sums_of_a_usual_year() -> None:
    assert usual_stage_sums((2, 3, 1, 0), np.arange(10.0)) == (1.0, 9.0, 5.0, 0.0)
    assert usual_stage_sums((2, 3, 1, 0), np.ones(6)) == (2.0, 3.0, 1.0, 0.0)
    with pytest.raises(ValueError, match="daily has 3 days; the stages take 6"):
        usual_stage_sums((2, 3, 1, 0), np.zeros(3))


@pytest.mark.parametrize(
    ("change", "told"),
    [
        ({"method": "hourly"}, "choose one of mean, clipped, sine"),
        ({"base_c": 40.0}, "base_c is 40"),
        ({"upper_c": 5.0}, "upper_c is 5"),
        ({"stage_sums": (1.0, 2.0, 3.0)}, "give four sums"),
        ({"stage_sums": (1.0, 2.0, 3.0, float("nan"))}, "give four sums"),
        ({"stage_sums": (0.0, 0.0, 0.0, 0.0)}, "all zero"),
    ],
)
def test_wrong_degree_days_are_refused_by_name(change: dict[str, object], told: str) -> None:
    with pytest.raises(ValueError, match=told):
        replace(WARM, **change)  # type: ignore[arg-type]
    with pytest.raises(ValueError, match="choose one of"):
        degree_days(20.0, 10.0, 10.0, method="hourly")
