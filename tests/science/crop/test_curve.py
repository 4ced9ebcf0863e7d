"""Crop curves beyond the published examples: anchors, adjustment windows, roots, off season."""

from dataclasses import replace

import numpy as np
import pytest

from app.science.crop import bare_soil, cover
from app.science.crop.climate import adjust
from app.science.crop.curve import TRAILING_DAYS, Curve, season_curve, season_curves
from app.science.crop.season import CropSeason

MAIZE = CropSeason(
    planting=np.datetime64("2025-04-10"),
    stage_days=(30, 40, 50, 30),
    k_ini=0.15,
    k_mid=1.15,
    k_end=0.5,
    height_max_m=2.0,
    root_min_m=0.2,
    root_max_m=1.0,
    depletion_fraction=0.55,
    climate_adjustment="none",
)


def curve(
    season: CropSeason, first: int = 1, days: int = 200, u2: float = 2.0, rh: float = 45.0
) -> Curve:
    """Curves from day `first` of the season on."""
    date = season.planting + np.arange(first - 1, first - 1 + days)
    return season_curve(season, date, np.full(days, u2), np.full(days, rh))


def test_the_planting_day_is_day_one_and_each_stage_closes_on_its_last_day() -> None:
    """FAO-56 eq 66 and figure 25: day 30 still initial, day 70 at mid, day 150 at the end value."""
    c = curve(MAIZE)
    assert c.coefficient[29] == 0.15
    assert c.coefficient[30] == pytest.approx(0.15 + 1.0 / 40.0)
    assert c.coefficient[69] == pytest.approx(1.15)
    assert c.coefficient[119] == pytest.approx(1.15)
    assert c.coefficient[149] == pytest.approx(0.5)
    assert c.stage[[0, 29, 30, 69, 70, 119, 120, 149, 150]].tolist() == [1, 1, 2, 2, 3, 3, 4, 4, 0]


def test_roots_and_height_follow_the_basal_curve_and_never_shrink() -> None:
    """FAO-56 eq 8-1 and Annex 8."""
    c = curve(MAIZE)
    np.testing.assert_allclose(c.root_depth[[0, 29, 49, 69, 149, 199]], [0.2, 0.2, 0.6, 1, 1, 1])
    np.testing.assert_allclose(c.height[[0, 69, 149]], [2.0 * 0.15 / 1.15, 2.0, 2.0])
    assert c.height[150] == 0.0
    assert (np.diff(c.root_depth) >= 0).all()


def test_single_roots_grow_from_planting_to_the_first_day_of_mid_season() -> None:
    c = curve(replace(MAIZE, coefficients="single"))
    np.testing.assert_allclose(c.root_depth[[0, 35, 70, 199]], [0.2, 0.6, 1.0, 1.0])


def test_roots_keep_the_depth_a_cut_season_reached() -> None:
    c = curve(replace(MAIZE, end=np.datetime64("2025-05-29")))  # day 50
    np.testing.assert_allclose(c.root_depth[49:], 0.6)
    assert not c.in_season[50]


def test_off_season_is_bare_soil_for_annuals() -> None:
    """FAO-56 chapter 11: Kcb = Kc_min = 0, so that bare soil can dry out."""
    c = curve(MAIZE, first=-9, days=180)
    off = ~c.in_season
    assert off.sum() == 30
    assert (c.coefficient[off] == 0.0).all()
    assert (c.kc_min[off] == 0.0).all()
    single = curve(replace(MAIZE, coefficients="single", k_ini=0.3), first=-9, days=180)
    assert (single.coefficient[off] == 0.3).all()
    tree = curve(replace(MAIZE, perennial=True), first=-9, days=180)
    assert (tree.coefficient[off] == 0.15).all()
    assert (tree.root_depth == 1.0).all()
    assert (tree.height == 2.0).all()


def test_trailing_adjustment_is_the_mean_of_the_day_and_29_before_it() -> None:
    season = replace(MAIZE, climate_adjustment="trailing")
    rng = np.random.default_rng(2)
    date = season.planting + np.arange(-5, 140)
    wind, rh = rng.uniform(1, 6, date.size), rng.uniform(20, 80, date.size)
    c = season_curve(season, date, wind, rh)
    for day in (71, 100, 120):  # of the season; index day + 4
        here = day + 4
        window = slice(here + 1 - TRAILING_DAYS, here + 1)
        expected = adjust(1.15, wind[window].mean(), rh[window].mean(), 2.0)
        assert c.coefficient[here] == pytest.approx(float(expected))
    changed = wind.copy()
    changed[110:] += 1.0
    later = season_curve(season, date, changed, rh)
    np.testing.assert_array_equal(c.coefficient[:110], later.coefficient[:110])


def test_trailing_adjustment_looks_back_no_further_than_planting() -> None:
    season = replace(MAIZE, climate_adjustment="trailing", stage_days=(0, 0, 100, 0))
    date = season.planting + np.arange(-10, 20)
    wind = np.where(date < season.planting, 6.0, 3.0)
    c = season_curve(season, date, wind, np.full(date.size, 45.0))
    np.testing.assert_allclose(c.coefficient[10:], float(adjust(1.15, 3.0, 45.0, 2.0)))


