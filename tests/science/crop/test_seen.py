"""Seasons moved by what was seen: stages, cover and height, cuttings, mulch; bare soil."""

from dataclasses import replace

import numpy as np
import pytest

from app.science.crop.cover import density_coefficient
from app.science.crop.curve import coefficient_on
from app.science.crop.mulch import Mulch
from app.science.crop.season import CropSeason, bare_season
from app.science.crop.seen import CoverSeen, StageSeen
from app.science.crop.stand import Canopy
from app.science.ledger import block_ledgers
from tests.science.crop.test_curve import MAIZE, curve
from tests.science.soil.fields import field, weather

DAY = np.timedelta64(1, "D")


def on(day: int) -> np.datetime64:
    """Date of a day of the maize season; the planting day is 1."""
    return MAIZE.planting + (day - 1)


def test_a_stage_seen_moves_the_days_from_it_on_and_none_before() -> None:
    """Mid-season seen on day 60 (the table says 71): day 60 is as day 71 would have been."""
    table = curve(MAIZE)
    seen = curve(replace(MAIZE, stages_seen=(StageSeen(date=on(60), stage=3),)))
    np.testing.assert_array_equal(seen.coefficient[:59], table.coefficient[:59])
    np.testing.assert_array_equal(seen.coefficient[59:189], table.coefficient[70:200])
    np.testing.assert_array_equal(seen.stage[59:189], table.stage[70:200])
    assert seen.in_season[138]
    assert not seen.in_season[139]
    assert (np.diff(seen.root_depth) >= 0.0).all()


def test_single_roots_grow_from_planting_by_the_place_in_the_stages() -> None:
    """Single coefficients: linear from planting to the first day of mid-season (day 71)."""
    single = replace(MAIZE, coefficients="single")
    seen = curve(replace(single, stages_seen=(StageSeen(date=on(50), stage=3),)))
    table = curve(single)
    np.testing.assert_array_equal(seen.root_depth[:49], table.root_depth[:49])
    assert seen.root_depth[47] == pytest.approx(0.2 + 0.8 * 47.0 / 70.0)
    assert seen.root_depth[49] == 1.0
    dual = curve(replace(MAIZE, stages_seen=(StageSeen(date=on(60), stage=3),)))
    np.testing.assert_allclose(dual.root_depth[[29, 49, 58, 59]], [0.2, 0.6, 0.78, 1.0])


def test_a_late_crop_waits_and_keeps_its_roots() -> None:
    """Development seen to begin on day 45 only: the coefficient falls back to the initial one,
    roots stay where they had come to."""
    seen = curve(replace(MAIZE, stages_seen=(StageSeen(date=on(45), stage=2),)))
    assert seen.coefficient[43] == pytest.approx(0.15 + 14.0 / 40.0)
    assert seen.coefficient[44] == pytest.approx(0.15 + 1.0 / 40.0)
    assert (np.diff(seen.root_depth) >= 0.0).all()
    assert seen.root_depth[44] == seen.root_depth[43]
    assert seen.root_depth[-1] == 1.0
    last = replace(MAIZE, stages_seen=(StageSeen(date=on(45), stage=2),)).last_day
    assert last == on(44 + 120)


def test_a_ledger_that_starts_after_what_was_seen_knows_it() -> None:
    seen = replace(MAIZE, stages_seen=(StageSeen(date=on(60), stage=3),), cuttings=(on(90),))
    whole, rest = curve(seen), curve(seen, first=100, days=101)
    np.testing.assert_array_equal(rest.coefficient, whole.coefficient[99:])
    np.testing.assert_array_equal(rest.stage, whole.stage[99:])


ALFALFA = CropSeason(
    planting=np.datetime64("2025-03-01"),
    stage_days=(10, 30, 25, 10),
    cycle_days=(5, 20, 10, 10),
    cuttings=(np.datetime64("2025-05-14"), np.datetime64("2025-07-10")),
    k_ini=0.30,
    k_mid=1.15,
    k_end=1.10,
    height_max_m=0.7,
    root_min_m=1.0,
    root_max_m=1.5,
    depletion_fraction=0.55,
    perennial=True,
    climate_adjustment="none",
)


