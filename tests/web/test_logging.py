"""Logging water: on the Rounds and on the Field page, through the real workflows."""

import re

import pytest

from tests.web.conftest import Browser
from tests.workflows.basin import TODAY

DAY = "2026-06-30"


def depletion(browser: Browser, key: str = "long-piece") -> float:
    """The depletion of this morning's advice."""
    for field in browser.get("/api/v1/rounds").json()["fields"]:
        if field["key"] == key:
            return float(field["advice"]["depletion_mm"])
    raise AssertionError(key)


def token_of(text: str) -> str:
    """The once-only token of a page's form."""
    found = re.search(r'name="token" value="([^"]+)"', text)
    assert found is not None
    return found.group(1)


def test_hours_written_into_rows_are_logged_with_one_press(live: Browser) -> None:
    text = live.get("/").text
    before = depletion(live)
    form = {
        "token": token_of(text),
        "day": DAY,
        "h.long-piece": "2,5",
        "h.two-halves": "3",
        "sort": "farm",
    }
    answer = live.post("/rounds/log", data=form)
    assert answer.status_code == 303
    assert answer.headers["location"] == "/?sort=farm&logged=2#long-piece"
    after = live.get("/?sort=farm&logged=2").text
    assert "Logged for 2 fields." in after
    assert "2.5 h yesterday" in after
    # 2.5 h at 6 mm/h and 80 % are 12 mm net, less what the wet soil evaporates
    assert before - 12.0 <= depletion(live) <= before - 9.0


def test_the_same_form_sent_twice_changes_nothing(live: Browser) -> None:
    form = {"token": "once-only", "day": DAY, "h.long-piece": "2"}
    live.post("/rounds/log", data=form)
    first = depletion(live)
    assert live.post("/rounds/log", data=form).status_code == 303
    assert depletion(live) == first
    events = live.get("/api/v1/fields/long-piece/events").json()
    assert sum(event["day"] == DAY for event in events) == 1


def test_a_fragment_holds_the_changed_rows_alone(live: Browser) -> None:
    answer = live.post(
        "/rounds/log",
        data={"token": "abcd", "day": DAY, "h.long-piece": "2"},
        headers={"Rillbook-Fragment": "rows"},
    )
    assert answer.status_code == 200
    assert re.findall(r'<tr id="([\w-]+)"', answer.text) == ["long-piece"]
    assert "Logged for 1 field." in answer.text
    assert token_of(answer.text) != "abcd"
    assert "<h1" not in answer.text


@pytest.mark.parametrize(
    ("typed", "day", "says"),
    [
        ("abc", DAY, "hours is &#39;abc&#39;, which is no number. Write a number such as 7.5."),
        ("-3", DAY, "hours is -3; one run takes above 0, at most 168."),
        ("9999999", DAY, "hours is 9999999; one run takes above 0, at most 168."),
        ("5", "2031-01-01", "log water when it has run"),
        ("5", "yesterday", "which is no date"),
    ],
)
def test_what_cannot_be_logged_says_why_and_stays_in_its_row(
    live: Browser, typed: str, day: str, says: str
) -> None:
    before = depletion(live)
    answer = live.post("/rounds/log", data={"token": "abcd", "day": day, "h.long-piece": typed})
    assert answer.status_code == 422
    assert says in answer.text
    assert f'value="{typed}"' in answer.text
    assert "Not logged for 1 field: see its row." in answer.text
    assert depletion(live) == before


def test_good_rows_are_logged_beside_a_bad_one(live: Browser) -> None:
    form = {"token": "abcd", "day": DAY, "h.long-piece": "2", "h.two-halves": "many"}
    answer = live.post("/rounds/log", data=form)
    assert answer.status_code == 422
    assert "Logged for 1 field. Not logged for 1 field" in answer.text
    assert 'value="many"' in answer.text
    assert "2.0 h yesterday" in answer.text


