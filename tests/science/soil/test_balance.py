"""The day loop: order of a day, drainage, runoff, subsoil store, corrections."""

import numpy as np
import pytest

from app.science.ledger import block_ledgers, closure_error
from app.science.soil.balance import CHUNK
from app.science.soil.profile import Layer, Profile
from app.science.soil.runoff import dry_curve_number, runoff, wet_curve_number
from tests.science.soil.fields import field, weather


def test_drainage_over_days_lets_out_equal_parts() -> None:
    """drainage_days 2 without ET: 30 mm above field capacity leave as 10, 10, 10."""
    plan = field(6, drainage_days=2.0, net={1: 30.0})
    ledger = block_ledgers([plan], [weather(6, eto=0.0)])[0]
    np.testing.assert_allclose(ledger.deep_percolation_mm, [0, 10, 10, 10, 0, 0], atol=1e-12)
    np.testing.assert_allclose(ledger.depletion_mm, [0, -20, -10, 0, 0, 0], atol=1e-12)


def test_above_saturation_leaves_the_same_day() -> None:
    """Root zone 1 m, 0.10 between field capacity and saturation: 100 mm can be held."""
    plan = field(4, drainage_days=1.0, net={0: 130.0}, root_m=1.0, saturation=0.40)
    ledger = block_ledgers([plan], [weather(4, eto=0.0)])[0]
    np.testing.assert_allclose(ledger.deep_percolation_mm, [30 + 50, 50, 0, 0], atol=1e-9)


def test_drainage_at_once_by_default() -> None:
    plan = field(3, net={1: 30.0})
    ledger = block_ledgers([plan], [weather(3, eto=0.0)])[0]
    np.testing.assert_allclose(ledger.deep_percolation_mm, [0, 30, 0])
    assert ledger.standing.tolist() == ["wet", "wet", "wet"]


def test_irrigation_counts_before_the_days_stress_and_et() -> None:
    """Wetting early (FAO-56 Annex 8): a field at the wilting point, refilled, transpires in full
    that same day."""
    plan = field(1, net={0: 200.0}, depletion_fraction=1.0, coefficients="single")
    ledger = block_ledgers([plan], [weather(1, eto=5.0)])[0]
    assert ledger.ks[0] == 1.0
    assert ledger.et_actual_mm[0] == pytest.approx(5.0)


def test_evapotranspiration_stops_at_the_wilting_point() -> None:
    plan = field(200, coefficients="dual")
    ledger = block_ledgers([plan], [weather(200, eto=12.0)])[0]
    assert ledger.depletion_mm[-1] == pytest.approx(ledger.taw_mm[-1], rel=1e-3)
    assert (ledger.depletion_mm <= ledger.taw_mm).all()
    assert closure_error(ledger) < 1e-9


def test_runoff_follows_the_wetness_of_the_evaporation_layer() -> None:
    """Condition I on a dry, III on a wet evaporation layer (J. Irrig. Drain. Eng. 131:2-13,
    2005, from memory); the average one without such a layer (single coefficients)."""
    rain = {0: 60.0}
    for layer, expected in ((0.0, wet_curve_number(75.0)), (22.0, dry_curve_number(75.0))):
        plan = field(1, curve_number=75.0, layer_mm=layer)
        ledger = block_ledgers([plan], [weather(1, rain=rain)])[0]
        assert ledger.runoff_mm[0] == pytest.approx(float(runoff(60.0, expected)))
    plan = field(1, curve_number=75.0, layer_mm=22.0, coefficients="single")
    ledger = block_ledgers([plan], [weather(1, rain=rain)])[0]
    assert ledger.runoff_mm[0] == pytest.approx(float(runoff(60.0, 75.0)))
    assert np.isnan(ledger.evaporation_layer_depletion_mm[0])


