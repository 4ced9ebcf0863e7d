"""What was seen on a field, through its page and the API."""

import re

import pytest

from app.book import Book
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book
from tests.web.conftest import Browser
from tests.web.test_logging import depletion, token_of
from tests.workflows import basin
from tests.workflows.test_features import OWN, SEASON

PAGE = "/fields/long-piece"
READING = {
    "kind": "reading", "day": "2026-06-30", "hour": "6", "method": "volumetric", "trust": "full",
    "depth1": "15", "value1": "0,20", "depth2": "45", "value2": "0.20", "depth3": "75",
    "value3": "0.20",
}  # fmt: skip


def test_a_reading_logged_on_the_page_corrects_and_shows_both_spreads(live: Browser) -> None:
    text = live.get(PAGE).text
    before = depletion(live)
    answer = live.post(f"{PAGE}/seen", data=READING | {"token": token_of(text)})
    assert answer.status_code == 303
    after = live.get(PAGE).text
    assert "water content, m³/m³: 0.2 at 0.15 m, 0.2 at 0.45 m" in after
    assert re.search(r"the ledger had \d+ ± \d+ mm depleted, the reading says \d+ ± \d+", after)
    assert "taken in full" in after
    assert depletion(live) != before
    # deleted, the ledger is as it was
    number = re.search(
        r'/events/(\d+)/delete"><input type="hidden" name="token" value="[^"]*\.s', after
    )
    assert number is not None
    live.post(f"{PAGE}/events/{number.group(1)}/delete", data={"token": "gone"})
    assert depletion(live) == before


@pytest.mark.parametrize(
    ("form", "says"),
    [
        ({**READING, "value1": "wet"}, "reading 1 is &#39;wet&#39;"),
        ({**READING, "value2": ""}, "reading 2 is"),
        ({"kind": "reading", "day": "2026-06-30"}, "No depth has a reading."),
        ({"kind": "cover", "day": "2026-06-30", "cover": "140", "height": "1"}, "Cover is 1.4"),
        ({"kind": "keep_off", "day": "2026-07-05", "last": "2026-07-01"}, "give a last day from"),
        ({"kind": "note", "day": "2026-06-30"}, "Note is empty"),
        ({"kind": "stage", "day": "2026-06-30", "stage": "9"}, "Stage is 9"),
        ({"kind": "gossip", "day": "2026-06-30"}, "Kind is"),
    ],
)
def test_what_cannot_be_is_refused_in_words(live: Browser, form: dict[str, str], says: str) -> None:
    answer = live.post(f"{PAGE}/seen", data=form)
    assert answer.status_code == 422
    assert says in answer.text
    assert "Nothing was changed" in answer.text


def test_the_api_logs_lists_and_deletes(live: Browser) -> None:
    base = "/api/v1/fields/long-piece"
    given = {
        "kind": "reading", "day": "2026-06-30", "token": "abcd",
        "reading": {"method": "tension", "trust": "weighed", "depths": [
            {"depth_m": 0.3, "value": 60}]},
    }  # fmt: skip
    made = live.post(f"{base}/seen", json=given)
    assert made.status_code == 201
    assert live.post(f"{base}/seen", json=given).json() == made.json()
    (row,) = live.get(f"{base}/seen").json()
    assert row["why"] == "weighed"
    assert 0 < row["gain"] < 1
    assert row["after_spread_mm"] < row["before_spread_mm"]
    assert (
        live.request("DELETE", f"{base}/events/{made.json()['id']}?token=gone").status_code == 204
    )
    assert live.get(f"{base}/seen").json() == []
    wrong = live.post(f"{base}/seen", json=given | {"token": "wxyz", "reading": {"method": "x"}})
    assert wrong.status_code == 422
    bare = live.post(f"{base}/seen", json={"kind": "cover", "day": "2026-06-30", "token": "qrst"})
    assert "height_m" in bare.json()["detail"]


def test_water_is_shown_apart_from_what_was_seen(live: Browser) -> None:
    live.post(f"{PAGE}/seen", data={"kind": "note", "day": "2026-06-30", "note": "aphids <b>"})
    text = live.get(PAGE).text
    assert "aphids &lt;b&gt;" in text
    assert "aphids" not in live.get("/").text
    events = live.get("/api/v1/fields/long-piece/events").json()
    assert all(event["kind"] in ("irrigation", "rain") for event in events)


def test_a_stage_seen_moves_the_stages_shown(live: Browser) -> None:
    seen = {"kind": "stage", "day": "2026-06-25", "stage": "3"}
    assert live.post(f"{PAGE}/seen", data=seen).status_code == 303
    text = re.sub(r"\s+", " ", live.get(PAGE).text)
    assert "<dt>development to</dt><dd>24 June</dd>" in text


def test_a_crop_of_ones_own_shows_where_its_figures_are_from(live: Browser) -> None:
    book = {**basin.BOOK, "seasons": [{**SEASON, **OWN}]}
    with live.db.write() as session:
        load_book(session, Book.model_validate(book), "admin")
    bring_up_to_date(live.db, basin.TODAY)
    text = live.get(PAGE).text
    assert "own strip trial 2024, north end" in text
    assert "quinoa, day" in text
    assert live.get("/").status_code == 200
    assert live.get(f"{PAGE}/days/2026-06-20").status_code == 200


def test_the_season_so_far_adds_up_and_estimates_the_yield(live: Browser) -> None:
    """FAO-56 eq 90 with the season's Ky of FAO-33 for maize, 1.25."""
    days = live.get("/api/v1/fields/long-piece/ledger?first=2026-04-20").json()["days"]
    et, etc, rain = (
        sum(day[name] for day in days) for name in ("et_actual_mm", "etc_potential_mm", "rain_mm")
    )
    late = sum(day["depletion_mm"] > day["limit_mm"] for day in days)
    text = re.sub(r"\s+", " ", live.get(PAGE).text)
    assert f"<dt>rain</dt><dd>{rain:.0f} mm</dd>" in text
    assert f"<dt>days past the limit</dt><dd>{late} of {len(days)}</dd>" in text
    share = max(0.0, 1 - 1.25 * (1 - et / etc))
    assert f"about {100 * share:.0f}" in text
    assert "by Ky 1.25" in text


def test_water_faster_than_the_soil_takes_it_is_warned_of(live: Browser) -> None:
    slow = {**basin.BOOK, "soils": [{**basin.BOOK["soils"][0], "intake_mm_h": 4},
                                    basin.BOOK["soils"][1]]}  # fmt: skip
    assert "stands or runs" not in live.get(PAGE).text
    with live.db.write() as session:
        load_book(session, Book.model_validate(slow), "admin")
    text = live.get(PAGE).text
    assert "Water falls at 6.0 mm/h, the soil takes 4.0" in text
