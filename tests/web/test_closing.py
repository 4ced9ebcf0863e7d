"""Closing water on the Field page and in the API."""

from datetime import date, timedelta

from tests.web.conftest import Browser
from tests.workflows import basin

API = "/api/v1/fields/long-piece/closing-water"


def test_the_last_application_leaves_the_allowed_depletion(live: Browser) -> None:
    found = live.get(API).json()
    days = [date.fromisoformat(one["day"]) for one in found["applications"]]
    assert days
    assert days == sorted(days)
    assert days[0] >= basin.TODAY
    assert days[-1] < date.fromisoformat(found["maturity"])
    assert found["left_mm"] <= found["allowed_mm"] + 6.0 * 0.8  # less than a least application
    for one in found["applications"]:
        assert 6.0 - 1e-6 <= one["gross_mm"] <= 40.0 + 1e-6  # the pivot's least and most
        assert abs(one["net_mm"] - 0.8 * one["gross_mm"]) < 1e-6
    page = live.get("/fields/long-piece").text
    assert "Closing water:" in page
    assert "none after it pays" in page


def test_a_crop_that_may_dry_out_further_asks_for_less_water(live: Browser) -> None:
    before = live.get(API).json()
    form = {"was": "2026-04-20", "planting": "2026-04-20", "crop": "maize_grain"}
    answer = live.post("/fields/long-piece/seasons", data={**form, "allowed_at_maturity": "85"})
    assert answer.status_code in (200, 303), answer.text
    after = live.get(API).json()
    assert after["allowed_share"] == 0.85
    water = [sum(one["net_mm"] for one in told["applications"]) for told in (before, after)]
    assert water[1] < water[0]


def test_it_stores_nothing_and_speaks_of_a_season_alone(live: Browser) -> None:
    before = basin.derived(live.db)
    assert live.get("/api/v1/fields/two-halves/closing-water?block=lower").json()["maturity"]
    assert basin.derived(live.db) == before
    soon = {"was": "2026-04-20", "planting": "2026-04-20", "crop": "maize_grain"}
    end = str(basin.TODAY + timedelta(days=2))
    live.post("/fields/long-piece/seasons", data={**soon, "end": end})
    assert live.get(API).json()["maturity"] == end