def test_each_cutting_begins_a_cycle_the_day_after() -> None:
    """FAO-56 figure 36 and table 11 (alfalfa 10/30/25/10, later cycles 5/20/10/10): Kcb at its end
    value on the day of cutting, initial the day after; held at its end until cut."""
    c = curve(ALFALFA, days=365)
    first = int((ALFALFA.cuttings[0] - ALFALFA.planting).astype(int))
    second = int((ALFALFA.cuttings[1] - ALFALFA.planting).astype(int))
    day = np.arange(1, 366)
    expected = coefficient_on(day, ALFALFA.stage_days, 0.30, 1.15, 1.10)
    cycle = coefficient_on(day, (5, 20, 10, 10), 0.30, 1.15, 1.10)
    np.testing.assert_allclose(c.coefficient[: first + 1], expected[: first + 1])
    np.testing.assert_allclose(c.coefficient[first + 1 : second + 1], cycle[: second - first])
    assert c.coefficient[second] == pytest.approx(1.10)  # 57 days into a cycle of 45
    np.testing.assert_allclose(c.coefficient[second + 1 :], cycle[: 364 - second])
    assert c.height[second + 1] < c.height[second] / 3.0
    assert (c.root_depth == 1.5).all()
    assert c.in_season.all()
    frost = replace(ALFALFA, end=np.datetime64("2025-10-20"))
    assert curve(frost, days=365).in_season.sum() == 234


def test_cover_seen_gives_kcb_by_the_density_coefficient() -> None:
    """Kcb = Kc min + Kd (Kcb full - Kc min) (Irrigation Science 28:17-34, 2009, from memory), Kcb
    full = min(1.0 + 0.1 h, 1.2) at the table's climate (FAO-56 eq 100)."""
    seen = (
        CoverSeen(date=on(40), cover=0.2, height_m=0.4),
        CoverSeen(date=on(60), cover=0.6, height_m=1.2),
    )
    c = curve(replace(MAIZE, cover_seen=seen))
    table = curve(MAIZE)
    np.testing.assert_array_equal(c.coefficient[:39], table.coefficient[:39])
    assert np.isnan(c.cover[:39]).all()
    for day, cover, height in ((40, 0.2, 0.4), (50, 0.4, 0.8), (60, 0.6, 1.2)):
        full = min(1.0 + 0.1 * height, 1.2)
        kd = float(density_coefficient(cover, height))
        assert c.coefficient[day - 1] == pytest.approx(0.15 + kd * (full - 0.15))
        assert c.cover[day - 1] == pytest.approx(cover)
        assert c.height[day - 1] == pytest.approx(height)
    # After the last one seen: on with the season's own curve, to full cover and down again.
    ratio = table.coefficient[69] / table.coefficient[59]
    assert c.cover[69] == pytest.approx(0.6 * ratio)
    assert c.coefficient[99] > c.coefficient[59]
    assert c.coefficient[149] < c.coefficient[59]
    assert (c.cover[39:150] <= 0.99).all()


def test_a_ledger_that_starts_after_the_last_cover_seen_goes_on_as_the_whole() -> None:
    seen = (CoverSeen(date=on(50), cover=0.3, height_m=0.8),)
    season = replace(MAIZE, cover_seen=seen)
    whole, rest = curve(season), curve(season, first=80, days=121)
    np.testing.assert_allclose(rest.coefficient, whole.coefficient[79:])
    np.testing.assert_allclose(rest.cover[:70], whole.cover[79:149])


def test_cover_seen_is_what_evaporation_sees() -> None:
    """Ground covered as seen leaves the rest to evaporation (FAO-56 eq 75)."""
    plan = field(1, k=0.6, net={0: 20.0})
    seen = (CoverSeen(date=plan.start, cover=0.9, height_m=0.5),)
    dense = replace(plan.season, cover_seen=seen, canopy=Canopy(full="table"))
    ledger = block_ledgers([replace(plan, season=dense)], [weather(1)])[0]
    assert ledger.ke[0] == pytest.approx(0.1 * 1.2)


