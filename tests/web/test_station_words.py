"""Marks and the sensor log on the station page, through the real workflows."""

import re

import pytest

from app.storage.database import Database
from tests.web.conftest import Browser
from tests.web.test_logging import token_of

PAGE = "/stations/bench"
MARK = {
    "quantity": "shortwave_down",
    "first": "2026-06-20",
    "last": "2026-06-22",
    "verdict": "bad",
    "why": "a <b>rag</b> lay on it",
}


def rungs(browser: Browser) -> dict[str, int]:
    """The rung of each day."""
    days = browser.get("/api/v1/stations/bench/days").json()["days"]
    return {day["day"]: day["rung"] for day in days}


def test_a_span_is_marked_bad_and_taken_back(live: Browser) -> None:
    before = rungs(live)
    form = {**MARK, "token": token_of(live.get(PAGE).text)}
    for _ in range(2):  # the same form twice marks once
        answer = live.post(f"{PAGE}/marks", data=form)
        assert answer.status_code == 303
        assert answer.headers["location"] == f"{PAGE}#words"
    text = live.get(PAGE).text
    assert "a &lt;b&gt;rag&lt;/b&gt; lay on it" in text
    assert "20 June 2026 to 22 June 2026" in text
    after = rungs(live)
    changed = {day for day in before if before[day] != after[day]}
    assert changed == {"2026-06-20", "2026-06-21", "2026-06-22"}
    places = re.findall(r'action="(/stations/bench/marks/\d+/take-back)"', text)
    assert len(places) == 1
    assert live.post(places[0]).status_code == 303
    assert live.post(places[0]).status_code == 303  # pressed twice
    assert rungs(live) == before
    assert "No span is marked." in live.get(PAGE).text


def test_a_calibration_counts_from_its_day_until_taken_back(live: Browser) -> None:
    def rs() -> dict[str, float]:
        days = live.get("/api/v1/stations/bench/days").json()["days"]
        return {day["day"]: day["shortwave_down"] for day in days}

    before = rs()
    form = {
        "kind": "calibration", "day": "2026-06-25", "quantity": "shortwave_down",
        "factor": "0,95", "token": "once",
    }  # fmt: skip
    assert live.post(f"{PAGE}/log", data=form).status_code == 303
    after = rs()
    assert after["2026-06-24"] == before["2026-06-24"]
    assert after["2026-06-25"] == pytest.approx(0.95 * before["2026-06-25"])
    text = live.get(PAGE).text
    assert "0.95" in text
    place = re.search(r'action="(/stations/bench/log/\d+/take-back)"', text)
    assert place is not None
    assert live.post(place[1]).status_code == 303
    assert rs() == before


@pytest.mark.parametrize(
    ("what", "change", "says"),
    [
        ("marks", {"first": "soon"}, "which is no date"),
        ("marks", {"last": "2027-01-01"}, "which lies to come"),
        ("marks", {"first": "0001-01-01"}, "which lies before 1980"),
        ("marks", {"last": "2026-06-10"}, "not after its start"),
        ("marks", {"from_time": "noon"}, "no time of day"),
        ("marks", {"from_time": "06:00+02:00"}, "no time of day"),
        ("marks", {"quantity": "luck"}, "no quantity"),
        ("marks", {"verdict": "void"}, "choose bad or good"),
        ("marks", {"why": " "}, "Why is empty"),
        ("log", {"kind": "void"}, "choose one of"),
        ("log", {"kind": "calibration", "quantity": ""}, "needs the quantity and the factor"),
        ("log", {"kind": "calibration", "factor": "3"}, "must lie between"),
        ("log", {"kind": "note", "note": ""}, "Note is empty"),
    ],
)
def test_what_cannot_be_said_is_refused_with_what_was_typed(
    live: Browser, what: str, change: dict[str, str], says: str
) -> None:
    form = {**MARK, "day": "2026-06-20", "note": "seen", **change}
    answer = live.post(f"{PAGE}/{what}", data=form)
    assert answer.status_code == 422
    assert says in answer.text
    assert 'role="alert"' in answer.text
    kept = 'value="seen"' if what == "log" and "note" not in change else ""
    assert kept in answer.text
    assert "No span is marked." in answer.text


def test_a_mark_is_taken_back_at_its_own_station_only(live: Browser) -> None:
    live.post(f"{PAGE}/marks", data={**MARK, "token": "mine"})
    assert live.post("/stations/meadow/marks/1/take-back").status_code == 404
    assert live.post(f"{PAGE}/marks/99/take-back").status_code == 404
    assert live.post(f"{PAGE}/log/1/take-back").status_code == 404
    assert "a &lt;b&gt;rag" in live.get(PAGE).text


def test_a_grower_sees_the_log_without_forms(filled_db: Database) -> None:
    demo = Browser(filled_db, demo=True)
    demo.get("/enter/grower?farm=hollin")
    text = demo.get("/stations/north").text
    assert "Sensor log" in text
    assert 'action="/stations/' not in text
    for what in ("marks", "log", "marks/1/take-back", "log/1/take-back"):
        assert demo.post(f"/stations/north/{what}", data=MARK).status_code == 403
    for what in ("marks", "log", "readings"):
        assert demo.post(f"/api/v1/stations/north/{what}", json={}).status_code == 403
    for what in ("marks/1", "log/1"):
        assert demo.request("DELETE", f"/api/v1/stations/north/{what}").status_code == 403
    assert demo.get("/api/v1/stations/north/log").json() == []
    assert demo.get("/api/v1/stations/bench/log").status_code == 404
