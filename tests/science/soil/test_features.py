"""Salt, water table, subsoil by layer, several waters on one day: in the ledger."""

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from app.science.ledger import BlockPlan, block_ledgers, closure_error
from app.science.soil.capillary import RisingSoil, rise_to_roots, steady_rise
from app.science.soil.evaporation import emitter_fraction, lines_fraction, weighted_fraction
from app.science.soil.profile import Layer, Profile
from tests.science.soil.fields import field, weather

SILT = RisingSoil(conductivity_mm_d=400.0, air_entry_m=0.4, pore_index=0.2)


def test_salinity_multiplies_the_stress_of_water() -> None:
    """FAO-56 eq 92: Ks = Ks of salinity x Ks of water; unstressed ETc stays."""
    plan = field(40, coefficients="single")
    sweet = block_ledgers([plan], [weather(40)])[0]
    salty = block_ledgers([replace(plan, salt_factor=0.8)], [weather(40)])[0]
    assert salty.ks[0] == 0.8
    assert salty.et_actual_mm[0] == pytest.approx(0.8 * sweet.et_actual_mm[0])
    np.testing.assert_array_equal(salty.etc_potential_mm, sweet.etc_potential_mm)
    taw, raw = salty.taw_mm[0], salty.raw_mm[0]
    water = (taw - salty.depletion_mm[30]) / (taw - raw)
    assert salty.ks[31] == pytest.approx(0.8 * water)
    assert closure_error(salty) < 1e-9


@pytest.mark.parametrize("n", [2.3, 2.6, 4.0])
def test_the_steady_rise_solves_the_flow_equation(n: float) -> None:
    """Darcy's law for a steady flow q through K = Ks (h / he)^-n: the height is the integral of
    dh / (1 + q / K) from the water table to dry soil, summed here in steps."""
    conductivity, entry = 300.0, 0.3
    for distance in (0.8, 1.5, 3.0):
        flow = float(steady_rise(distance, conductivity, entry, n))
        tension = np.concatenate(([0.0], np.geomspace(1e-6, 1e6, 400_000)))
        step = 1.0 / (1.0 + flow / conductivity * (tension / entry) ** n)
        assert float(np.trapezoid(step, tension)) == pytest.approx(distance, rel=2e-3)


def test_rise_falls_with_distance_and_holds_its_bounds() -> None:
    distance = np.linspace(-1.0, 5.0, 60)
    flow = steady_rise(distance, 300.0, 0.3, 2.6)
    assert (np.diff(flow) <= 0.0).all()
    assert flow[0] == 300.0
    table = np.array([0.9, 1.9, 2.1, np.nan])
    np.testing.assert_array_equal(rise_to_roots(SILT, table, 1.0, 5.0), [5.0, 5.0, 0.0, 0.0])
    assert np.isnan(rise_to_roots(SILT, 1.0, np.nan, 5.0))
    assert float(rise_to_roots(SILT, 9.0, 1.0, 0.0)) == 0.0
    slow = RisingSoil(conductivity_mm_d=5.0, air_entry_m=0.3, pore_index=0.2, reach_m=3.0)
    far = float(rise_to_roots(slow, 3.5, 1.0, 5.0))
    assert far == float(steady_rise(2.5, 5.0, 0.3, 2.6)) < 5.0
    with pytest.raises(ValueError, match="pore_index is 9"):
        replace(SILT, pore_index=9.0)


def test_a_water_table_feeds_the_roots_and_never_overfills_them() -> None:
    days = 30
    plan = field(days, root_m=1.0, coefficients="single", depletion_fraction=0.2)
    wet = replace(plan, water_table_m=np.full(days, 1.5), rising_soil=SILT)
    ledger = block_ledgers([wet], [weather(days)])[0]
    np.testing.assert_allclose(ledger.capillary_rise_mm, ledger.et_actual_mm)
    np.testing.assert_allclose(ledger.depletion_mm, ledger.opening_depletion_mm)
    full = replace(wet, initial_depletion_mm=2.0)
    ledger = block_ledgers([full], [weather(days)])[0]
    assert ledger.capillary_rise_mm[0] == 2.0
    assert ledger.deep_percolation_mm.max() == 0.0
    assert closure_error(ledger) < 1e-9
    deep = replace(plan, water_table_m=np.full(days, np.nan), rising_soil=SILT)
    assert block_ledgers([deep], [weather(days)])[0].capillary_rise_mm.max() == 0.0


def layered(shares: tuple[float, float], **given: Any) -> BlockPlan:
    plan = field(60, perennial=False, coefficients="single", **given)
    soil = Profile(layers=(Layer(0.6, 0.30, 0.15, 0.45), Layer(2.0, 0.28, 0.08, 0.45)), rew_mm=8.0)
    return replace(plan, profile=soil, subsoil_layer_depletion=shares)