def test_plastic_seals_and_straw_slows_evaporation() -> None:
    """FAO-56 chapter 10: plastic leaves its holes alone and cuts Kcb by 5-15 %; straw over half of
    the ground cuts evaporation by a quarter."""
    plan = field(30, k=0.3, net={0: 30.0})
    plastic = replace(plan.season, mulch=Mulch(kind="plastic", cover=0.9, reduction=0.1))
    straw = replace(plan.season, mulch=Mulch(kind="organic", cover=0.5))
    bare, sealed, damped = block_ledgers(
        [plan, replace(plan, season=plastic), replace(plan, season=straw)], [weather(30)] * 3
    )
    np.testing.assert_allclose(sealed.kcb, 0.9 * bare.kcb)
    assert sealed.ke[0] == pytest.approx(0.1 * 1.2)
    assert damped.ke[0] == pytest.approx(0.75 * bare.ke[0])
    np.testing.assert_array_equal(damped.kcb, bare.kcb)
    single = replace(plastic, coefficients="single")
    ledger = block_ledgers([replace(plan, season=single)], [weather(30)])[0]
    assert ledger.kc_actual[0] == pytest.approx(0.27)
    with pytest.raises(ValueError, match="choose plastic or organic"):
        Mulch(kind="gravel", cover=0.5)


def test_the_limit_goes_by_stage() -> None:
    days = 150
    plan = field(days, perennial=False, mad=0.5)
    season = replace(plan.season, stage_days=(30, 40, 50, 30), mad_by_stage=(0.3, None, 0.6, 0.8))
    ledger = block_ledgers([replace(plan, season=season)], [weather(days)])[0]
    share = ledger.limit_mm / ledger.taw_mm
    np.testing.assert_allclose(share, np.repeat([0.3, 0.5, 0.6, 0.8], [30, 40, 50, 30]))


def test_bare_soil_between_two_crops_dries_by_evaporation_alone() -> None:
    """FAO-56 chapter 11: Kcb 0; what leaves is at most the evaporable water; no call for water."""
    first, last = np.datetime64("2025-06-01"), np.datetime64("2025-08-29")
    season = bare_season(first, last, root_depth_m=0.5)
    assert season.last_day == last
    plan = replace(field(90, root_m=0.5), season=season)
    ledger = block_ledgers([plan], [weather(90)])[0]
    assert (ledger.kcb == 0.0).all()
    assert ledger.et_actual_mm.sum() == pytest.approx(plan.profile.tew, rel=0.01)
    np.testing.assert_array_equal(ledger.limit_mm, ledger.taw_mm)
    assert set(ledger.standing[1:]) == {"easy"}


@pytest.mark.parametrize(
    ("change", "told"),
    [
        ({"stages_seen": (StageSeen(date=on(-3), stage=2),)}, "before planting"),
        ({"cuttings": (on(9), on(9))}, "cuttings must be in order"),
        ({"cycle_days": (1, 2, 3)}, "cycle_days is"),
        ({"mad_by_stage": (0.5, 0.5)}, "give one for each of 4 stages"),
        ({"mad_by_stage": (0.5, 0.5, 1.5, None)}, "mad is 1.5"),
        (
            {
                "cover_seen": (CoverSeen(date=on(9), cover=0.5, height_m=1.0),),
                "coefficients": "single",
            },
            "cover_seen needs dual",
        ),
    ],
)
def test_a_wrong_season_is_refused_by_name(change: dict[str, object], told: str) -> None:
    with pytest.raises(ValueError, match=told):
        replace(MAIZE, **change)  # type: ignore[arg-type]


def test_what_was_seen_is_checked() -> None:
    with pytest.raises(ValueError, match="stage is 5"):
        StageSeen(date=on(9), stage=5)
    with pytest.raises(ValueError, match=r"cover is 1\.2"):
        CoverSeen(date=on(9), cover=1.2, height_m=1.0)
