"""Ranges of many blocks at once: the same bits as one by one. Source: our own rule (regression)."""

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from app.science.ledger import block_ledgers, ensemble_depletion, ensemble_depletions
from app.science.outlook import ensemble
from app.science.outlook.ensemble import _percentiles
from tests.science.random_blocks import random_blocks
from tests.science.soil.fields import field, weather

MEMBERS = 60


def options(seed: int, days: list[int]) -> list[dict[str, Any]]:
    """Every option of a range, for some blocks."""
    rng = np.random.default_rng(seed)
    found: list[dict[str, Any]] = []
    for i, n in enumerate(days):
        told = np.where(rng.random((n // 2, 7)) < 0.5, np.nan, rng.uniform(0, 9, (n // 2, 7)))
        found.append(
            {
                "rn_share": rng.uniform(0.3, 0.9, n) if i % 2 else None,
                "rain_distance_km": 7.0 * (i % 3),
                "initial_unknown": i % 4 == 0,
                "ahead": ensemble.Ahead(n - n // 2, told, 2.0 * told) if i % 5 == 0 else None,
            }
        )
    return found


@pytest.mark.parametrize("columns", [8192, 150])
def test_many_blocks_give_the_bits_of_each_alone(
    columns: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """In one chunk and in several, with starts, lengths, soils and options of all kinds."""
    monkeypatch.setattr(ensemble, "COLUMNS", columns)
    plans, weather = random_blocks(12, 25, most_days=70)
    given = options(12, [plan.days for plan in plans])
    columns_given = {name: [one[name] for one in given] for name in given[0]}
    many = ensemble_depletions(plans, weather, range(25), MEMBERS, **columns_given)
    for i, (plan, sky) in enumerate(zip(plans, weather, strict=True)):
        low, high = ensemble_depletion(plan, sky, i, MEMBERS, **given[i])
        np.testing.assert_array_equal(many[i][0], low)
        np.testing.assert_array_equal(many[i][1], high)
        assert low.shape == (plan.days,)


def test_the_member_that_departs_from_nothing_is_the_ledger() -> None:
    """With no other member the range is the ledger's own depletion, through the other day loop."""
    plans, weather = random_blocks(21, 30, most_days=90)
    ranges = ensemble_depletions(plans, weather, range(30), members=0)
    for ledger, (low, high) in zip(block_ledgers(plans, weather), ranges, strict=True):
        np.testing.assert_array_equal(low, ledger.depletion_mm)
        np.testing.assert_array_equal(high, ledger.depletion_mm)


def test_defaults_no_plans_and_wrong_counts() -> None:
    plans, weather = random_blocks(3, 3, most_days=20)
    assert ensemble_depletions([], [], []) == []
    many = ensemble_depletions(plans, weather, [5, 6, 7])
    low, high = ensemble_depletion(plans[2], weather[2], 7)
    np.testing.assert_array_equal(many[2][0], low)
    np.testing.assert_array_equal(many[2][1], high)
    with pytest.raises(ValueError, match="seeds has 2 entries for 3 plans"):
        ensemble_depletions(plans, weather, [1, 2])
    with pytest.raises(ValueError, match="weather has 1 entries"):
        ensemble_depletions(plans, weather[:1], [1, 2, 3])
    with pytest.raises(ValueError, match="initial_unknown has 1 entries"):
        ensemble_depletions(plans, weather, [1, 2, 3], initial_unknown=[True])


@pytest.mark.parametrize("count", [1, 2, 7, 11, 201, 250])
def test_percentiles_are_numpys(count: int) -> None:
    values = np.random.default_rng(count).normal(size=(4, 3, count))
    expected = np.percentile(values, [10.0, 90.0], axis=-1)
    np.testing.assert_allclose(_percentiles(values.copy()), expected, rtol=1e-12)


def test_the_subsoil_is_as_uncertain_as_the_root_zone() -> None:
    """TAW's 10 % (working value) goes for the soil that roots have yet to enter: what they take
    over of a half dry subsoil varies with it, known evenly or by layer."""
    plan = field(40, perennial=False, subsoil=0.5, coefficients="single")
    layered = replace(plan, subsoil_layer_depletion=(0.5,))
    for one in (plan, layered):
        taken = float(block_ledgers([one], [weather(40, eto=0.0)])[0].depletion_mm[-1])
        low, high = ensemble_depletion(one, weather(40, eto=0.0), seed=9, members=4000)
        assert high[-1] - low[-1] == pytest.approx(2.563 * 0.10 * taken, rel=0.06)
        assert high[-1] > taken > low[-1]
