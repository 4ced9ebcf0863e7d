"""Water as it was entered: part of a block, another wetting, corrections, and what was presumed."""

import copy
from datetime import date, timedelta
from typing import Any

import pytest
from sqlalchemy import select

from app.book import Book
from app.storage.database import Database
from app.storage.tables import Advice, Block, Event, LedgerDay
from app.workflows import agronomy
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book
from app.workflows.log_event import Water, correct_event, log_water, void_event
from app.workflows.once import EntryError
from tests.workflows import basin

DAY = date(2026, 6, 20)
ONE = timedelta(days=1)


def ledger(db: Database, day: date) -> LedgerDay:
    with db.read() as session:
        row = session.scalars(
            select(LedgerDay)
            .join(Block, Block.id == LedgerDay.block_id)
            .where(Block.key == "whole", LedgerDay.day == day)
        ).one()
        session.expunge(row)
    return row


def put(db: Database, token: str, day: date = DAY, **told: Any) -> int:
    return log_water(
        db, "long-piece", None, Water(day=day, **told), "a", token, basin.TODAY
    )  # fmt: skip


def test_part_of_a_block_gets_its_part_and_a_volume_is_a_volume(db: Database) -> None:
    """10 ha at 0.8: 20 mm on a quarter are 5 mm over the block; 500 m3 are 5 mm wherever they
    fell (volume over area)."""
    basin.fill(db)
    put(db, "t1", amount=20, unit="gross_mm", area_share=0.25)
    assert ledger(db, DAY).irrigation_gross_mm == pytest.approx(5.0)
    assert ledger(db, DAY).irrigation_net_mm == pytest.approx(4.0)
    put(db, "t2", DAY + ONE, amount=500, unit="volume_m3", area_share=0.25)
    assert ledger(db, DAY + ONE).irrigation_gross_mm == pytest.approx(5.0)


def test_less_surface_wetted_loses_less_to_evaporation(db: Database) -> None:
    """FAO-56 eq 71 and 75: few is no more than what was wetted."""
    basin.fill(db)
    number = put(db, "t1", amount=25, unit="gross_mm")
    whole = ledger(db, DAY)
    void_event(db, number, "a", "v1", basin.TODAY)
    put(db, "t2", amount=25, unit="gross_mm", wetted_fraction=0.1)
    narrow = ledger(db, DAY)
    assert whole.ke is not None
    assert narrow.ke is not None
    assert narrow.ke < whole.ke
    void_event(db, number + 2, "a", "v2", basin.TODAY)
    put(db, "t3", amount=25, unit="gross_mm", area_share=0.1)
    assert ledger(db, DAY).irrigation_net_mm == pytest.approx(2.0)


def test_a_correction_may_change_purpose_confirmation_and_part(db: Database) -> None:
    basin.fill(db)
    number = put(db, "t1", amount=20, unit="gross_mm")
    later = correct_event(
        db, number, DAY, 20, "gross_mm", "b", "c1", basin.TODAY,
        purpose="frost", confirmation="metered", area_share=0.5,
    )  # fmt: skip
    with db.read() as session:
        event = session.get_one(Event, later)
        assert (event.purpose, event.confirmation, event.supersedes) == ("frost", "metered", number)
        assert event.details == {"area_share": 0.5}
        old = session.get_one(Event, number)
        assert (old.purpose, old.details) == ("crop", None)
    assert ledger(db, DAY).irrigation_net_mm == 0
    assert ledger(db, DAY).irrigation_gross_mm == pytest.approx(10)


@pytest.mark.parametrize(
    ("told", "says"),
    [
        ({"amount": 5, "unit": "hours", "area_share": 0}, "area_share is 0"),
        ({"amount": 5, "unit": "hours", "area_share": 1.2}, "area_share is 1.2"),
        ({"amount": 5, "unit": "hours", "wetted_fraction": 7}, "wetted_fraction is 7"),
        ({"amount": 5, "unit": "rain_mm", "area_share": 0.5}, "rain falls on the whole field"),
        ({"amount": float("nan"), "unit": "hours"}, "amount is nan"),
        ({"amount": 0, "unit": "hours"}, "amount is 0"),
        ({"amount": 5, "unit": "acres"}, "unit is 'acres'"),
    ],
)
def test_what_cannot_be_is_refused_with_its_name(told: dict[str, Any], says: str) -> None:
    with pytest.raises(EntryError, match=says):
        Water(day=DAY, **told)


def test_two_lines_of_emitters_wet_what_both_wet() -> None:
    """NEH 623 chapter 7, straight lines (from memory): 4 emitters 0.6 m apart, 0.9 m wide strip, 12
    m2 a plant wet 4 x 0.6 x 0.9 / 12 = 0.18; two such lines 0.36."""
    line = {"emitters_per_plant": 4, "spacing_m": 0.6, "strip_m": 0.9, "plant_area_m2": 12}
    system = {**basin.BOOK["systems"][0], "lines": [line, line]}
    part = Book.model_validate(basin.BOOK | {"systems": [system]}).systems[0]
    details = part.model_dump(mode="json")
    assert agronomy.wetted_fraction(details) == pytest.approx(0.36)
    with pytest.raises(ValueError, match="not both"):
        Book.model_validate(basin.BOOK | {"systems": [system | {"wetted_fraction": 0.3}]})


def presuming(db: Database, presume: bool = True) -> tuple[int, date]:
    """A basin whose farm presumes, run each morning until water is advised for that morning; the
    block and the day."""
    book = copy.deepcopy(basin.BOOK)
    book["farms"][0]["presume"] = presume
    book["irrigations"] = []
    with db.write() as session:
        load_book(session, Book.model_validate(book), "admin")
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv())
    for n in range(60):
        morning = date(2026, 5, 20) + n * ONE
        bring_up_to_date(db, morning)
        with db.read() as session:
            row = session.scalar(
                select(Advice)
                .join(Block, Block.id == Advice.block_id)
                .where(Advice.issued_on == morning, Advice.day == morning, Advice.stands)
                .where(Block.key == "whole")
            )
            if row is not None:
                return row.block_id, morning
    raise AssertionError("no morning asked for water")


def events_of(db: Database, block: int) -> list[Event]:
    with db.read() as session:
        found = session.scalars(
            select(Event).where(Event.block_id == block, Event.kind != "rain").order_by(Event.id)
        ).all()
        session.expunge_all()
    return list(found)


def test_what_was_advised_and_not_heard_of_is_presumed_once(db: Database) -> None:
    block, morning = presuming(db)
    assert events_of(db, block) == []
    for _ in range(2):
        bring_up_to_date(db, morning + ONE)
    (event,) = events_of(db, block)
    assert (event.confirmation, event.day, event.unit) == ("presumed", morning, "gross_mm")
    # deleted: it does not come back
    void_event(db, event.id, "a", "v", morning + ONE)
    bring_up_to_date(db, morning + ONE)
    assert [one.kind for one in events_of(db, block)] == ["irrigation", "void"]


def test_what_is_told_takes_the_place_of_what_was_presumed(db: Database) -> None:
    block, morning = presuming(db)
    bring_up_to_date(db, morning + ONE)
    told = Water(day=morning + ONE, amount=4, unit="hours")
    log_water(db, "long-piece", None, told, "a", "t", morning + ONE)
    presumed, real = events_of(db, block)
    assert real.supersedes == presumed.id
    assert (real.amount, real.confirmation) == (4, "reported")


def test_a_farm_that_does_not_presume_is_left_alone(db: Database) -> None:
    block, morning = presuming(db, presume=False)
    bring_up_to_date(db, morning + ONE)
    assert events_of(db, block) == []
