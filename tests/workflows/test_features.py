"""What a book may say of crops, soils and water beyond the plain season, down to the ledger."""

import copy
from datetime import date, timedelta
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from sqlalchemy import select

from app.book import Book
from app.science.crop.bare_soil import kc_ini_own_soil
from app.storage.database import Database
from app.storage.tables import Advice, Block, LedgerDay
from app.workflows import agronomy
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book
from tests.workflows import basin

SEASON: dict[str, Any] = {"field": "long-piece", "crop": "maize_grain", "planting": "2026-04-20"}
OWN = {
    "own_crop": {"name": "Quinoa, own trial", "source": "own strip trial 2024, north end"},
    "crop": "quinoa", "stage_days": [20, 30, 40, 20], "kcb_ini": 0.15, "kcb_mid": 1.0,
    "kcb_end": 0.4, "height_m": 1.1, "root_depth_min_m": 0.2, "root_depth_max_m": 0.9,
    "depletion_fraction": 0.5,
}  # fmt: skip


def ledgers(
    db: Database, season: dict[str, Any] | None = None, field: dict[str, Any] | None = None,
    soil: dict[str, Any] | None = None,
) -> dict[date, LedgerDay]:  # fmt: skip
    """The ledger of Long Piece under changes of its season, field or soil."""
    book = copy.deepcopy(basin.BOOK)
    book["seasons"] = [SEASON | (season or {})]
    book["fields"][0] |= field or {}
    book["soils"][0] |= soil or {}
    with db.write() as session:
        load_book(session, Book.model_validate(book), "admin")
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv())
    bring_up_to_date(db, basin.TODAY)
    with db.read() as session:
        rows = session.scalars(
            select(LedgerDay)
            .join(Block, Block.id == LedgerDay.block_id)
            .where(Block.key == "whole")
        ).all()
        session.expunge_all()
    return {row.day: row for row in rows}


def kcb(rows: dict[date, LedgerDay], day: date) -> float:
    value = rows[day].kcb
    assert value is not None
    return value


def test_a_crop_of_ones_own_needs_every_figure_and_keeps_its_source(db: Database) -> None:
    rows = ledgers(db, OWN)
    assert kcb(rows, date(2026, 6, 25)) > 0.9
    short = {name: value for name, value in OWN.items() if name != "kcb_mid"}
    with pytest.raises(ValueError, match="a crop of one's own needs kcb_mid as well"):
        Book.model_validate({**basin.BOOK, "seasons": [SEASON | short]})


def test_a_stage_seen_anchors_the_curve_from_its_day_on(db: Database) -> None:
    """FAO-56 chapter 11: stages seen in the field go before the table's; past days keep theirs."""
    seen = date(2026, 6, 1)
    early = ledgers(db, {"stages": [{"day": str(seen), "stage": "mid-season"}]})
    assert kcb(early, seen) > 1.0
    assert kcb(early, seen - timedelta(days=1)) < 0.8


def test_stages_by_warmth_move_with_the_weather(db: Database) -> None:
    """Twice the degree days for a stage take about twice the days."""
    sums = {"base_c": 10, "stage_sums": [100, 200, 400, 300]}
    fast = ledgers(db, {"degree_days": sums})
    half_way = next(day for day in sorted(fast) if kcb(fast, day) > 0.6)
    later = ledgers(db, {"degree_days": sums | {"stage_sums": [200, 400, 800, 600]}})
    slow = next(day for day in sorted(later) if kcb(later, day) > 0.6)
    planting = date(2026, 4, 20)
    assert (slow - planting) / (half_way - planting) == pytest.approx(1.7, abs=0.4)


def test_cuttings_start_the_forage_anew(db: Database) -> None:
    cut = date(2026, 6, 10)
    alfalfa = {
        "crop": "alfalfa_hay_cycles", "planting": "2026-04-01", "cuttings": [str(cut)],
        "cycle_days": [5, 10, 10, 10],
    }  # fmt: skip
    rows = ledgers(db, alfalfa)
    before, after = kcb(rows, cut), kcb(rows, cut + timedelta(days=2))
    assert after < 0.6 * before
    assert kcb(rows, cut + timedelta(days=17)) > 0.9 * before


def test_mulch_takes_from_evaporation(db: Database) -> None:
    """FAO-56 chapter 10: plastic seals what it covers."""
    bare = ledgers(db, None)
    covered = ledgers(db, {"mulch": {"kind": "plastic", "cover": 0.8, "reduction": 0.1}})
    days = [day for day in bare if day < date(2026, 5, 20)]
    ke = [sum(rows[day].ke or 0.0 for day in days) for rows in (bare, covered)]
    assert ke[1] < 0.4 * ke[0]


def test_an_orchard_follows_its_cover_and_height(db: Database) -> None:
    """FAO-56 chapter 9: a sparse stand's coefficient follows its density."""
    orchard = {"crop": "apple_cherry_pear_bare_frost", "planting": "2026-03-25"}
    stand = {"cover": 0.2, "height_m": 3.0}
    thin = ledgers(db, orchard | {"stand": stand})
    grassed = ledgers(db, orchard | {"stand": stand, "canopy": {"ground_cover_kcb": 0.8}})
    full = ledgers(db, orchard)
    day = date(2026, 6, 25)
    assert kcb(thin, day) < 0.75 * kcb(full, day)
    assert kcb(thin, day) < kcb(grassed, day) < 1.3


