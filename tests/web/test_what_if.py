"""Water and rain tried on the days ahead: shown at once, and nothing is stored."""

import re
from datetime import timedelta

import pytest

from tests.web.conftest import Browser
from tests.workflows import basin

PAGE = "/fields/long-piece/what-if"
API = f"/api/v1{PAGE}"
TOMORROW = basin.TODAY + timedelta(days=1)


def test_water_tried_moves_its_day_and_those_after_it_alone(live: Browser) -> None:
    before = basin.derived(live.db)
    found = live.get(f"{API}?day={TOMORROW}&gross_mm=20").json()
    assert found["net_mm"] == pytest.approx(16.0)  # at 80 %
    today, tomorrow, *later = found["days"]
    assert today["tried_mm"] == today["depletion_mm"]
    # less what the wet soil evaporates
    assert 12.0 <= tomorrow["depletion_mm"] - tomorrow["tried_mm"] <= 16.0
    assert all(day["tried_mm"] < day["depletion_mm"] for day in later)
    if found["passes"] and found["tried_passes"]:
        assert found["tried_passes"] >= found["passes"]
    assert basin.derived(live.db) == before


def test_nothing_tried_is_the_advices_own_outlook(live: Browser) -> None:
    found = live.get(f"{API}?day={basin.TODAY}").json()
    (advice,) = live.get("/api/v1/fields/long-piece/advice").json()
    assert [day["depletion_mm"] for day in found["days"]] == pytest.approx(
        advice["outlook"]["depletion"], abs=1e-3
    )
    assert all(day["tried_mm"] == day["depletion_mm"] for day in found["days"])


def test_the_page_says_when_either_course_passes_the_limit(live: Browser) -> None:
    assert f'href="{PAGE}"' in live.get("/fields/long-piece").text
    text = re.sub(r"\s+", " ", live.get(f"{PAGE}?day={TOMORROW}&gross=20&rain=3,5").text)
    assert "As things stand" in text
    assert "16.0 mm net reach the roots" in text
    assert "Estimates to support a decision." in text


@pytest.mark.parametrize(
    ("query", "says"),
    [
        ("day=2026-01-01", "Day is 2026-01-01; give a day from 2026-07-01"),
        ("gross=much", "which is no number"),
        ("gross=900", "Gross_mm is 900"),
        ("day=soon", "which is no date"),
    ],
)
def test_what_cannot_be_tried_is_refused_in_words(live: Browser, query: str, says: str) -> None:
    answer = live.get(f"{PAGE}?{query}")
    assert answer.status_code == 422
    assert says in answer.text


def test_blocks_are_tried_one_by_one(live: Browser) -> None:
    lower = live.get(f"/api/v1/fields/two-halves/what-if?day={TOMORROW}&block=lower").json()
    upper = live.get(f"/api/v1/fields/two-halves/what-if?day={TOMORROW}&block=upper").json()
    assert lower["days"] != upper["days"]
    assert live.get(f"{PAGE}?block=nowhere").status_code == 404