def test_stage_mean_and_day_adjustments() -> None:
    rng = np.random.default_rng(3)
    date = MAIZE.planting + np.arange(150)
    wind, rh = rng.uniform(1, 6, 150), rng.uniform(20, 80, 150)
    mean = season_curve(replace(MAIZE, climate_adjustment="stage_mean"), date, wind, rh)
    expected = adjust(1.15, wind[70:120].mean(), rh[70:120].mean(), 2.0)
    np.testing.assert_allclose(mean.coefficient[70:120], float(expected))
    end = adjust(0.5, wind[120:].mean(), rh[120:].mean(), 2.0)
    assert mean.coefficient[149] == pytest.approx(float(end))
    day = season_curve(replace(MAIZE, climate_adjustment="day"), date, wind, rh)
    np.testing.assert_allclose(day.coefficient[70:120], adjust(1.15, wind[70:120], rh[70:120], 2.0))


def test_small_table_values_are_not_adjusted() -> None:
    """FAO-56 eq 65 and 70: only from 0.45 on; single Kc mid (eq 62) always."""
    low = replace(MAIZE, k_mid=0.4, k_end=0.4, climate_adjustment="day")
    c = curve(low, u2=5.0, rh=20.0)
    np.testing.assert_allclose(c.coefficient[70:120], 0.4)
    single = curve(replace(low, coefficients="single"), u2=5.0, rh=20.0)
    assert single.coefficient[100] > 0.45
    assert single.coefficient[149] == pytest.approx(0.4)


def test_many_seasons_at_once_are_each_alone() -> None:
    others = [MAIZE, replace(MAIZE, climate_adjustment="trailing", k_mid=1.0), MAIZE]
    date = np.stack([s.planting + np.arange(-3, 160) for s in others], axis=1)
    rng = np.random.default_rng(5)
    wind, rh = rng.uniform(0, 8, date.shape), rng.uniform(5, 99, date.shape)
    many = season_curves(others, date, wind, rh)
    for i, season in enumerate(others):
        one = season_curve(season, date[:, i], wind[:, i], rh[:, i])
        for name, values in vars(one).items():
            np.testing.assert_array_equal(values, getattr(many, name)[:, i], err_msg=name)


@pytest.mark.parametrize(
    ("change", "told"),
    [
        ({"stage_days": (0, 0, 0, 0)}, "stage_days"),
        ({"coefficients": "triple"}, "choose dual or single"),
        ({"climate_adjustment": "weekly"}, "trailing, stage_mean, day, none"),
        ({"k_mid": 3.0}, "k_mid is 3; it must lie between 0 and 2"),
        ({"k_mid": float("nan")}, "k_mid is nan"),
        ({"root_max_m": 0.1}, "root_max_m is 0.1; it must lie between 0.2"),
        ({"mad": 1.5}, "mad is 1.5"),
        ({"end": np.datetime64("2025-01-01")}, "before planting"),
    ],
)
def test_a_wrong_season_is_refused_by_name(change: dict[str, object], told: str) -> None:
    with pytest.raises(ValueError, match=told):
        replace(MAIZE, **change)  # type: ignore[arg-type]


def test_kc_ini_follows_the_first_stage_and_its_ceiling() -> None:
    """FAO-56 Annex 7: 1.15 while every wetting comes before the first stage ends."""
    assert float(bare_soil.kc_ini(1.0, 4.0, 20.0, 9.0)) == 1.15
    rare = bare_soil.kc_ini([5.0, 10.0, 20.0], 4.0, 20.0, 9.0)
    assert (np.diff(rare) < 0).all()
    assert float(rare[-1]) == pytest.approx(20.0 / (20.0 * 4.0), rel=0.02)  # all TEW, each time
    assert float(bare_soil.wetting_interval(35.0, 3.0)) == 10.0  # eq 7-7
    stage = bare_soil.kc_ini_initial_stage(2.0, 4.0, 12.0, 0.4, coarse=False)
    light, heavy = bare_soil.kc_ini_light(2.0, 4.0), bare_soil.kc_ini_heavy(2, 4, coarse=False)
    assert float(stage) == pytest.approx(float(0.4 * (light + 2 / 3 * (heavy - light))))


def test_cover_forms_meet_at_full_cover_and_bare_soil() -> None:
    assert float(cover.kcb_from_cover(1.0, 1.0, 2.0, 1.2)) == pytest.approx(1.2)
    assert float(cover.kcb_from_lai(0.0, 1.2)) == pytest.approx(0.15)
    assert float(cover.density_coefficient(1.0, 3.0)) == 1.0
    assert float(cover.density_coefficient(0.2, 0.0, 2.0)) == pytest.approx(0.2)
    assert float(cover.windbreak(20.0, 2.0)) == 2.5  # FAO-56 eq 105, its ceiling
    lai = cover.lai_from_kcb(0.9, 1.2)
    assert float(cover.kcb_from_lai(lai, 1.2)) == pytest.approx(0.9, rel=0.02)  # 1.4 for 1 / 0.7