def test_the_limit_follows_the_stage(db: Database) -> None:
    rows = ledgers(db, {"mad": 0.5, "mad_by_stage": [0.3, None, 0.6, None]})
    for day, share in ((date(2026, 4, 25), 0.3), (date(2026, 6, 5), 0.5)):
        assert rows[day].limit_mm / rows[day].taw_mm == pytest.approx(share)


def test_soil_by_sand_and_clay_and_a_water_table_that_rises(db: Database) -> None:
    """Saxton & Rawls (2006): a loam of 40 % sand, 20 % clay, 2.5 % organic matter holds 0.14
    between field capacity and wilting point. A water table 1.2 m down feeds roots."""
    loam = {"layers": [{"bottom_m": 2.0, "sand": 40, "clay": 20, "organic_matter": 2.5}]}
    dry = ledgers(db, None, None, loam)
    day = max(dry)
    assert dry[day].taw_mm / dry[day].root_depth_m == pytest.approx(140, abs=10)
    assert dry[day].capillary_rise_mm == 0.0
    wet = ledgers(db, None, {"water_table": [{"since": "2026-05-15", "depth_m": 1.2}]}, loam)
    assert wet[date(2026, 5, 10)].capillary_rise_mm == 0.0
    assert sum(row.capillary_rise_mm for row in wet.values()) > 5.0


def test_salty_water_stresses_the_crop_and_asks_for_leaching(db: Database) -> None:
    """FAO-29: LR = ECw / (5 ECe - ECw); maize 1.7 dS/m (FAO-56 Table 23), water of 1.5 dS/m:
    1.5 / 7.0 = 0.21. FAO-56 eq 93: ECe = 1.15 / 0.15 x 1.5 / 5 = 2.3 at a fraction of 0.15."""
    fresh = ledgers(db, None)
    with db.read() as session:
        before = session.scalars(select(Advice).where(Advice.stands.is_(True))).all()
        plain = {row.block_id: row.gross_mm / row.net_mm for row in before if row.net_mm}
    salty = ledgers(db, None, {"water_ec_ds_m": 1.5})
    day = date(2026, 6, 10)
    assert salty[day].et_actual_mm < fresh[day].et_actual_mm
    with db.read() as session:
        after = session.scalars(
            select(Advice).where(Advice.stands.is_(True)).join(Block).where(Block.key == "whole")
        ).all()
    (advice,) = [row for row in after if row.issued_on == basin.TODAY]
    requirement = 1.5 / (5 * 1.7 - 1.5)
    assert advice.gross_mm / advice.net_mm == pytest.approx(0.9 / ((1 - requirement) * 0.8))
    assert plain[advice.block_id] == pytest.approx(1 / 0.8)


def test_every_feature_closes_the_balance(db: Database) -> None:
    """The ledger's own identity, to 1e-9 mm, with mulch, warmth, a water table and salt at once."""
    loam = {
        "layers": [
            {"bottom_m": 0.4, "sand": 40, "clay": 20}, {"bottom_m": 2.0, "sand": 20, "clay": 30}
        ],
        "curve_number": 75, "drainage_days": 2,
    }  # fmt: skip
    rows = ledgers(
        db,
        {
            "mulch": {"kind": "organic", "cover": 0.5},
            "degree_days": {"base_c": 8, "stage_sums": [150, 400, 700, 400]},
            "stages": [{"day": "2026-06-20", "stage": "mid-season"}],
        },
        {"water_ec_ds_m": 1.2, "water_table": [{"since": "2026-04-01", "depth_m": 1.5}]},
        loam,
    )
    ordered = [rows[day] for day in sorted(rows)]
    for opening, row in pairwise(ordered):
        closing = (
            opening.depletion_mm + row.root_growth_depletion_mm
            - (row.rain_mm - row.runoff_mm - row.rain_outside_roots_mm) - row.irrigation_net_mm
            - row.capillary_rise_mm + row.et_actual_mm + row.deep_percolation_mm
            - row.correction_mm
        )  # fmt: skip
        assert np.isclose(closing, row.depletion_mm, rtol=0, atol=1e-9)


def test_how_often_the_soil_is_wetted_sets_the_initial_single_coefficient(db: Database) -> None:
    """FAO-56 Annex 7: wetted every 4 days loses more than every 14; the first day shows it."""
    part = {"depth_mm": 25, "eto_mm": 5}
    single = {"coefficients": "single", "initial_depletion_mm": 0}
    often = ledgers(db, single | {"initial_wetting": part | {"every_days": 4}})
    seldom = ledgers(db, single | {"initial_wetting": part | {"every_days": 14}})
    first = date(2026, 4, 20)
    stated = Book.model_validate(basin.BOOK).soils[0].model_dump(mode="json")
    soil = agronomy.profile(stated)
    for rows, every in ((often, 4), (seldom, 14)):
        assert rows[first].ks == 1.0
        told = float(kc_ini_own_soil(every, 5.0, soil.tew, soil.rew_mm, 25.0))
        assert rows[first].etc_potential_mm / rows[first].eto_mm == pytest.approx(told)
    assert often[first].kc_actual > seldom[first].kc_actual
    with pytest.raises(ValueError, match="single coefficients"):
        Book.model_validate(
            basin.BOOK | {"seasons": [SEASON | {"initial_wetting": part | {"every_days": 4}}]}
        )
