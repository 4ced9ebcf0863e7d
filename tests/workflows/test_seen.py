"""What is seen on a field moves its ledger from that day on, and is undone by deleting it."""

from datetime import date, timedelta
from typing import Any

import pytest
from sqlalchemy import delete, select, update

from app.book import Book
from app.storage.database import Database
from app.storage.tables import Advice, Block, Event, LedgerDay, ReadingTaken, Station, StationDay
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book
from app.workflows.log_event import void_event
from app.workflows.log_seen import log_seen
from app.workflows.once import EntryError
from tests.workflows import basin

DAY = date(2026, 6, 20)


def ledger(db: Database, key: str = "whole") -> dict[date, LedgerDay]:
    with db.read() as session:
        rows = session.scalars(
            select(LedgerDay).join(Block, Block.id == LedgerDay.block_id).where(Block.key == key)
        ).all()
        session.expunge_all()
    return {row.day: row for row in rows}


def see(db: Database, kind: str, day: date = DAY, token: str = "one", **more: Any) -> int:
    field = more.pop("field", "long-piece")
    return log_seen(db, field, None, kind, day, "advisor", token, basin.TODAY, **more)


def taken(db: Database) -> list[ReadingTaken]:
    with db.read() as session:
        rows = list(session.scalars(select(ReadingTaken).order_by(ReadingTaken.event_id)))
        session.expunge_all()
    return rows


def rebuilt(db: Database) -> list[tuple[Any, ...]]:
    with db.write() as session:
        session.execute(delete(StationDay))
        session.execute(delete(LedgerDay))
        session.execute(update(Station).values(dirty_from=date(1900, 1, 1)))
    bring_up_to_date(db, basin.TODAY)
    return basin.derived(db)


CONTENT = {"method": "volumetric", "hour": 6.0, "trust": "full"}


def reading(content: float, **more: Any) -> dict[str, Any]:
    """The same content at three depths."""
    depths = [{"depth_m": depth, "value": content} for depth in (0.15, 0.45, 0.75)]
    return {**CONTENT, "depths": depths, **more}


def test_a_stage_seen_moves_the_curve_from_its_day_and_deleting_it_puts_it_back(
    db: Database,
) -> None:
    basin.fill(db)
    before = basin.derived(db)
    number = see(db, "stage", amount=4)
    rows = ledger(db)
    assert basin.derived(db) != before
    assert rows[DAY - timedelta(days=1)].kcb == pytest.approx(1.15, abs=0.3)
    assert see(db, "stage", amount=4) == number  # sent twice
    state = basin.derived(db)
    assert rebuilt(db) == state
    void_event(db, number, "advisor", "away", basin.TODAY)
    assert basin.derived(db) == before


def test_cover_and_height_seen_give_the_coefficient(db: Database) -> None:
    basin.fill(db)
    before = ledger(db)
    see(db, "cover", amount=0.1, details={"height_m": 0.3})
    after = ledger(db)
    eve = DAY - timedelta(days=1)
    assert after[eve].kcb == before[eve].kcb
    assert (after[DAY].kcb or 0) < 0.6 * (before[DAY].kcb or 0)


def test_a_reading_in_full_trust_sets_the_depletion(db: Database) -> None:
    """FAO-56 eq 86, 87: 0.25 of field capacity (loam, Table 19) less the content, over the roots.
    A morning's reading is compared with the close of the day before."""
    basin.fill(db)
    see(db, "reading", details=reading(0.20))
    eve = ledger(db)[DAY - timedelta(days=1)]
    (told,) = taken(db)
    assert told.close == DAY - timedelta(days=1)
    assert told.why == "full"
    assert eve.depletion_mm == pytest.approx(told.reading_mm, abs=1e-9)
    assert eve.correction_mm == pytest.approx(told.before_mm - told.reading_mm)
    state = basin.derived(db)
    assert rebuilt(db) == state
    assert [row.correction_mm for row in taken(db)] == [told.correction_mm]


def test_a_weighed_reading_moves_part_of_the_way_and_narrows_what_is_known(db: Database) -> None:
    """Scalar Kalman gain: variance of the ledger over the sum of both variances."""
    basin.fill(db)
    see(db, "reading", details=reading(0.20, trust="weighed"))
    (told,) = taken(db)
    gain = told.before_spread_mm**2 / (told.before_spread_mm**2 + told.reading_spread_mm**2)
    assert told.gain == pytest.approx(gain)
    assert told.after_mm == pytest.approx(
        told.before_mm + gain * (told.reading_mm - told.before_mm)
    )
    assert told.after_spread_mm < min(told.before_spread_mm, told.reading_spread_mm)


