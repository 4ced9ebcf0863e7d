"""Ledgers and advice follow the facts, and are the same whenever they are computed again."""

import copy
from datetime import date, timedelta
from itertools import pairwise

import pytest
from sqlalchemy import delete, select, update

from app.book import Book
from app.storage.database import Database
from app.storage.tables import Advice, Block, Event, LedgerDay, Station, StationDay
from app.workflows.advise import inputs_hash
from app.workflows.assemble import assemble
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book
from app.workflows.log_event import (
    correct_event,
    log_irrigation,
    log_rain,
    void_event,
)
from app.workflows.once import EntryError
from tests.workflows import basin


def ledger_of(db: Database, key: str) -> dict[date, LedgerDay]:
    with db.read() as session:
        rows = session.scalars(
            select(LedgerDay).join(Block, Block.id == LedgerDay.block_id).where(Block.key == key)
        ).all()
        session.expunge_all()
    return {row.day: row for row in rows}


def test_everything_derived_rebuilds_to_the_same_bytes(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    advice = {block: row.inputs_hash for block, row in basin.standing_advice(db).items()}
    with db.write() as session:
        session.execute(delete(LedgerDay))
        session.execute(delete(StationDay))
        session.execute(update(Station).values(dirty_from=date(1900, 1, 1)))
    bring_up_to_date(db, basin.TODAY)
    assert basin.derived(db) == before
    assert {b: row.inputs_hash for b, row in basin.standing_advice(db).items()} == advice


def test_day_by_day_or_all_at_once_is_the_same(db: Database) -> None:
    """A ledger carried on each morning, with data coming late, ends as one computed in one go."""
    with db.write() as session:
        load_book(session, Book.model_validate(basin.BOOK), "admin")
    for day in (date(2026, 6, 1), date(2026, 6, 9), basin.TODAY):
        bring_up_to_date(db, day)  # the morning before the file comes
        for station in ("bench", "meadow"):
            basin.take(db, station, basin.daily_csv(last=day - timedelta(days=1)), day)
    stepwise = [row[2:] for row in basin.derived(db)]
    with db.write() as session:
        session.execute(delete(LedgerDay))
        session.execute(update(Block).values(dirty_from=date(1900, 1, 1)))
    bring_up_to_date(db, basin.TODAY)
    assert [row[2:] for row in basin.derived(db)] == stepwise


def test_the_ledger_closes_and_reads_its_events(db: Database) -> None:
    basin.fill(db)
    ledger = ledger_of(db, "whole")
    days = sorted(ledger)
    assert days[0] == date(2026, 4, 20)
    assert days[-1] == basin.TODAY - timedelta(days=1)
    for before, day in pairwise(days):
        start, row = ledger[before].depletion_mm, ledger[day]
        end = (
            start
            + row.root_growth_depletion_mm
            - (row.rain_mm - row.runoff_mm - row.rain_outside_roots_mm)
            - row.irrigation_net_mm
            - row.capillary_rise_mm
            + row.et_actual_mm
            + row.deep_percolation_mm
            - row.correction_mm
        )
        assert end == pytest.approx(row.depletion_mm, abs=1e-9)
    watered = ledger[date(2026, 6, 5)]
    assert watered.irrigation_gross_mm == 25
    assert watered.irrigation_net_mm == 20
    assert watered.application_loss_mm == 5


def test_a_volume_is_shared_over_blocks_by_area_and_rain_is_the_gauges(db: Database) -> None:
    basin.fill(db)
    for key in ("upper", "lower"):
        ledger = ledger_of(db, key)
        assert ledger[date(2026, 6, 6)].irrigation_gross_mm == pytest.approx(30)
        assert ledger[date(2026, 6, 10)].rain_mm == 7


def test_sources_by_variable(db: Database) -> None:
    """Rain comes from the other station, ET from the field's own."""
    basin.fill(db)
    basin.take(db, "meadow", basin.daily_csv(date(2026, 6, 20)).replace(b",0.0\n", b",9.5\n"))
    halves, whole = ledger_of(db, "upper"), ledger_of(db, "whole")
    day = date(2026, 6, 23)
    assert halves[day].rain_mm == 9.5
    assert whole[day].rain_mm == 0
    assert halves[day].eto_mm == whole[day].eto_mm


def test_an_irrigation_logged_corrected_and_deleted(db: Database) -> None:
    basin.fill(db)
    before, advice = basin.derived(db), basin.standing_advice(db)
    day = basin.TODAY - timedelta(days=1)
    number = log_irrigation(
        db, "long-piece", None, day, 4, "hours", "advisor", "form-1", basin.TODAY
    )
    row = ledger_of(db, "whole")[day]
    assert row.irrigation_gross_mm == 24  # 4 h at 6 mm/h
    block = row.block_id
    now = basin.standing_advice(db)[block]
    assert now.number > advice[block].number
    assert now.depletion_mm < advice[block].depletion_mm

    again = log_irrigation(
        db, "long-piece", None, day, 4, "hours", "advisor", "form-1", basin.TODAY
    )
    assert again == number
    assert ledger_of(db, "whole")[day].irrigation_gross_mm == 24

    corrected = correct_event(db, number, day, 18, "gross_mm", "advisor", "form-2", basin.TODAY)
    assert ledger_of(db, "whole")[day].irrigation_gross_mm == 18
    with pytest.raises(EntryError, match="changed by somebody else"):
        correct_event(db, number, day, 9, "gross_mm", "advisor", "form-3", basin.TODAY)
    void_event(db, corrected, "advisor", "form-4", basin.TODAY)
    assert basin.derived(db) == before
    with db.read() as session:
        chain = session.scalars(select(Event).where(Event.id >= number).order_by(Event.id)).all()
        assert [(e.kind, e.amount, e.supersedes) for e in chain] == [
            ("irrigation", 4, None),
            ("irrigation", 18, number),
            ("void", 18, corrected),
        ]
        issued = session.scalars(
            select(Advice.stands).where(Advice.block_id == block, Advice.issued_on == basin.TODAY)
        ).all()
    assert issued.count(True) == 1
    assert len(issued) > 1


def test_rain_of_the_own_gauge_takes_the_place_of_the_stations(db: Database) -> None:
    basin.fill(db)
    day = date(2026, 6, 20)
    log_rain(db, "long-piece", day, 12.5, "advisor", "form-1", basin.TODAY)
    assert ledger_of(db, "whole")[day].rain_mm == 12.5


@pytest.mark.parametrize(
    ("amount", "unit", "day", "says"),
    [
        (-1.0, "hours", basin.TODAY, "above 0"),
        (float("nan"), "hours", basin.TODAY, "above 0"),
        (5000.0, "hours", basin.TODAY, "more than 1000"),
        (3.0, "acre-feet", basin.TODAY, "choose one of"),
        (3.0, "hours", date(2027, 1, 1), "when it has run"),
    ],
)
def test_a_bad_entry_is_refused_by_name(
    db: Database, amount: float, unit: str, day: date, says: str
) -> None:
    basin.fill(db)
    with pytest.raises(EntryError, match=says):
        log_irrigation(db, "long-piece", None, day, amount, unit, "advisor", "f", basin.TODAY)


def test_the_same_inputs_issue_no_second_number(db: Database) -> None:
    basin.fill(db)
    before = {block: row.number for block, row in basin.standing_advice(db).items()}
    assert bring_up_to_date(db, basin.TODAY).advices == 0
    assert {block: row.number for block, row in basin.standing_advice(db).items()} == before


def test_a_silent_station_is_carried_on_by_the_usual_and_marked(db: Database) -> None:
    basin.fill(db)
    later = basin.TODAY + timedelta(days=4)
    bring_up_to_date(db, later)
    ledger = ledger_of(db, "whole")
    silent = [ledger[basin.TODAY + timedelta(days=n)] for n in range(4)]
    assert [row.rung for row in silent] == [9, 9, 9, 9]
    assert all(row.eto_mm > 2 for row in silent)
    block = silent[0].block_id
    assert basin.standing_advice(db, later)[block].unsure.startswith("stale:bench:5")


def test_advice_keeps_to_the_system(db: Database) -> None:
    basin.fill(db)
    for advice in basin.standing_advice(db).values():
        if advice.day is not None:
            assert 6 <= advice.gross_mm <= 40
            assert advice.net_mm == pytest.approx(0.8 * advice.gross_mm)
            assert advice.hours == pytest.approx(advice.gross_mm / 6)


def test_a_block_is_foretold_the_same_alone_and_in_company(db: Database) -> None:
    """Which other blocks are recomputed with it, and from when, changes no bit of a block."""
    basin.fill(db)
    early, late = date(2026, 1, 1), basin.TODAY
    through = basin.TODAY - timedelta(days=1)
    with db.read() as session:
        blocks = list(session.scalars(select(Block.id)))
        together = assemble(session, dict.fromkeys(blocks, early), through)
        for subject in together:
            number = subject.block.block_id
            alone = next(iter(assemble(session, {number: late}, through)))
            assert alone.weather.eto.tolist() == subject.weather.eto.tolist()
            assert inputs_hash(alone, []) == inputs_hash(subject, [])


def test_a_season_before_its_stations_first_day_is_not_due_each_morning(db: Database) -> None:
    book = copy.deepcopy(basin.BOOK)
    book["seasons"].append({"field": "long-piece", "crop": "potato", "planting": "2024-04-20"})
    with db.write() as session:
        load_book(session, Book.model_validate(book), "admin")
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv())
    assert bring_up_to_date(db, basin.TODAY).blocks == 0
    changed = ledger_of(db, "whole")
    assert min(changed) == date(2026, 4, 20)


def test_a_clock_set_back_issues_nothing_for_a_morning_before_the_last(db: Database) -> None:
    basin.fill(db)
    before = {block: row.number for block, row in basin.standing_advice(db).items()}
    state = basin.derived(db)
    done = bring_up_to_date(db, basin.TODAY - timedelta(days=1))
    assert (done.advices, done.advised_until) == (0, basin.TODAY)
    assert basin.standing_advice(db, basin.TODAY - timedelta(days=1)) == {}
    bring_up_to_date(db, basin.TODAY)
    assert {block: row.number for block, row in basin.standing_advice(db).items()} == before
    assert basin.derived(db) == state