def test_rain_that_runs_off_wets_neither_roots_nor_surface() -> None:
    plan = field(1, curve_number=100.0, layer_mm=22.0, depletion_fraction=0.5)
    ledger = block_ledgers([plan], [weather(1, eto=0.0, rain={0: 20.0})])[0]
    assert ledger.runoff_mm[0] == pytest.approx(20.0)
    assert ledger.evaporation_layer_depletion_mm[0] == 22.0
    assert ledger.depletion_mm[0] == pytest.approx(0.5 * ledger.taw_mm[0])


def test_irrigation_of_a_part_wets_that_part_deeper() -> None:
    """FAO-56 eq 77: I / fw on the wetted fraction of the evaporation layer."""
    plan = field(1, net={0: 5.0}, fw=0.5, layer_mm=18.0)
    ledger = block_ledgers([plan], [weather(1, eto=0.0)])[0]
    assert ledger.evaporation_layer_depletion_mm[0] == pytest.approx(18.0 - 5.0 / 0.5)


def test_p_moves_with_the_whole_unstressed_et() -> None:
    """FAO-56 table 22, note 2: p = 0.5 + 0.04 (5 - ETc), ETc with its evaporation."""
    plan = field(6, k=0.7, net={0: 10.0})
    ledger = block_ledgers([plan], [weather(6, eto=6.0)])[0]
    assert ledger.ke[0] > 0.3
    p = 0.5 + 0.04 * (5.0 - ledger.etc_potential_mm)
    np.testing.assert_allclose(ledger.raw_mm, p * ledger.taw_mm)


def test_the_limit_is_mad_of_taw_else_raw_and_all_of_taw_without_a_crop() -> None:
    days = 240  # the season ends with day 235
    by_mad = block_ledgers([field(days, mad=0.4, perennial=False)], [weather(days)])[0]
    by_raw = block_ledgers([field(days, perennial=False)], [weather(days)])[0]
    np.testing.assert_allclose(by_mad.limit_mm[:235], 0.4 * by_mad.taw_mm[:235])
    np.testing.assert_array_equal(by_raw.limit_mm[:235], by_raw.raw_mm[:235])
    for ledger in (by_mad, by_raw):
        np.testing.assert_array_equal(ledger.limit_mm[235:], ledger.taw_mm[235:])
    tree = block_ledgers([field(days, mad=0.4)], [weather(days)])[0]
    np.testing.assert_allclose(tree.limit_mm, 0.4 * tree.taw_mm)


def test_rain_outside_the_wetted_roots_is_told_apart() -> None:
    plan = field(2, roots=0.4, net={0: 6.0})
    ledger = block_ledgers([plan], [weather(2, rain={1: 10.0})])[0]
    np.testing.assert_allclose(ledger.rain_outside_roots_mm, [0.0, 6.0])
    np.testing.assert_allclose(ledger.taw_mm, 0.4 * plan.profile.taw(ledger.root_depth_m))
    assert closure_error(ledger) < 1e-9


def test_roots_take_over_the_depletion_of_the_soil_they_enter() -> None:
    """A dry subsoil (half empty) hands half of the new roots' TAW on as depletion; one at field
    capacity (FAO-56) hands on nothing."""
    for fraction in (0.0, 0.5):
        plan = field(40, perennial=False, subsoil=fraction, coefficients="single")
        ledger = block_ledgers([plan], [weather(40, eto=0.0)])[0]
        grown = ledger.taw_mm[-1] - ledger.taw_mm[0]
        assert grown > 50.0
        assert ledger.root_growth_depletion_mm.sum() == pytest.approx(fraction * grown)
        assert ledger.depletion_mm[-1] == pytest.approx(fraction * grown)


def test_percolation_refills_the_subsoil() -> None:
    plan = field(3, perennial=False, subsoil=0.5, net={0: 40.0}, coefficients="single")
    ledger = block_ledgers([plan], [weather(3, eto=0.0)])[0]
    dry = block_ledgers(
        [field(3, perennial=False, subsoil=0.5, coefficients="single")], [weather(3, eto=0.0)]
    )[0]
    assert dry.subsoil_depletion_mm[0] - ledger.subsoil_depletion_mm[0] == pytest.approx(40.0)