def test_an_entry_is_logged_corrected_and_deleted_on_the_field_page(live: Browser) -> None:
    page = "/fields/long-piece"
    start = depletion(live)
    form = {
        "token": token_of(live.get(page).text),
        "day": DAY,
        "amount": "10",
        "unit": "gross_mm",
        "note": "left sector <b>only</b>",
    }
    answer = live.post(f"{page}/events", data=form)
    assert answer.headers["location"] == f"{page}#events"
    text = live.get(page).text
    assert "left sector &lt;b&gt;only&lt;/b&gt;" in text
    assert start - 8.0 <= depletion(live) <= start - 6.0

    number = live.get("/api/v1/fields/long-piece/events").json()[0]["id"]
    change = {"token": "c-1", "day": DAY, "amount": "5", "unit": "gross_mm", "note": "half"}
    assert live.post(f"{page}/events/{number}", data=change).status_code == 303
    assert "corrected" in live.get(page).text
    assert start - 4.0 <= depletion(live) <= start - 2.0

    event = live.get("/api/v1/fields/long-piece/events").json()[0]
    assert event["supersedes"] == number
    gone = live.post(f"{page}/events/{event['id']}/delete", data={"token": "d-1"})
    assert gone.status_code == 303
    assert depletion(live) == start
    # the superseded entry cannot be changed any more
    late = live.post(f"{page}/events/{number}", data={**change, "token": "c-2"})
    assert late.status_code == 422
    assert "changed by somebody else meanwhile" in late.text


def test_rain_of_the_own_gauge_takes_the_place_of_the_stations(live: Browser) -> None:
    page = "/fields/long-piece"
    start = depletion(live)
    form = {"token": "rain", "day": DAY, "amount": "9", "unit": "rain_mm"}
    assert live.post(f"{page}/events", data=form).status_code == 303
    assert "rain, own gauge" in live.get(page).text
    assert depletion(live) < start - 5
    working = live.get(f"{page}/days/{DAY}").text
    assert "the field’s own gauge" in working


def test_a_block_can_be_watered_alone(live: Browser) -> None:
    form = {"token": "b-1", "day": DAY, "amount": "12", "unit": "net_mm", "block": "upper"}
    answer = live.post("/fields/two-halves/events", data=form)
    assert answer.headers["location"] == "/fields/two-halves?block=upper#events"
    events = live.get("/api/v1/fields/two-halves/events").json()
    assert [event["block"] for event in events if event["day"] == DAY] == ["upper"]
    wrong = live.post("/fields/two-halves/events", data={**form, "block": "nope", "token": "b"})
    assert wrong.status_code in (404, 422)


def test_bad_entries_of_the_field_page_are_refused_in_words(live: Browser) -> None:
    for form, says in (
        ({"amount": "", "day": DAY}, "which is no number"),
        ({"amount": "5", "day": ""}, "which is no date"),
        ({"amount": "5", "day": DAY, "unit": "buckets"}, "Unit is"),
        ({"amount": "5", "day": DAY, "purpose": "fun"}, "choose one of"),
        ({"amount": "5", "day": DAY, "note": "x" * 500}, "note is"),
    ):
        answer = live.post("/fields/long-piece/events", data={"token": "abcd", **form})
        assert answer.status_code == 422, form
        assert says in answer.text, form
        if form["amount"] and "note" not in form:
            assert 'value="5" required' in answer.text, form


def test_the_morning_can_be_worked_out_by_hand(live: Browser) -> None:
    assert live.post("/rounds/up-to-date").headers["location"] == "/"
    assert live.get("/api/v1/rounds").json()["morning"] == str(TODAY)


def test_hours_no_run_can_take_are_refused_in_the_row(live: Browser) -> None:
    for typed in ("500", "-3", "0"):
        form = {"token": f"slip{typed}", "day": DAY, "h.long-piece": typed}
        answer = live.post("/rounds/log", data=form)
        assert answer.status_code == 422
        assert f"hours is {typed}; one run takes above 0, at most 168." in answer.text
    events = live.get("/api/v1/fields/long-piece/events").json()
    assert not any(event["amount"] == 500 for event in events)


def test_far_more_hours_than_advised_are_asked_again_before_they_are_logged(live: Browser) -> None:
    form = {"token": "slip", "day": DAY, "h.long-piece": "60"}
    before = depletion(live)
    answer = live.post("/rounds/log", data=form)
    assert answer.status_code == 422
    assert "60 h?" in answer.text
    assert "log it again as it stands" in answer.text
    assert depletion(live) == before
    assert 'name="sure.long-piece" value="60"' in answer.text
    # another figure than the one asked about is asked again, the same one is logged
    assert live.post("/rounds/log", data=form | {"sure.long-piece": "6"}).status_code == 422
    assert live.post("/rounds/log", data=form | {"sure.long-piece": "60"}).status_code == 303
    assert depletion(live) < before
