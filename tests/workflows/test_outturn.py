"""How advice turned out, from the ledgers that came; the skill by hand on a few mornings."""

from datetime import timedelta

import numpy as np
import pytest
from sqlalchemy import delete, select

from app.science.advice.outturn import comparable, done, skill
from app.storage.database import Database
from app.storage.tables import Advice, Block
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.decide_on_advice import decide_on_advice
from app.workflows.log_event import log_irrigation
from app.workflows.outturn import outturns
from tests.web.conftest import Browser
from tests.workflows import basin

ONE = timedelta(days=1)


@pytest.mark.parametrize(
    ("at", "asked", "net", "what"),
    [
        (1, 20.0, [0, 20, 0], "followed"),
        (1, 20.0, [0, 0, 24], "followed"),
        (1, 20.0, [0, 0, 26], "otherwise"),
        (0, 20.0, [0, 0, 20], "otherwise"),
        (1, 20.0, [0, 0, 0], "not done"),
        (None, 0.0, [0, 3, 0], "unasked"),
        (None, 0.0, [0, np.nan, 0], "no need"),
    ],
)
def test_what_was_done(at: int | None, asked: float, net: list[float], what: str) -> None:
    assert done(at, asked, np.array(net, float)) == what


def test_skill_by_hand() -> None:
    """Errors 1 and -3: bias -1, RMSE sqrt 5; one of two in the range; carried on: 2 and 0."""
    foretold, known = np.array([[11.0], [7.0], [99.0]]), np.array([[10.0], [10.0], [0.0]])
    low, high = np.array([[9.0], [6.0], [0.0]]), np.array([[12.0], [8.0], [1.0]])
    plain = np.array([[12.0], [10.0], [0.0]])
    use = comparable(np.array([[0.0], [0.0], [5.0]]))
    (one,) = skill(foretold, low, high, known, plain, use)
    assert (one.lead, one.n, one.bias, one.covered) == (1, 2, -1.0, 0.5)
    assert one.rmse == pytest.approx(5.0**0.5)
    assert one.persistence == pytest.approx(2.0**0.5)


def test_mornings_without_a_range_or_a_week_before_are_left_out_of_those_figures() -> None:
    known, nan = np.array([[10.0], [10.0]]), np.nan
    (one,) = skill(
        known, np.array([[9.0], [nan]]), np.array([[11.0], [nan]]), known,
        np.array([[nan], [nan]]), np.ones((2, 1), np.bool_),
    )  # fmt: skip
    assert (one.n, one.covered) == (2, 1.0)
    assert np.isnan(one.persistence)


def test_what_the_advisor_decided_is_what_was_to_be_followed(db: Database) -> None:
    basin.fill(db, basin.TODAY - 12 * ONE)
    morning = basin.TODAY - 12 * ONE
    bring_up_to_date(db, morning)
    decide_on_advice(
        db, "long-piece", None, "change", "B. Lane", "d1", morning, day=morning + 3 * ONE, hours=4
    )
    log_irrigation(
        db, "long-piece", None, morning + 3 * ONE, 4, "hours", "a", "t", morning + 4 * ONE
    )
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv(), basin.TODAY)
    with db.read() as session:
        found = outturns(session, basin.TODAY, 30, farm="reed")
    one = next(one for one in found.each if one.decided is not None)
    assert one.decided is not None
    assert (one.decided.verdict, one.done) == ("change", "followed")


def test_outturns_of_a_field_watered_as_advised_and_one_that_was_not(db: Database) -> None:
    basin.fill(db)
    first = basin.TODAY - 21 * ONE
    with db.write() as session:
        session.execute(delete(Advice))
    watered = False
    for n in range(15):
        morning = first + n * ONE
        bring_up_to_date(db, morning)
        with db.read() as session:
            block = session.scalars(select(Block.id).where(Block.key == "whole")).one()
        row = basin.standing_advice(db, morning)[block]
        if row.day == morning and not watered:
            log_irrigation(
                db, "long-piece", None, morning, row.gross_mm, "gross_mm", "a", "t", morning
            )
            watered = True
    bring_up_to_date(db, basin.TODAY)
    with db.read() as session:
        found = outturns(session, basin.TODAY, 30)
    assert {one.advice.issued_on for one in found.each} == {first + n * ONE for n in range(15)}
    assert {one.done for one in found.each} >= {"not done"}
    assert watered
    assert found.count("followed") > 0
    leads = {one.lead: one for one in found.skill}
    assert set(leads) == {1, 3, 7}
    assert leads[1].rmse < leads[7].rmse
    assert leads[1].n >= leads[7].n > 0
    assert 0.0 <= leads[7].covered <= 1.0
    text = Browser(db, today=basin.TODAY).get("/outturn").text
    assert "not watered" in text
    assert "in the range" in text
