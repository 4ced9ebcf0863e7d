"""The handbook: every row loads, is within range, has its source, and refuses what it must."""

import re
from dataclasses import FrozenInstanceError, fields
from pathlib import Path

import numpy as np
import pytest

from app import handbook
from app.handbook import reader
from app.handbook.rows import CropRow, WettingRow
from app.science.crop.basal import basal_from_single
from app.science.crop.season import CropSeason
from app.science.soil.profile import Layer, Profile
from app.science.soil.runoff import AVERAGE, DRY, WET


def test_every_table_loads_with_a_source_in_every_row() -> None:
    """At least the rows of FAO-56 Tables 11, 12, 17, 19 and 20 and the NEH tables as carried over;
    a crop may be added."""
    assert len(handbook.crops()) >= 119
    assert sum(len(handbook.stage_lengths(c.stage_key)) > 0 for c in _staged()) >= 102
    assert len(handbook.soil_textures()) == 12
    assert len(handbook.wettings()) == 8
    assert len(handbook.efficiencies()) == 21
    assert len(handbook.conveyances()) == 3
    assert len(handbook.runoff_rows()) == 49
    assert len(handbook.wetness_rows()) == 8
    for crop in handbook.crops().values():
        assert crop.kc_source
        assert crop.root_source
        assert (crop.kcb_ini is None) == (not crop.kcb_source)
        assert (crop.gdd_base_c is None) == (not crop.gdd_source)
        assert (crop.ky_seasonal is None) == (not crop.ky_source)
        assert (crop.stage_ini_days is None) == (not crop.stage_source)
    others = [
        *handbook.soil_textures().values(),
        *handbook.wettings().values(),
        *handbook.efficiencies().values(),
        *handbook.conveyances().values(),
        *handbook.runoff_rows(),
        *handbook.wetness_rows(),
    ]
    assert all(row.source for row in others)
    assert all(row.confidence.startswith(("checked", "memory")) for row in others)


def _staged() -> list[CropRow]:
    return [crop for crop in handbook.crops().values() if crop.stage_key]


def test_maize_as_printed() -> None:
    """FAO-56 Tables 11 (April, Spain / first default row), 12, 17 and 22."""
    maize = handbook.crop("maize_grain")
    assert maize.stage_days == (30, 40, 50, 30)
    assert maize.coefficients("single") == (0.3, 1.2, 0.6)
    assert maize.coefficients("dual") == (0.15, 1.15, 0.5)
    assert maize.height_max_m == 2.0
    assert (maize.root_depth_low_m, maize.root_depth_high_m) == (1.0, 1.7)
    assert (maize.root_depth_min_m, maize.root_depth_max_m) == (0.2, 1.0)
    assert maize.depletion_fraction == 0.55
    assert maize.ece_threshold_ds_m == 1.7
    assert maize.ky_seasonal == 1.25
    assert not maize.perennial


def test_every_crop_makes_a_season_where_its_figures_are_published() -> None:
    made = 0
    for crop in handbook.crops().values():
        for kind in ("single", "dual"):
            if kind == "dual" and crop.kcb_ini is None:
                continue
            k_ini, k_mid, k_end = crop.coefficients(kind)
            season = CropSeason(
                planting=np.datetime64("2025-03-01"),
                stage_days=crop.stages or (30, 30, 30, 30),
                coefficients=kind,
                k_ini=k_ini,
                k_mid=k_mid,
                k_end=k_end,
                height_max_m=crop.height_max_m,
                root_min_m=crop.root_depth_min_m,
                root_max_m=crop.root_depth_max_m,
                depletion_fraction=crop.depletion_fraction,
                perennial=crop.perennial,
            )
            made += season.last_day > season.planting
    assert made >= 119 + 116


def test_every_crop_is_usable_by_name_and_says_what_is_not_printed() -> None:
    """All 119, dual and single; blanks are filled for exactly the crops that have any."""
    for crop_id, row in handbook.crops().items():
        for kind in ("single", "dual"):
            one = handbook.usable(crop_id, kind)
            blank = row.stages is None or (kind == "dual" and row.kcb_ini is None)
            assert one.working == blank, crop_id
            assert min(one.stage_days) > 0
            assert all(0.0 < k <= 1.3 for k in one.coefficients)
            assert one.stages_source
            assert one.coefficients_source
            if not blank:
                assert one.stage_days == row.stages
                assert one.coefficients == row.coefficients(kind)
    missing = {key for key, row in handbook.crops().items() if row.stages is None}
    assert set(handbook.working_stages()) == missing
    with pytest.raises(handbook.UnknownEntryError, match="no crop 'maiz'"):
        handbook.usable("maiz", "dual")


def test_basal_from_single_follows_table_18() -> None:
    """FAO-56 Table 18 beside its own tables 12 and 17: maize (dense, dry end of grain) and the
    cutting cycles of alfalfa, whose Kcb are printed."""
    assert basal_from_single(0.3, 1.2, 0.6) == pytest.approx((0.15, 1.15, 0.55))
    alfalfa = handbook.crop("alfalfa_hay_cycles")
    derived = basal_from_single(*alfalfa.coefficients("single"), annual=False)
    assert derived == pytest.approx(alfalfa.coefficients("dual"))
    assert basal_from_single(0.5, 0.05, 0.0, dense=False, wet_end=True) == (0.15, 0.0, 0.0)
    averaged = handbook.usable("alfalfa_hay_averaged", "dual")
    assert averaged.coefficients == pytest.approx((0.30, 0.90, 0.85))
    assert averaged.working