def test_roots_take_over_each_layers_own_depletion() -> None:
    """Roots 0.2 to 1.2 m, the first layer dry by a half, the second full, and the reverse: what
    they take over is 1000 (FC - theta) dZ (FAO-56 chapter 8, after eq 86)."""
    for shares, expected in (((0.5, 0.0), 1000 * 0.075 * 0.4), ((0.0, 0.5), 1000 * 0.10 * 0.6)):
        ledger = block_ledgers([layered(shares)], [weather(60, eto=0.0)])[0]
        assert ledger.root_depth_m[-1] == pytest.approx(1.2)
        assert ledger.root_growth_depletion_mm.sum() == pytest.approx(expected)
        inside = ledger.root_growth_depletion_mm[ledger.root_depth_m <= 0.6]
        assert (inside.sum() > 0.0) == (shares[0] > 0.0)
        assert ledger.subsoil_depletion_mm[-1] == pytest.approx(0.0, abs=1e-9)
        assert closure_error(ledger) < 1e-9


def test_percolation_fills_a_layered_subsoil_from_its_top() -> None:
    """30 mm (the first layer's lack) of percolation on the first day: roots in it find it full,
    and the second layer is as dry as before."""
    plan = layered((0.5, 0.5), net={0: 30.0})
    ledger = block_ledgers([plan], [weather(60, eto=0.0)])[0]
    assert ledger.deep_percolation_mm[0] == pytest.approx(30.0)
    inside = ledger.root_depth_m <= 0.6
    assert ledger.root_growth_depletion_mm[inside].sum() == pytest.approx(0.0, abs=1e-9)
    assert ledger.root_growth_depletion_mm.sum() == pytest.approx(1000 * 0.10 * 0.6)


def test_rain_and_irrigation_of_one_day() -> None:
    """FAO-56 chapter 7 (from memory): the fractions by the depths of both; the default leaves it
    to the irrigation. Rain below 3 mm never counts."""
    drip = field(3, net={1: 10.0}, fw=0.4, layer_mm=20.0)
    mean = replace(drip, same_day="weighted")
    for rain, expected in ((10.0, 0.7), (2.0, 0.4)):
        sky = weather(3, eto=0.0, rain={1: rain})
        own, both = block_ledgers([drip, mean], [sky, sky])
        fell = 20.0 - own.evaporation_layer_depletion_mm[1]
        assert fell == pytest.approx(min(rain + 10.0 / 0.4, 20.0))
        fell = 20.0 - both.evaporation_layer_depletion_mm[1]
        assert fell == pytest.approx(min(rain + 10.0 / expected, 20.0))


def test_fractions_of_several_emitters_and_lines() -> None:
    assert float(weighted_fraction([10.0, 30.0], [0.4, 1.0])) == pytest.approx(0.85)
    assert np.isnan(weighted_fraction([0.0, np.nan], [0.4, 1.0]))
    assert float(weighted_fraction([np.nan, 5.0], [np.nan, 0.3])) == pytest.approx(0.3)
    many = weighted_fraction(np.array([[10.0, 1.0], [30.0, 1.0]]), np.array([[0.4], [1.0]]))
    np.testing.assert_allclose(many, [0.85, 0.7])
    np.testing.assert_allclose(lines_fraction([[0.3, 0.6], [0.2, 0.6]]), [0.5, 1.0])
    assert np.isnan(lines_fraction([0.3, np.nan]))
    # Four emitters 1 m apart, strips 1.2 m wide, trees 6 m by 5 m; 0.96 m at most between them.
    assert float(emitter_fraction(4, 1.0, 1.2, 30.0)) == pytest.approx(4 * 0.96 * 1.2 / 30.0)
    assert float(emitter_fraction(40, 1.0, 1.2, 30.0)) == 1.0
    assert np.isnan(emitter_fraction(4, 1.0, np.nan, 30.0))


@pytest.mark.parametrize(
    ("change", "told"),
    [
        ({"salt_factor": 1.2}, "salt_factor is 1.2"),
        ({"same_day": "sum"}, "choose irrigation or weighted"),
        ({"water_table_m": np.ones(3)}, "needs rising_soil"),
        ({"subsoil_layer_depletion": (0.1, 0.2)}, "has 2 values; the profile has 1 layers"),
        ({"subsoil_layer_depletion": (1.5,)}, "subsoil_layer_depletion is 1.5"),
    ],
)
def test_a_wrong_plan_is_refused_by_name(change: dict[str, object], told: str) -> None:
    with pytest.raises(ValueError, match=told):
        replace(field(3), **change)  # type: ignore[arg-type]
