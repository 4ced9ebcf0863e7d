"""Whole seasons watered at their limit, inside ranges published beforehand.

Ranges: seasonal water need of FAO Irrigation Water Management, Training Manual 3 (from memory):
alfalfa 800-1600 mm, citrus 900-1200 mm, tomato 400-800 mm; season's ETc over ETo beside the
single coefficients of FAO-56 Tables 11 and 12, which hold a typical wetting.
"""

from dataclasses import dataclass, replace

import numpy as np

from app import handbook
from app.science.crop.climate import adjust
from app.science.crop.curve import coefficient_on, season_of_stand
from app.science.crop.season import CropSeason
from app.science.crop.stand import Canopy
from app.science.ledger import BlockLedger, BlockPlan, closure_error
from app.science.soil.profile import Layer, Profile
from tests.science.soil.managed import dry_summer, managed

LOAM, SAND = handbook.soil_texture("loam"), handbook.soil_texture("sand")


def soil(row: handbook.SoilRow) -> Profile:
    layer = Layer(3.0, row.field_capacity, row.wilting_point, row.saturation)
    return Profile(layers=(layer,), rew_mm=row.rew_mm)


def season(crop_id: str, planting: str, **change: object) -> CropSeason:
    one = handbook.usable(crop_id, "dual")
    k_ini, k_mid, k_end = one.coefficients
    made = CropSeason(
        planting=np.datetime64(planting),
        stage_days=one.stage_days,
        k_ini=k_ini,
        k_mid=k_mid,
        k_end=k_end,
        height_max_m=one.row.height_max_m,
        root_min_m=one.row.root_depth_min_m,
        root_max_m=one.row.root_depth_max_m,
        depletion_fraction=one.row.depletion_fraction,
        perennial=one.row.perennial,
    )
    return replace(made, **change)  # type: ignore[arg-type]


def plan_of(crop: CropSeason, profile: Profile, **change: object) -> BlockPlan:
    days = int((crop.last_day - crop.planting).astype(int)) + 1
    plan = BlockPlan(
        season=crop,
        profile=profile,
        start=crop.planting,
        days=days,
        irrigation_gross=np.zeros(days),
        irrigation_net=np.zeros(days),
        irrigation_fw=np.full(days, np.nan),
    )
    return replace(plan, **change)  # type: ignore[arg-type]


@dataclass(frozen=True)
class Told:
    etc: float
    ratio: float
    net: float
    percolation: float
    past_limit: int
    events: int


def told(ledger: BlockLedger) -> Told:
    assert closure_error(ledger) < 1e-9
    return Told(
        etc=float(ledger.et_actual_mm.sum()),
        ratio=float(ledger.et_actual_mm.sum() / ledger.eto_mm.sum()),
        net=float(ledger.irrigation_net_mm.sum()),
        percolation=float(ledger.deep_percolation_mm.sum()),
        past_limit=int((ledger.depletion_mm > ledger.limit_mm + 1e-9).sum()),
        events=int((ledger.irrigation_net_mm > 0.0).sum()),
    )


def single_ratio(plan: BlockPlan, crop_id: str, eto: np.ndarray) -> float:
    """Season's ETc over ETo by the single coefficients of the tables, moved to the climate of
    `dry_summer` (FAO-56 eq 62 and 65)."""
    k_ini, *rest = handbook.crop(crop_id).coefficients("single")
    k = (k_ini, *(float(adjust(one, 2.0, 30.0, plan.season.height_max_m)) for one in rest))
    day = np.arange(1, plan.days + 1)
    kc = coefficient_on(day, plan.season.stage_days, *k)
    return float((kc * eto).sum() / eto.sum())