def test_every_texture_makes_a_profile() -> None:
    """Water contents in order, REW below TEW."""
    for row in handbook.soil_textures().values():
        layer = Layer(1.0, row.field_capacity, row.wilting_point, row.saturation)
        assert Profile(layers=(layer,), rew_mm=row.rew_mm).tew > row.rew_mm


def test_table_19_mids_and_classes_it_does_not_list() -> None:
    """FAO-56 Table 19: loam 0.25 and 0.12, REW 9; clay loam is not listed."""
    loam = handbook.soil_texture("loam")
    assert (loam.field_capacity, loam.wilting_point, loam.rew_mm) == (0.25, 0.12, 9.0)
    assert loam.source == "FAO-56 Table 19"
    other = handbook.soil_texture("clay_loam")
    assert other.field_capacity == other.sr_theta_fc_m3m3
    assert "Saxton & Rawls" in other.source


def test_the_balance_uses_the_same_wetness_table_as_the_handbook() -> None:
    rows = sorted(handbook.wetness_rows(), key=lambda row: row.cn_average)
    assert AVERAGE[1:] == tuple(row.cn_average for row in rows)
    assert DRY[1:] == tuple(row.cn_dry for row in rows)
    assert WET[1:] == tuple(row.cn_wet for row in rows)


def test_look_ups() -> None:
    assert handbook.wetting("sprinkler").fw_mid == 1.0
    assert handbook.wetting("trickle").fw_mid == 0.35
    assert handbook.efficiency("trickle").efficiency == 0.85
    assert handbook.curve_number("Fallow", "Bare soil", "", "B") == 86.0
    assert handbook.curve_number("Row crops", "Straight row (SR)", "good", "c") == 85.0
    assert {row.region for row in handbook.stage_lengths("cotton")}


@pytest.mark.parametrize(
    ("ask", "told"),
    [
        (lambda: handbook.crop("maiz"), "no crop 'maiz' in the handbook; near: maize_grain, maize"),
        (lambda: handbook.crop("Barly"), "no crop 'Barly' in the handbook; near: barley"),
        (lambda: handbook.crop("xyzzy"), "no crop 'xyzzy' in the handbook; known: broccoli"),
        (lambda: handbook.soil_texture("loamy"), "near: loamy_sand"),
        (lambda: handbook.wetting("drip"), "no kind of wetting 'drip'"),
        (lambda: handbook.efficiency("pivot"), "near: pivot_impact, pivot_spray, pivot_lepa"),
        (lambda: handbook.stage_lengths("cotto"), "near: cotton"),
        (lambda: handbook.curve_number("Fallow", "Bare", "", "B"), "near: Fallow / Bare soil"),
        (lambda: handbook.curve_number("Fallow", "Bare soil", "", "E"), "choose A, B, C or D"),
    ],
)
def test_an_unknown_entry_is_a_key_error_with_near_ones(ask: object, told: str) -> None:
    with pytest.raises(KeyError, match=re.escape(told)):
        ask()  # type: ignore[operator]


def test_a_blank_in_print_is_said_not_guessed() -> None:
    palm = handbook.crop("date_palm")
    assert palm.stages is None
    with pytest.raises(LookupError, match="no full stage lengths for 'date_palm': give stage_days"):
        _ = palm.stage_days
    with pytest.raises(LookupError, match="no basal coefficients for 'alfalfa_hay_averaged'"):
        handbook.crop("alfalfa_hay_averaged").coefficients("dual")


def test_rows_are_frozen() -> None:
    with pytest.raises(FrozenInstanceError):
        handbook.crop("barley").kc_mid = 2.0  # type: ignore[misc]
    with pytest.raises(TypeError):
        handbook.crops()["new"] = handbook.crop("barley")  # type: ignore[index]


@pytest.mark.parametrize(
    ("line", "told"),
    [
        ("a,A,0.5,1,two,,s,memory", "bad.csv, line 3, column fw_mid: 'two' is not a number"),
        ("a,A,0.5,1,,,s,memory", "bad.csv, line 3, column fw_mid: blank, but a number is needed"),
        ("a,A,0.5,1,7,,s,memory", "bad.csv, line 3, column fw_mid: 7 is not within 0.01 to 1"),
        ("a,A,0.5,1,0.7,", "bad.csv, line 3, column source: the column is missing"),
    ],
)
def test_a_wrong_cell_is_refused_with_file_line_and_column(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, line: str, told: str
) -> None:
    head = "method_id,wetting_event,fw_min,fw_max,fw_mid,note,source,confidence"
    good = "b,B,0.5,1,0.7,,s,checked"
    (tmp_path / "bad.csv").write_text(f"{head}\n{good}\n{line}\n", encoding="utf-8")
    monkeypatch.setattr(reader, "FOLDER", tmp_path)
    with pytest.raises(handbook.TableError, match=re.escape(told)):
        reader.read_rows("bad.csv", WettingRow)


def test_a_key_that_appears_twice_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    head = ",".join(column.name for column in fields(WettingRow))
    (tmp_path / "twice.csv").write_text(
        f"{head}\n" + "b,B,0.5,1,0.7,,s,checked\n" * 2, encoding="utf-8"
    )
    monkeypatch.setattr(reader, "FOLDER", tmp_path)
    rows = reader.read_rows("twice.csv", WettingRow)
    with pytest.raises(handbook.TableError, match="method_id 'b' appears twice"):
        reader.keyed(rows, "method_id", "twice.csv")
