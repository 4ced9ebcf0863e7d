"""The ledger: closes every day, holds its bounds, and does not depend on company."""

from dataclasses import fields, replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.science.crop.season import CropSeason
from app.science.ledger import (
    SCALAR_BLOCKS,
    Ahead,
    BlockLedger,
    BlockPlan,
    BlockWeather,
    block_ledgers,
    close_standing,
    closure_error,
    ensemble_depletion,
)
from app.science.soil.profile import Layer, Profile
from tests.science.random_blocks import random_blocks
from tests.science.soil.fields import field, weather

COLUMNS = [column.name for column in fields(BlockLedger)]


def assert_same(one: BlockLedger, other: BlockLedger) -> None:
    for name in COLUMNS:
        np.testing.assert_array_equal(getattr(one, name), getattr(other, name), err_msg=name)


@settings(max_examples=10, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_a_hundred_random_seasons_close_and_stay_within_the_soil(seed: int) -> None:
    """Ten draws of a hundred: 1,000 random seasons."""
    plans, weather = random_blocks(seed, 100)
    for plan, sky, ledger in zip(plans, weather, block_ledgers(plans, weather), strict=True):
        assert closure_error(ledger) < 1e-9
        assert_within_the_soil(plan, ledger)
        np.testing.assert_array_equal(ledger.rain_mm, sky.rain)
        assert (ledger.runoff_mm <= ledger.rain_mm + 1e-12).all()
        for name in COLUMNS:
            if name.endswith(("_mm", "_m")) and "_p10" not in name and "_p90" not in name:
                single = plan.season.coefficients == "single"
                absent = single and name == "evaporation_layer_depletion_mm"
                assert absent or np.isfinite(getattr(ledger, name)).all(), name


def assert_within_the_soil(plan: BlockPlan, ledger: BlockLedger) -> None:
    profile, tiny = plan.profile, 1e-9
    wettest = np.zeros(plan.days)
    if profile.drainage_days > 0.0:
        above = profile.saturation_excess(ledger.root_depth_m)
        wettest = -plan.root_wetted_fraction * above
    assert (ledger.depletion_mm <= ledger.taw_mm + tiny).all()
    assert (ledger.depletion_mm >= wettest - tiny).all()
    assert (ledger.subsoil_depletion_mm >= -tiny).all()
    deepest = profile.taw(max(plan.season.root_max_m, ledger.root_depth_m.max()))
    below = plan.root_wetted_fraction * float(deepest) - ledger.taw_mm
    assert (ledger.subsoil_depletion_mm <= below + 1e-6).all()
    if plan.season.coefficients == "dual":
        layer = ledger.evaporation_layer_depletion_mm
        assert (layer >= -tiny).all()
        assert (layer <= profile.tew + tiny).all()
    assert ((ledger.ks >= 0.0) & (ledger.ks <= 1.0)).all()
    assert (ledger.et_actual_mm <= ledger.etc_potential_mm + tiny).all()
    evaporation = np.nan_to_num(ledger.ke) * np.maximum(ledger.eto_mm, 0.0)
    assert (evaporation <= ledger.et_actual_mm + tiny).all()
    assert (ledger.deep_percolation_mm >= 0.0).all()
    assert (np.diff(ledger.root_depth_m) >= -tiny).all()


@settings(max_examples=10, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_alone_in_company_and_in_any_order_a_block_gives_the_same_bits(seed: int) -> None:
    """Alone runs in plain floats, in company in arrays."""
    plans, weather = random_blocks(seed, 12, most_days=60)
    assert len(plans) > SCALAR_BLOCKS
    together = block_ledgers(plans, weather)
    order = np.random.default_rng(seed).permutation(len(plans))
    mixed = block_ledgers([plans[i] for i in order], [weather[i] for i in order])
    for place, i in enumerate(order):
        assert_same(together[i], mixed[place])
    for plan, sky, ledger in zip(plans, weather, together, strict=True):
        assert_same(block_ledgers([plan], [sky])[0], ledger)


def test_more_days_leave_earlier_days_alone() -> None:
    """Yesterday never depends on tomorrow (but for stage means, which look ahead by design)."""
    plans, weather = random_blocks(4, 20, most_days=80)
    for plan, sky in zip(plans, weather, strict=True):
        if plan.days < 2 or plan.season.climate_adjustment == "stage_mean":
            continue
        whole = block_ledgers([plan], [sky])[0]
        part = block_ledgers([shortened(plan, plan.days // 2)], [cut(sky, plan.days // 2)])[0]
        np.testing.assert_array_equal(whole.depletion_mm[: plan.days // 2], part.depletion_mm)


def cut(weather: BlockWeather, days: int) -> BlockWeather:
    columns = {k: v if v is None else v[:days] for k, v in vars(weather).items()}
    return BlockWeather(**columns)


def shortened(plan: BlockPlan, days: int) -> BlockPlan:
    daily = (
        *("irrigation_gross", "irrigation_net", "irrigation_fw"),
        *("correction", "capillary_rise", "water_table_m"),
    )
    values = {name: getattr(plan, name) for name in daily}
    return replace(
        plan, days=days, **{k: v[:days] if v is not None else None for k, v in values.items()}
    )


SOIL = Profile(layers=(Layer(2.0, 0.30, 0.15, 0.45),), rew_mm=8.0)


def constant(
    days: int, kind: str, k: float, *, eto: float = 5.0, depletion: float = 0.0
) -> BlockLedger:
    """A field whose coefficient, roots and weather never change; no water comes in."""
    season = CropSeason(
        planting=np.datetime64("2025-06-01"),
        stage_days=(0, 0, 200, 0),
        coefficients=kind,
        k_ini=k,
        k_mid=k,
        k_end=k,
        height_max_m=0.5,
        root_min_m=1.0,
        root_max_m=1.0,
        depletion_fraction=0.5,
        climate_adjustment="none",
        perennial=True,
    )
    nothing = np.zeros(days)
    plan = BlockPlan(
        season=season,
        profile=SOIL,
        start=np.datetime64("2025-06-01"),
        days=days,
        irrigation_gross=nothing,
        irrigation_net=nothing,
        irrigation_fw=np.full(days, np.nan),
        initial_depletion_mm=depletion,
    )
    weather = BlockWeather(
        eto=np.full(days, eto),
        rain=nothing,
        u2=np.full(days, 2.0),
        rh_min=np.full(days, 45.0),
        rung=np.ones(days, dtype=np.int8),
        rn=np.full(days, 12.0),
    )
    return block_ledgers([plan], [weather])[0]


def test_single_dry_down_is_linear_above_the_limit_and_exponential_below() -> None:
    """Closed form of FAO-56 eq 84 and 85 with constant ETc = 5 mm/d, where p is the table's 0.5:
    D = 5 n up to RAW = 75 mm, then TAW - D shrinks by 1 - 5 / (TAW - RAW) a day."""
    ledger = constant(60, "single", 1.0)
    day = np.arange(1, 61)
    linear = 5.0 * day
    below = day > 15
    expected = np.where(below, 150.0 - 75.0 * (1.0 - 5.0 / 75.0) ** (day - 15), linear)
    np.testing.assert_allclose(ledger.depletion_mm, expected, rtol=0, atol=1e-9)
    np.testing.assert_array_equal(ledger.ks[:15], 1.0)
    np.testing.assert_allclose(ledger.raw_mm, 75.0)


def test_dual_dry_down_follows_the_two_stages_of_evaporation() -> None:
    """Closed form of FAO-56 eq 71, 74 and 77 with constant ETo and no rain. TEW 22.5, REW 8 mm;
    Kc max 1.2 (u2 2 m/s, RHmin 45 %), few = 1 - fc. First stage: De grows by the same depth each
    day until it passes REW; second: TEW - De shrinks by the same factor each day."""
    kcb, eto = 0.4, 4.0
    ledger = constant(25, "dual", kcb, eto=eto)
    few = 1.0 - ((kcb - 0.15) / (1.2 - 0.15)) ** (1.0 + 0.5 * 0.5)
    daily = (1.2 - kcb) * eto / few
    layer = ledger.evaporation_layer_depletion_mm
    first = int(np.ceil(8.0 / daily))
    np.testing.assert_allclose(layer[:first], daily * np.arange(1, first + 1), atol=1e-9)
    factor = 1.0 - daily / (22.5 - 8.0)
    left = (22.5 - layer[first - 1]) * factor ** np.arange(1, 26 - first)
    np.testing.assert_allclose(layer[first:], 22.5 - left, atol=1e-9)
    evaporation = ledger.ke * eto
    np.testing.assert_allclose(
        ledger.depletion_mm, np.cumsum(kcb * eto + evaporation), rtol=0, atol=1e-9
    )


def test_dual_dry_down_below_the_limit_is_exponential_once_the_surface_is_dry() -> None:
    """With the evaporation layer empty ET is Ks Kcb ETo, so that FAO-56 eq 84 and 85 give
    TAW - D shrinking by 1 - Kcb ETo / (TAW - RAW) a day; p = 0.5 + 0.04 (5 - 4)."""
    ledger = constant(160, "dual", 1.0, eto=4.0)
    left = ledger.taw_mm - ledger.depletion_mm
    stressed = (ledger.ks < 1.0) & (ledger.evaporation_layer_depletion_mm > 22.5 - 1e-9)
    days = np.flatnonzero(stressed)[1:]
    assert days.size > 50
    factor = 1.0 - 4.0 / (150.0 * (1.0 - 0.54))
    np.testing.assert_allclose(left[days], left[days - 1] * factor, rtol=1e-6)


def test_missing_weather_is_refused_with_its_column_and_date() -> None:
    plans, weather = random_blocks(1, 1)
    plan, sky = plans[0], weather[0]
    eto = sky.eto.copy()
    eto[plan.days // 2] = np.nan
    day = plan.start + np.timedelta64(plan.days // 2, "D")
    with pytest.raises(ValueError, match=f"eto of block 0 on {day} is missing"):
        block_ledgers([plan], [replace(sky, eto=eto)])
    with pytest.raises(ValueError, match=r"rain of block 0 on .* is negative"):
        block_ledgers([plan], [replace(sky, rain=sky.rain - 1.0)])
    with pytest.raises(ValueError, match="its plan has"):
        block_ledgers([plan], [replace(sky, u2=np.zeros(plan.days + 1))])
    with pytest.raises(ValueError, match="2 plans, but weather for 1"):
        block_ledgers([plan, plan], [sky])
    assert block_ledgers([], []) == []


def test_standing_at_a_close_follows_the_order_of_urgency() -> None:
    depletion = np.array([61.0, 55.0, 40.0, -1.0, 0.0, 10.0, 58.0])
    limit = np.full(7, 60.0)
    etc = np.array([5.0, 5.0, 5.0, 5.0, 70.0, 5.0, 0.0])
    expected = ["late", "due", "soon", "wet", "due", "easy", "easy"]
    assert close_standing(depletion, limit, etc).tolist() == expected


def test_the_range_is_the_same_for_the_same_seed_and_holds_the_ledger() -> None:
    plans, weather = random_blocks(7, 12, most_days=90)
    for plan, sky in zip(plans, weather, strict=True):
        ledger = block_ledgers([plan], [sky])[0]
        low, high = ensemble_depletion(plan, sky, seed=11)
        again = ensemble_depletion(plan, sky, seed=11)
        np.testing.assert_array_equal(low, again[0])
        np.testing.assert_array_equal(high, again[1])
        assert (low <= ledger.depletion_mm).all()
        assert (high >= ledger.depletion_mm).all()
        assert (high <= ledger.taw_mm * 1.6).all()


# p90 - p10 of a normal distribution, in standard deviations.
P10_TO_P90 = 2.563


def spread(plan: BlockPlan, sky: BlockWeather, day: int) -> float:
    """Width of the range on `day`, from members enough to know it within about 4 %."""
    low, high = ensemble_depletion(plan, sky, seed=9, members=4000, rn_share=np.zeros(plan.days))
    return float(high[day] - low[day])


def test_each_season_long_factor_has_its_own_width() -> None:
    """The working values: Kc 10 %, TAW 10 %, efficiency 8 %, rain 15 % and 1 mm."""
    et_only = field(10, coefficients="single")
    assert spread(et_only, weather(10), 9) == pytest.approx(P10_TO_P90 * 0.10 * 50.0, rel=0.06)
    empty = field(1, coefficients="single", depletion_fraction=1.0)
    taw = float(empty.profile.taw(1.2))
    assert spread(empty, weather(1, eto=0.0), 0) == pytest.approx(P10_TO_P90 * 0.1 * taw, rel=0.06)
    watered = field(1, coefficients="single", net={0: 40.0})
    watered = replace(watered, initial_depletion_mm=60.0, irrigation_gross=np.array([80.0]))
    expected = P10_TO_P90 * 0.08 * 40.0
    assert spread(watered, weather(1, eto=0.0), 0) == pytest.approx(expected, rel=0.06)
    rained = replace(field(1, coefficients="single"), initial_depletion_mm=60.0)
    expected = P10_TO_P90 * np.hypot(0.15 * 8.0, 1.0)
    wet = weather(1, eto=0.0, rain={0: 8.0})
    assert spread(rained, wet, 0) == pytest.approx(expected, rel=0.06)


def test_the_energys_uncertainty_is_half_persistent() -> None:
    """Rung 5, Rn 12 MJ: 12 %; over 20 days 0.12 sqrt(1/2 + 1/40) is left of it."""
    plan, sky = field(25, coefficients="single"), weather(25, eto=4.0)
    sky = replace(sky, rung=np.full(25, 5, dtype=np.int8))
    low, high = ensemble_depletion(plan, sky, seed=9, members=4000, rn_share=np.ones(25))
    share = np.hypot(0.10, 0.12 * np.sqrt(0.5 + 0.5 / 20.0))
    assert high[19] - low[19] == pytest.approx(P10_TO_P90 * share * 80.0, rel=0.08)


def test_rain_far_from_its_gauge_is_less_sure() -> None:
    """Working value: the error of rain has doubled at 20 km."""
    plan = replace(field(1, coefficients="single"), initial_depletion_mm=60.0)
    sky = weather(1, eto=0.0, rain={0: 8.0})
    width = [
        np.subtract(*ensemble_depletion(plan, sky, 9, 4000, rain_distance_km=km)[::-1])[0]
        for km in (0.0, 20.0)
    ]
    assert width[1] / width[0] == pytest.approx(2.0, rel=0.02)


def test_net_water_never_exceeds_what_was_applied() -> None:
    """Gross equal to net leaves no room for a better efficiency: p10 is the ledger itself."""
    plan = replace(
        field(1, coefficients="single", net={0: 40.0}),
        initial_depletion_mm=60.0,
        irrigation_gross=np.array([40.0]),
    )
    low, high = ensemble_depletion(plan, weather(1, eto=0.0), seed=2)
    assert low[0] == pytest.approx(20.0)
    assert high[0] > 21.0


def test_the_range_widens_with_a_poorer_rung_and_an_unknown_opening() -> None:
    good = constant_plan()
    plan, sky = good
    narrow = ensemble_depletion(plan, sky, seed=3)
    wide = ensemble_depletion(plan, replace(sky, rung=np.full(40, 8, dtype=np.int8)), seed=3)
    unknown = ensemble_depletion(plan, sky, seed=3, initial_unknown=True)
    assert (wide[1] - wide[0])[20] > (narrow[1] - narrow[0])[20]
    assert (unknown[1] - unknown[0])[0] > 5 * (narrow[1] - narrow[0])[0]


def test_days_added_at_the_end_leave_the_earlier_range_alone() -> None:
    plan, sky = constant_plan()
    whole = ensemble_depletion(plan, sky, seed=5)
    part = ensemble_depletion(shortened(plan, 15), cut(sky, 15), seed=5)
    np.testing.assert_array_equal(whole[0][:15], part[0])
    np.testing.assert_array_equal(whole[1][:15], part[1])


def test_sequences_ahead_replace_the_plans_weather() -> None:
    plan, sky = constant_plan()
    nothing = Ahead(30, np.zeros((10, 3)), np.zeros((10, 3)))
    low, _ = ensemble_depletion(plan, sky, seed=5, ahead=nothing)
    base = ensemble_depletion(plan, sky, seed=5)
    np.testing.assert_array_equal(low[:30], base[0][:30])
    assert low[-1] < base[0][-1]


def constant_plan() -> tuple[BlockPlan, BlockWeather]:
    days = 40
    season = CropSeason(
        planting=np.datetime64("2025-05-01"),
        stage_days=(10, 10, 60, 10),
        k_ini=0.15,
        k_mid=1.1,
        k_end=0.5,
        height_max_m=1.0,
        root_min_m=0.3,
        root_max_m=1.0,
        depletion_fraction=0.5,
    )
    nothing = np.zeros(days)
    plan = BlockPlan(
        season=season,
        profile=SOIL,
        start=np.datetime64("2025-05-01"),
        days=days,
        irrigation_gross=nothing,
        irrigation_net=nothing,
        irrigation_fw=np.full(days, np.nan),
    )
    weather = BlockWeather(
        eto=np.full(days, 5.0),
        rain=nothing,
        u2=np.full(days, 2.0),
        rh_min=np.full(days, 45.0),
        rung=np.ones(days, dtype=np.int8),
        rn=np.full(days, 14.0),
    )
    return plan, weather
