"""A shared supply: from the book to its plan, pinned by hand (regression of our own rules)."""

from typing import Any

import pytest

from app.book import Book
from app.workflows.load_book import load_book
from tests.web.conftest import Browser
from tests.workflows import basin

DITCH: dict[str, Any] = {
    "key": "ditch",
    "name": "Mill Ditch",
    "flow_m3_h": 950,
    "tariff": [
        {"name": "night", "hours": 9, "price_m3": 0.04},
        {"name": "day", "hours": 12, "price_m3": 0.1},
    ],
    "fields": ["long-piece", "two-halves"],
}


def load(live: Browser, **said: object) -> dict[str, int]:
    with live.db.write() as session:
        book = Book.model_validate({"supplies": [DITCH | said]})
        return load_book(session, book, "admin").added


def test_a_supply_of_the_book_is_planned_and_loading_it_twice_changes_nothing(
    live: Browser,
) -> None:
    assert load(live) == {"supplies": 1}
    assert load(live) == {}
    assert "Mill Ditch" in live.get("/supply").text
    before = basin.derived(live.db)
    text = live.get("/supply/ditch?days=10").text
    for words in ("Long Piece", "Two Halves 1", "Two Halves 2", "load m³", "cost", "of urgency"):
        assert words in text
    assert basin.derived(live.db) == before


def test_what_stops_the_advice_is_named(live: Browser) -> None:
    spent = {"first": "2026-06-01", "last": "2026-09-30", "volume_m3": 0}
    load(live, allocations=[spent])
    text = live.get("/supply/ditch?days=14").text
    assert "Given up" in text
    assert "the allocation is spent" in text
    load(live, turn={"first": "2027-01-01", "every_days": 9})
    text = live.get("/supply/ditch?days=14").text
    assert "no turn" in text
    assert "no day of the turn" in text


def test_a_set_is_pinned_or_forbidden_by_hand(live: Browser) -> None:
    load(live)
    pinned = live.get(f"/supply/ditch?block=1&day={basin.TODAY}&hours=3").text
    assert "<b>3.0</b> by hand" in pinned
    assert f'value="1~{basin.TODAY}~3"' in pinned
    off = live.get(f"/supply/ditch?pin=1~{basin.TODAY}~0").text
    assert "<b>0.0</b> by hand" in off
    assert "no water" in off


@pytest.mark.parametrize(
    "query",
    [
        f"block=1&day={basin.TODAY}&hours=99",
        "block=x&day=2026-07-01&hours=3",
        "pin=odd",
        f"pin=1~{basin.TODAY}~24",
        "pin=1~never~4",
    ],
)
def test_pins_that_cannot_be_are_refused_with_why(live: Browser, query: str) -> None:
    load(live)
    answer = live.get(f"/supply/ditch?{query}")
    assert answer.status_code == 422
    assert "Not planned" in answer.text


def test_wrong_supplies_are_refused() -> None:
    for said, words in (
        ({"tariff": [{"name": "all", "hours": 20}, {"name": "more", "hours": 5}]}, "24 a day"),
        ({"fields": []}, "at least 1"),
        ({"turn": {"first": "2026-07-01", "every_days": 2, "for_days": 3}}, "for_days"),
    ):
        with pytest.raises(ValueError, match=words):
            Book.model_validate({"supplies": [DITCH | said]})