def test_a_second_reading_is_weighed_against_the_ledger_the_first_left(db: Database) -> None:
    basin.fill(db)
    see(db, "reading", details=reading(0.20))
    see(db, "reading", DAY + timedelta(days=1), "two", details=reading(0.20))
    first, second = taken(db)
    used = ledger(db)[DAY].et_actual_mm
    assert second.before_mm == pytest.approx(first.after_mm + used, abs=15)
    assert abs(second.correction_mm) < abs(first.correction_mm)
    # one taken back leaves the other as if it had stood alone
    void_event(db, first.event_id, "advisor", "x", basin.TODAY)
    (alone,) = taken(db)
    assert alone.event_id == second.event_id
    assert alone.before_mm != second.before_mm


def test_a_reading_set_aside_corrects_nothing_and_needs_its_reason(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    with pytest.raises(EntryError, match="say why the reading is set aside"):
        see(db, "reading", details=reading(0.20, trust="none"))
    see(db, "reading", details=reading(0.20, trust="none"), note="probe in a gopher hole")
    (told,) = taken(db)
    assert (told.why, told.correction_mm) == ("set_aside", 0.0)
    assert basin.derived(db) == before


def test_nothing_is_advised_on_days_said_to_be_kept_off(db: Database) -> None:
    basin.fill(db)
    last = basin.TODAY + timedelta(days=13)
    see(db, "keep_off", basin.TODAY, details={"last": last}, note="harvest of the neighbour")
    with db.read() as session:
        block = session.scalar(select(Block.id).where(Block.key == "whole"))
        advice = session.scalars(
            select(Advice).where(Advice.block_id == block, Advice.stands.is_(True))
        ).all()
    assert [row.day for row in advice if row.issued_on == basin.TODAY] == [None]


def test_a_note_moves_nothing(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    see(db, "note", note="aphids at the gate")
    assert basin.derived(db) == before
    with db.read() as session:
        assert session.scalars(select(Event.note).where(Event.kind == "note")).all() == [
            "aphids at the gate"
        ]


@pytest.mark.parametrize(
    ("kind", "more", "says"),
    [
        ("stage", {"amount": 5}, "stage is 5; choose 1 initial"),
        ("cover", {"amount": 0.5}, "height_m is None"),
        ("cover", {"amount": 1.5, "details": {"height_m": 1}}, "cover is 1.5"),
        ("cutting", {"day": date(2026, 1, 5)}, "no crop grows"),
        ("reading", {"details": {"method": "gravimetric", "depths": [
            {"depth_m": 0.2, "value": 0.2}]}}, "needs the bulk_density"),
        ("reading", {"details": reading(24)}, "a water content is a fraction such as 0.24"),
        ("reading", {"details": {**CONTENT, "depths": []}}, "depths"),
        ("keep_off", {"details": {"last": DAY - timedelta(days=1)}}, "give a last day from"),
        ("note", {}, "note is empty"),
        ("rumour", {}, "kind is 'rumour'"),
        ("stage", {"amount": 3, "day": date(2031, 1, 1)}, "give a day from 1980 to"),
    ],
)  # fmt: skip
def test_what_cannot_be_is_refused_by_name_and_leaves_nothing(
    db: Database, kind: str, more: dict[str, Any], says: str
) -> None:
    basin.fill(db)
    before = basin.derived(db)
    with pytest.raises(EntryError, match=says):
        see(db, kind, **more)
    assert basin.derived(db) == before
    with db.read() as session:
        assert not session.scalars(select(Event).where(Event.details.is_not(None))).all()


def test_cover_under_a_single_coefficient_is_refused(db: Database) -> None:
    basin.fill(db)
    book = {**basin.BOOK, "seasons": [dict(basin.BOOK["seasons"][0], coefficients="single")]}
    with db.write() as session:
        load_book(session, Book.model_validate(book), "admin")
    with pytest.raises(EntryError, match="does not fit the season"):
        see(db, "cover", amount=0.5, details={"height_m": 1.0})
