"""What one season leaves in the soil is what the next finds, through bare soil between them."""

import copy
from datetime import date, timedelta
from typing import Any

import pytest
from sqlalchemy import select, update

from app.book import Book
from app.storage.database import Database
from app.storage.tables import Advice, Block, LedgerDay, Soil
from app.workflows import agronomy
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book
from app.workflows.log_event import log_irrigation
from app.workflows.stretches import stretches_of
from tests.workflows import basin

SPINACH: dict[str, Any] = {
    "field": "long-piece", "crop": "spinach", "planting": "2026-03-05", "end": "2026-04-14",
    "initial_depletion_fraction": 0.5,
}  # fmt: skip
MAIZE: dict[str, Any] = {"field": "long-piece", "crop": "maize_grain", "planting": "2026-04-25"}
LAST, PLANTED = date(2026, 4, 14), date(2026, 4, 25)
DAY = timedelta(days=1)


def load(db: Database, seasons: list[dict[str, Any]]) -> None:
    book = copy.deepcopy(basin.BOOK)
    book["seasons"], book["irrigations"], book["rain"] = seasons, [], []
    with db.write() as session:
        load_book(session, Book.model_validate(book), "admin")


def started(db: Database, seasons: list[dict[str, Any]], today: date = basin.TODAY) -> None:
    load(db, seasons)
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv(last=today - DAY), today)
    bring_up_to_date(db, today)


def rows_of(db: Database) -> dict[date, LedgerDay]:
    with db.read() as session:
        found = session.scalars(
            select(LedgerDay)
            .join(Block, Block.id == LedgerDay.block_id)
            .where(Block.key == "whole")
            .order_by(LedgerDay.day)
        ).all()
        session.expunge_all()
    return {row.day: row for row in found}


def rebuilt(db: Database) -> list[tuple[Any, ...]]:
    with db.write() as session:
        session.execute(update(Block).values(dirty_from=date(2020, 1, 1)))
    bring_up_to_date(db, basin.TODAY)
    return basin.derived(db)


def opening(row: LedgerDay) -> float:
    """Depletion before a day, of its own terms."""
    rain = row.rain_mm - row.runoff_mm - row.rain_outside_roots_mm
    came = rain + row.irrigation_net_mm + row.capillary_rise_mm + row.correction_mm
    went = row.et_actual_mm + row.deep_percolation_mm
    return row.depletion_mm + came - went - row.root_growth_depletion_mm


def test_maize_after_dry_spinach_opens_dry_through_bare_soil(db: Database) -> None:
    started(db, [SPINACH, MAIZE])
    rows = rows_of(db)
    days = sorted(rows)
    assert days == [days[0] + DAY * n for n in range((days[-1] - days[0]).days + 1)]
    bare = [rows[LAST + DAY * n] for n in range(1, (PLANTED - LAST).days)]
    assert {row.season_id for row in bare} == {rows[PLANTED].season_id}
    assert all(row.kcb == 0 and row.standing in {"easy", "wet"} for row in bare)
    assert all(row.limit_mm == pytest.approx(row.taw_mm) for row in bare)

    # The same share of TAW is dry where bare soil (0.3 m) lies within the spinach's roots, or
    # partly below them (its subsoil): mass balance.
    spinach, first, planted = rows[LAST], bare[0], rows[PLANTED]
    with db.read() as session:
        stored = session.scalars(select(Soil.details).where(Soil.key == "loam")).one()
        soil = agronomy.profile(stored)
    zone = spinach.depletion_mm / float(soil.taw(spinach.root_depth_m))
    assert spinach.root_depth_m >= 0.3
    assert opening(first) == pytest.approx(zone * float(soil.taw(0.3)), abs=1e-9)
    assert bare[-1].root_depth_m == pytest.approx(0.3)
    left = bare[-1].depletion_mm * float(soil.taw(planted.root_depth_m)) / float(soil.taw(0.3))
    assert opening(planted) == pytest.approx(left, abs=1e-9)
    assert left > 5.0
    assert planted.depletion_p90_mm is not None
    assert planted.depletion_p10_mm is not None
    width = planted.depletion_p90_mm - planted.depletion_p10_mm
    assert width > 0.5, "what was not known of the close is not known of the opening"


def test_water_put_on_bare_soil_is_there_for_the_next_crop(db: Database) -> None:
    started(db, [SPINACH, MAIZE])
    dry = opening(rows_of(db)[PLANTED])
    before = basin.derived(db)
    log_irrigation(
        db, "long-piece", None, PLANTED - 2 * DAY, 30, "gross_mm", "a", "t1", basin.TODAY,
        purpose="pre-plant",
    )  # fmt: skip
    assert opening(rows_of(db)[PLANTED]) < dry - 5
    assert basin.derived(db) != before
    assert basin.derived(db) == rebuilt(db)


def test_mornings_one_by_one_give_what_one_run_gives(db: Database) -> None:
    early = date(2026, 4, 10)
    started(db, [SPINACH, MAIZE], early)
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv(), basin.TODAY)
    for n in (0, 1, 4, 5, 6, 14, 15, 16, 30):
        bring_up_to_date(db, early + n * DAY)
    bring_up_to_date(db, basin.TODAY)
    assert basin.derived(db) == rebuilt(db)


def test_no_advice_is_given_for_bare_soil(db: Database) -> None:
    started(db, [SPINACH, MAIZE], date(2026, 4, 20))
    with db.read() as session:
        told = session.scalars(select(Advice.block_id).where(Advice.issued_on == date(2026, 4, 20)))
        assert not list(told)
    assert max(rows_of(db)) == date(2026, 4, 19)


CHANGES: list[list[dict[str, Any]]] = [
    [SPINACH | {"end": "2026-04-02"}, MAIZE],
    [SPINACH, MAIZE | {"initial_depletion_fraction": 0.2}],
    [SPINACH, MAIZE | {"ledger_start": "2026-05-03"}],
    [SPINACH | {"initial_depletion_fraction": 0.1}, MAIZE],
]


@pytest.mark.parametrize("changed", CHANGES)
def test_a_change_of_either_season_and_back_leaves_no_trace(
    db: Database, changed: list[dict[str, Any]]
) -> None:
    started(db, [SPINACH, MAIZE])
    before = basin.derived(db)
    load(db, changed)
    bring_up_to_date(db, basin.TODAY)
    between = basin.derived(db)
    assert between != before
    assert between == rebuilt(db)
    load(db, [SPINACH, MAIZE])
    bring_up_to_date(db, basin.TODAY)
    assert basin.derived(db) == before


def test_a_stated_opening_carries_nothing_over(db: Database) -> None:
    started(db, [SPINACH, MAIZE | {"initial_depletion_mm": 3.0}])
    rows = rows_of(db)
    assert opening(rows[PLANTED]) == pytest.approx(3.0)
    assert LAST + DAY not in rows


def test_after_a_gap_too_long_to_follow_the_soil_opens_full(db: Database) -> None:
    started(db, [SPINACH | {"planting": "2024-03-05", "end": "2024-04-14"}, MAIZE])
    assert opening(rows_of(db)[PLANTED]) == pytest.approx(0.0)
    with db.read() as session:
        block = session.scalars(select(Block.id).where(Block.key == "whole")).one()
        assert [one.carries for one in stretches_of(session, [block])] == [False, False]
