"""An advisor's decision: the advice stays as issued, and all that goes out follows the decision."""

from datetime import date, timedelta
from typing import Any

import pytest
from sqlalchemy import select

from app.storage import pages
from app.storage.database import Database
from app.storage.tables import Advice, Block
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.decide_on_advice import decide_on_advice
from app.workflows.letter_facts import farm_facts, letter_content
from app.workflows.log_event import log_irrigation
from app.workflows.once import EntryError
from tests.web.conftest import Browser
from tests.workflows import basin

TODAY = basin.TODAY
ONE = timedelta(days=1)


def decide(db: Database, verdict: str, token: str, today: date = TODAY, **more: Any) -> int:
    return decide_on_advice(db, "long-piece", None, verdict, "B. Lane", token, today, **more)


def row_of(db: Database, today: date = TODAY) -> pages.RoundsRow:
    with db.read() as session:
        return pages.rounds_rows(session, today, None, "long-piece")[0]


def advice_of(db: Database) -> list[tuple[Any, ...]]:
    with db.read() as session:
        return [tuple(row) for row in session.execute(select(*Advice.__table__.columns)).all()]


def letter(db: Database, today: date = TODAY) -> Any:
    with db.read() as session:
        facts = farm_facts(session, today)["reed"]
        return letter_content(facts, today, today, "example.org")


@pytest.fixture
def full(db: Database) -> Database:
    basin.fill(db)
    return db


def test_a_change_is_followed_and_the_advice_stays(full: Database) -> None:
    before = advice_of(full)
    advised = row_of(full)
    decide(full, "change", "t1", day=TODAY + 2 * ONE, hours=5, note="pump shared with the mill")
    row = row_of(full)
    assert (row.day, row.hours, row.gross_mm) == (TODAY + 2 * ONE, 5, pytest.approx(30))
    assert row.net_mm == pytest.approx(24)  # 6 mm/h for 5 h at 0.8
    assert row.volume_m3 == pytest.approx(3000)
    assert row.issued == advised
    assert advice_of(full) == before
    (item, *_) = [one for one in letter(full).items if one.field_key == "long-piece"]
    assert (item.day, item.hours, item.decided) == (TODAY + 2 * ONE, 5, True)
    decide(full, "take_back", "t2")
    assert row_of(full) == advised


def test_water_withheld_is_said_with_its_reason_and_runs_out(full: Database) -> None:
    decide(full, "withhold", "t1", day=TODAY + ONE, note="spraying on Thursday")
    row = row_of(full)
    assert (row.day, row.gross_mm) == (None, 0)
    told = letter(full)
    assert "long-piece" not in {item.field_key for item in told.items}
    assert [(one.field, one.until, one.note) for one in told.withheld] == [
        ("Long Piece", TODAY + ONE, "spraying on Thursday")
    ]
    assert "Long Piece" not in told.rest
    for n in (1, 2):
        bring_up_to_date(full, TODAY + n * ONE)
    assert row_of(full, TODAY + ONE).decision is not None
    assert row_of(full, TODAY + 2 * ONE).decision is None


def test_a_new_number_of_the_morning_keeps_the_decision_until_it_is_watered(
    full: Database,
) -> None:
    decide(full, "change", "t1", day=TODAY + 3 * ONE, hours=4)
    log_irrigation(full, "long-piece", None, TODAY - 5 * ONE, 3, "gross_mm", "a", "w1", TODAY)
    assert row_of(full).decision is not None
    log_irrigation(full, "long-piece", None, TODAY, 4, "hours", "a", "w2", TODAY)
    assert row_of(full).decision is None


def test_accepting_twice_by_the_same_form_is_one_decision(full: Database) -> None:
    number = decide(full, "accept", "t1")
    assert decide(full, "accept", "t1") == number
    row = row_of(full)
    assert row.decision is not None
    assert row.decision.verdict == "accept"
    with full.read() as session:
        block = session.scalars(select(Block.id).where(Block.key == "whole")).one()
        number_of = session.scalars(
            select(Advice.number).where(Advice.block_id == block, Advice.stands)
        ).all()
    assert row.decision.number in number_of


@pytest.mark.parametrize(
    ("verdict", "more", "says"),
    [
        ("perhaps", {}, "verdict is 'perhaps'"),
        ("withhold", {}, "say why"),
        ("accept", {"hours": 3}, "choose change"),
        ("change", {"day": TODAY - ONE}, "day is 2026-06-30"),
        ("change", {"day": TODAY + 60 * ONE}, "day is 2026-08-30"),
        ("change", {"hours": 0}, "hours is 0"),
        ("change", {"hours": float("nan")}, "hours is nan"),
    ],
)
def test_what_cannot_be_decided_is_refused(
    full: Database, verdict: str, more: dict[str, Any], says: str
) -> None:
    with pytest.raises(EntryError, match=says):
        decide(full, verdict, "t", **more)
    assert row_of(full).decision is None


def test_nothing_to_decide_on(db: Database) -> None:
    with pytest.raises(EntryError, match="no field"):
        decide(db, "accept", "t")


def test_the_api_tells_advice_and_decision_apart(full: Database) -> None:
    browse = Browser(full, today=TODAY)
    before = browse.get("/api/v1/rounds").json()["fields"]
    decide(full, "change", "t1", day=TODAY + 3 * ONE, hours=4)
    after = browse.get("/api/v1/rounds").json()["fields"]
    assert {one["key"]: one["advice"] for one in after} == {
        one["key"]: one["advice"] for one in before
    }
    decision = next(one for one in after if one["key"] == "long-piece")["decision"]
    assert (decision["verdict"], decision["hours"], decision["day"]) == ("change", 4, "2026-07-04")
    assert all(one["decision"] is None for one in after if one["key"] != "long-piece")