def test_a_correction_shifts_the_close_within_what_the_soil_holds() -> None:
    plan = field(3, correction={0: -20.0, 1: 12.0, 2: -1e4}, coefficients="single")
    ledger = block_ledgers([plan], [weather(3, eto=0.0)])[0]
    np.testing.assert_allclose(ledger.depletion_mm[:2], [20.0, 8.0])
    assert ledger.depletion_mm[2] == ledger.taw_mm[2]
    assert ledger.correction_mm[2] == pytest.approx(8.0 - ledger.taw_mm[2])
    assert closure_error(ledger) < 1e-9


def test_capillary_rise_wets() -> None:
    plan = field(1, rise={0: 1.5}, depletion_fraction=0.5, coefficients="single")
    ledger = block_ledgers([plan], [weather(1, eto=5.0)])[0]
    assert ledger.depletion_mm[0] == pytest.approx(0.5 * ledger.taw_mm[0] - 1.5 + 5.0)


def test_drip_under_the_canopy_evaporates_less() -> None:
    """FAO-56, note to eq 75: few (1 - 2/3 fc) where emitters stand under the canopy."""
    open_plan = field(5, k=0.6, net={0: 5.0}, fw=0.35)
    shaded = field(5, k=0.6, net={0: 5.0}, fw=0.35, under_canopy=True)
    under, over = block_ledgers([shaded, open_plan], [weather(5), weather(5)])
    assert under.ke[0] < over.ke[0]
    assert under.kcb[0] == over.kcb[0]


def test_a_block_more_than_a_chunk_still_computes_each_alone() -> None:
    plans = [field(2, net={0: float(i % 50)}) for i in range(60)]
    skies = [weather(2) for _ in plans]
    ledgers = block_ledgers(plans, skies)
    stretched = block_ledgers(plans * (CHUNK // 60 + 2), skies * (CHUNK // 60 + 2))
    for i in (0, 17, 59):
        for place in range(i, len(stretched), 60):
            assert stretched[place].depletion_mm[-1] == ledgers[i].depletion_mm[-1]


def test_profile_sums_its_layers_and_goes_on_below_the_last() -> None:
    profile = Profile(
        layers=(Layer(0.3, 0.30, 0.10, 0.45), Layer(1.0, 0.25, 0.15, 0.40)), rew_mm=8.0
    )
    np.testing.assert_allclose(profile.taw([0.2, 0.3, 0.5, 2.0]), [40.0, 60.0, 80.0, 230.0])
    np.testing.assert_allclose(profile.saturation_excess([0.3, 0.5]), [45.0, 75.0])
    assert profile.tew == pytest.approx(1000 * (0.30 - 0.05) * 0.10)
    assert np.isnan(profile.taw(np.nan))


@pytest.mark.parametrize(
    ("change", "told"),
    [
        ({"layers": ()}, "layers is empty"),
        ({"layers": (Layer(0.5, 0.3, 0.1, 0.4), Layer(0.4, 0.3, 0.1, 0.4))}, "must increase"),
        ({"rew_mm": 99.0}, "rew_mm is 99"),
        ({"curve_number": 0.5}, "curve_number is 0.5"),
        ({"drainage_days": -1.0}, "drainage_days is -1"),
        ({"evaporation_depth_m": 1.0}, "evaporation_depth_m is 1"),
    ],
)
def test_a_wrong_profile_is_refused_by_name(change: dict[str, object], told: str) -> None:
    good = {"layers": (Layer(1.0, 0.3, 0.1, 0.4),), "rew_mm": 8.0}
    with pytest.raises(ValueError, match=told):
        Profile(**{**good, **change})  # type: ignore[arg-type]


def test_a_layer_needs_its_contents_in_order() -> None:
    with pytest.raises(ValueError, match="wilting point < field capacity < saturation"):
        Layer(1.0, 0.1, 0.3, 0.4)
