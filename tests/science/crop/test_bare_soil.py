"""Wettings counted from days, and the season they give; water carried over between seasons."""

from dataclasses import replace

import numpy as np
import pytest

from app.science.crop.bare_soil import kc_ini_between, season_of_wetting, wettings
from app.science.ledger import block_ledgers
from app.science.soil.carry_over import Stores, carried_over
from app.science.soil.profile import Layer, Profile
from tests.science.crop.test_curve import MAIZE
from tests.science.soil.fields import field, weather

SOIL = Profile(layers=(Layer(0.4, 0.30, 0.15, 0.45), Layer(2.0, 0.28, 0.10, 0.45)), rew_mm=8.0)


def test_wet_days_next_to_each_other_are_one_wetting() -> None:
    """FAO-56 Annex 7; rain of 1 mm at 5 mm/d does not count (chapter 8)."""
    rain = np.array([10.0, 5.0, 0.0, 1.0, 0.0, 0.0, 8.0])
    irrigation = np.array([0.0, 0.0, 0.0, 0.0, 20.0, 0.0, 0.0])
    count, depth = wettings(rain, irrigation, np.full(7, 5.0))
    assert count == 3
    assert depth == pytest.approx(43.0 / 3.0)
    assert wettings(np.zeros(3), np.zeros(3), np.ones(3)) == (0, 0.0)


def test_a_wetting_beyond_40_mm_is_a_heavy_one() -> None:
    """FAO-56 eq 59: light up to 10 mm, heavy from 40 mm on."""
    depth = [5.0, 10.0, 25.0, 40.0, 90.0]
    np.testing.assert_allclose(kc_ini_between(depth, 0.4, 1.0), [0.4, 0.4, 0.7, 1.0, 1.0])


def test_kc_ini_by_wetting_is_for_single_coefficients() -> None:
    single = season_of_wetting(replace(MAIZE, coefficients="single"), 0.63)
    assert single.k_ini == 0.63
    with pytest.raises(ValueError, match="dual ones reckon it daily"):
        season_of_wetting(MAIZE, 0.63)
    with pytest.raises(ValueError, match=r"kc is 1\.5"):
        season_of_wetting(replace(MAIZE, coefficients="single"), 1.5)


@pytest.mark.parametrize("new", [0.2, 0.4, 0.9, 1.2])
def test_no_water_is_made_or_lost_between_seasons(new: float) -> None:
    before = Stores(root_depth_m=0.8, deepest_m=1.2, depletion_mm=70.0, subsoil_mm=15.0)
    after = carried_over(SOIL, before, new, 1.2)
    assert after.depletion_mm + after.subsoil_mm == pytest.approx(85.0)
    assert 0.0 <= after.depletion_mm <= float(SOIL.taw(new))
    same = carried_over(SOIL, before, 0.8, 1.2)
    assert same.depletion_mm == pytest.approx(70.0)
    assert same.subsoil_mm == pytest.approx(15.0)


def test_a_deeper_crop_a_wetted_part_and_a_wet_root_zone() -> None:
    before = Stores(root_depth_m=0.8, deepest_m=0.8, depletion_mm=66.0, subsoil_mm=0.0)
    deep = carried_over(SOIL, before, 0.8, 1.6)
    share = 66.0 / float(SOIL.taw(0.8))
    assert deep.subsoil_mm == pytest.approx(share * (SOIL.taw(1.6) - SOIL.taw(0.8)))
    part = carried_over(SOIL, before, 0.8, 0.8, roots=0.5)
    assert part.depletion_mm == pytest.approx(33.0)
    wet = Stores(root_depth_m=0.8, deepest_m=1.2, depletion_mm=-10.0, subsoil_mm=15.0)
    assert carried_over(SOIL, wet, 0.2, 1.2).depletion_mm == pytest.approx(-10.0)
    with pytest.raises(ValueError, match="deepest_m is"):
        Stores(root_depth_m=0.8, deepest_m=0.5, depletion_mm=0.0, subsoil_mm=0.0)


def test_two_seasons_in_one_year_hand_their_water_on() -> None:
    """A ledger that opens with what the one before left: the water of both stores is the same."""
    first = replace(field(60, perennial=False, root_m=1.0), profile=SOIL)
    one = block_ledgers([first], [weather(60)])[0]
    left = Stores(
        root_depth_m=float(one.root_depth_m[-1]),
        deepest_m=1.0,
        depletion_mm=float(one.depletion_mm[-1]),
        subsoil_mm=float(one.subsoil_depletion_mm[-1]),
    )
    opening = carried_over(SOIL, left, 0.2, 1.0)
    below = float(SOIL.taw(1.0) - SOIL.taw(0.2))
    start = first.start + np.timedelta64(60, "D")
    second = replace(
        first,
        season=replace(first.season, planting=start),
        start=start,
        initial_depletion_mm=opening.depletion_mm,
        initial_subsoil_depletion_fraction=opening.subsoil_mm / below,
    )
    two = block_ledgers([second], [weather(60, eto=0.0)])[0]
    before = one.depletion_mm[-1] + one.subsoil_depletion_mm[-1]
    after = two.depletion_mm[0] + two.subsoil_depletion_mm[0]
    assert after == pytest.approx(before)
