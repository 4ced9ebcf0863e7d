"""The usual weather ahead and the filling of gaps."""

import numpy as np
import pytest

from app.science.outlook.usual import fill_gaps, persistence, usual_ahead


def test_a_constant_ratio_carries_on_with_the_seasons_shape() -> None:
    ra = np.linspace(30.0, 40.0, 60)
    ahead = np.array([41.0, 42.0, 43.0])
    np.testing.assert_allclose(usual_ahead(0.15 * ra, ra, ahead), 0.15 * ahead)


def test_yesterdays_departure_fades_with_the_records_own_persistence() -> None:
    rng = np.random.default_rng(1)
    ratio = np.zeros(2000)
    for i in range(1, 2000):
        ratio[i] = 0.6 * ratio[i - 1] + rng.normal(0.0, 0.01)
    ratio += 0.15
    rho = persistence(ratio)
    assert rho == pytest.approx(0.6, abs=0.1)
    assert rho == pytest.approx(np.corrcoef(ratio[:-1], ratio[1:])[0, 1], abs=1e-3)
    ra = np.full(2000, 38.0)
    ahead = usual_ahead(ratio * ra, ra, np.full(5, 38.0)) / 38.0
    mean = ratio[-30:].mean()
    recent = persistence(ratio[-60:])
    np.testing.assert_allclose(ahead, mean + (ratio[-1] - mean) * recent ** np.arange(1, 6))
    # only the last 60 days speak: a longer record foretells the same
    longer = usual_ahead(ratio[-60:] * ra[-60:], ra[-60:], np.full(5, 38.0)) / 38.0
    np.testing.assert_array_equal(longer, ahead)


def test_nothing_known_gives_nan_and_a_missing_yesterday_no_departure() -> None:
    ra = np.full(40, 38.0)
    assert np.isnan(usual_ahead(np.full(40, np.nan), ra, ra[:3])).all()
    eto = np.full(40, 5.0)
    eto[-1] = np.nan
    np.testing.assert_allclose(usual_ahead(eto, ra, ra[:3]), 5.0)


def test_gaps_are_filled_from_the_days_before_them_alone() -> None:
    rng = np.random.default_rng(4)
    ra = np.linspace(35.0, 42.0, 120)
    eto = 0.15 * ra + rng.normal(0.0, 0.4, 120)
    eto[[0, 50, 51, 52, 90]] = np.nan
    filled, was = fill_gaps(eto, ra)
    assert was.sum() == 4
    assert np.isnan(filled[0])
    assert not was[0]
    np.testing.assert_array_equal(filled[50:53], usual_ahead(eto[:50], ra[:50], ra[50:53]))
    changed = eto.copy()
    changed[60:] *= 1.5
    np.testing.assert_array_equal(fill_gaps(changed, ra)[0][:60], filled[:60])
    np.testing.assert_array_equal(filled[~was & ~np.isnan(eto)], eto[~was & ~np.isnan(eto)])


def test_a_gap_that_lasts_to_the_end_and_a_record_of_nothing() -> None:
    ra = np.full(20, 38.0)
    eto = np.full(20, 5.0)
    eto[10:] = np.nan
    filled, was = fill_gaps(eto, ra)
    np.testing.assert_allclose(filled, 5.0)
    assert was[10:].all()
    nothing, none = fill_gaps(np.full(20, np.nan), ra)
    assert np.isnan(nothing).all()
    assert not none.any()