def test_alfalfa_with_five_cuttings() -> None:
    """Season 1 April to 20 October, cut five times; ETc over ETo beside the averaged 0.95 of FAO-56
    Table 12 (its chapter 6 quotes 1.05): 0.85 to 1.10."""
    cut = ("2025-05-25", "2025-06-30", "2025-08-01", "2025-09-04", "2025-10-12")
    crop = season(
        "alfalfa_hay_cycles",
        "2025-04-01",
        cuttings=tuple(np.datetime64(day) for day in cut),
        cycle_days=(5, 10, 10, 5),
        end=np.datetime64("2025-10-20"),
    )
    plan = plan_of(crop, soil(LOAM))
    weather = dry_summer(plan.start, plan.days)
    _, ledger = managed(plan, weather, efficiency=0.75, fw=1.0)
    got = told(ledger)
    assert 0.85 <= got.ratio <= 1.10
    assert 800.0 <= got.etc <= 1600.0
    for day in cut:
        i = int((np.datetime64(day) - plan.start).astype(int))
        assert ledger.kcb[i + 1] < 0.5 < 1.0 < ledger.kcb[i]
    assert got.past_limit == 0
    assert got.percolation < 0.05 * got.net
    assert got.net < got.etc


def test_an_orchard_with_a_cover_crop() -> None:
    """Mature orchard, crowns over 0.6 of the ground, 4 m, mown grass between (Kcb 0.8): beside the
    single coefficients of FAO-56 Table 12 for active ground cover with frost, within 15 %."""
    crop_id = "apple_cherry_pear_cover_frost"
    canopy = Canopy(shape="round", latitude_deg=38.0, ground_cover_kcb=0.8)
    crop = season(crop_id, "2025-03-15", canopy=canopy)
    printed = crop.k_mid
    crop = season_of_stand(crop, 0.6, 4.0)
    assert abs(crop.k_mid - printed) < 0.1
    plan = plan_of(crop, soil(LOAM))
    weather = dry_summer(plan.start, plan.days)
    _, ledger = managed(plan, weather, efficiency=0.75, fw=1.0)
    got = told(ledger)
    table = single_ratio(plan, crop_id, weather.eto)
    assert 0.85 * table <= got.ratio <= 1.15 * table
    assert 900.0 <= got.etc <= 1600.0
    assert got.past_limit == 0
    assert got.percolation < 0.05 * got.net
    season_roots = ledger.root_depth_m
    assert (season_roots == season_roots[0]).all()


def test_a_drip_vegetable_on_sand() -> None:
    """Tomato, 0.35 of the surface wetted under the canopy: less evaporation than the tables'
    typical wetting, so 0.70 to 1.0 of the single coefficients' season; short intervals on sand."""
    crop = season("tomato", "2025-04-20")
    plan = plan_of(crop, soil(SAND), under_canopy=True)
    weather = dry_summer(plan.start, plan.days)
    _, ledger = managed(plan, weather, efficiency=0.85, fw=0.35)
    got = told(ledger)
    table = single_ratio(plan, "tomato", weather.eto)
    assert 0.70 * table <= got.ratio <= 1.0 * table
    assert 400.0 <= got.etc <= 800.0
    assert got.past_limit <= 2
    assert got.percolation < 0.10 * got.net
    assert 25 <= got.events <= 90


def test_trickle_on_a_third_of_the_roots_asks_three_times_as_often() -> None:
    """A third of the root zone holds a third of the water, so that at mid-season, roots and
    coefficients constant, the same field asks about three times as often as under sprinklers
    (arithmetic of FAO-56 eq 82 and 83; the wetter surface of sprinklers asks a little more).
    Roots 1.5 m (Table 22's greater bound); of an interval of 3.x days only 3 are seen, so that up
    to 4 times may be."""
    crop = season("tomato", "2025-04-20", mad=0.4, root_max_m=1.5)
    whole = plan_of(crop, soil(LOAM))
    part = replace(whole, root_wetted_fraction=1.0 / 3.0, under_canopy=True)
    weather = replace(dry_summer(whole.start, whole.days), rain=np.zeros(whole.days))
    _, sprinkled = managed(whole, weather, efficiency=0.75, fw=1.0)
    _, dripped = managed(part, weather, efficiency=0.85, fw=0.33)
    mid = slice(sum(crop.stage_days[:2]), sum(crop.stage_days[:3]))
    interval = [
        float(np.diff(np.flatnonzero(one.irrigation_net_mm[mid] > 0.0)).mean())
        for one in (sprinkled, dripped)
    ]
    assert 2.5 <= interval[0] / interval[1] <= 4.0
    assert told(dripped).past_limit <= 2
