"""The API: the same things as the pages, with problem details on errors."""

from typing import Any

import pytest
from sqlalchemy import create_engine, event, text

from app.storage.database import Database, _begin_sqlite
from tests.web.conftest import Browser
from tests.workflows import basin

EVENT = {"day": "2026-06-30", "amount": 2.5, "unit": "hours", "token": "abcd"}
FOUND = "date,tmax (degC),tmin (degC)\n2026-06-29,44,12\n2026-06-30,45,12\n"
BASE = "/api/v1/fields/long-piece"


def test_fields_ledger_and_advice_agree(live: Browser) -> None:
    rounds = live.get("/api/v1/rounds").json()
    assert rounds["today"] == rounds["morning"] == str(basin.TODAY)
    assert [field["key"] for field in live.get("/api/v1/fields").json()] == [
        "long-piece",
        "two-halves",
    ]
    two = live.get("/api/v1/fields/two-halves").json()
    assert [block["key"] for block in two["blocks"]] == ["upper", "lower"]
    assert two["sources"]["rain"] == "meadow"
    assert two["sources"]["energy"] == "bench"
    ledger = live.get(f"{BASE}/ledger?first=2026-06-01&last=2026-06-30").json()
    assert len(ledger["days"]) == 30
    last = ledger["days"][-1]
    (advice,) = live.get(f"{BASE}/advice").json()
    assert advice["depletion_mm"] == pytest.approx(last["depletion_mm"])
    assert advice["says"].endswith(".")
    assert len(advice["outlook"]["date"]) == 14
    assert len(live.get("/api/v1/fields/two-halves/advice").json()) == 2
    one = live.get("/api/v1/fields/two-halves/advice?block=lower").json()
    assert len(one) == 1


def test_events_are_posted_put_and_deleted(live: Browser) -> None:
    made = live.post(f"{BASE}/events", json=EVENT)
    assert made.status_code == 201
    number = made.json()["id"]
    assert live.post(f"{BASE}/events", json=EVENT).json()["id"] == number
    change = {**EVENT, "amount": 1.0, "token": "efgh"}
    changed = live.request("PUT", f"{BASE}/events/{number}", json=change)
    assert changed.status_code == 200
    listed = live.get(f"{BASE}/events?since=2026-06-30").json()
    assert [(event["id"], event["amount"]) for event in listed] == [(changed.json()["id"], 1.0)]
    gone = live.request("DELETE", f"{BASE}/events/{listed[0]['id']}?token=ijkl")
    assert gone.status_code == 204
    assert live.get(f"{BASE}/events?since=2026-06-30").json() == []


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"amount": -1}, "amount"),
        ({"amount": "lots"}, "amount"),
        ({"day": "soon"}, "day"),
        ({"day": "2031-01-01"}, "day"),
        ({"unit": "buckets"}, "unit"),
        ({"token": ""}, "token"),
        ({"purpose": "fun"}, "purpose"),
        ({"surprise": 1}, "surprise"),
    ],
)
def test_what_is_refused_names_field_value_and_remedy(
    live: Browser, change: dict[str, Any], field: str
) -> None:
    answer = live.post(f"{BASE}/events", json={**EVENT, **change})
    assert answer.status_code == 422
    assert answer.headers["content-type"] == "application/problem+json"
    (error,) = answer.json()["errors"]
    assert error["field"] == field
    assert error["remedy"]
    assert live.get(f"{BASE}/events?since=2026-06-30").json() == []


def test_stations_and_their_days(live: Browser) -> None:
    stations = live.get("/api/v1/stations").json()
    assert [station["key"] for station in stations] == ["bench", "meadow"]
    assert stations[0]["last_day"] == "2026-06-30"
    days = live.get("/api/v1/stations/bench/days?first=2026-06-29").json()["days"]
    assert [day["day"] for day in days] == ["2026-06-29", "2026-06-30"]
    assert days[0]["rung"] == 5
    assert days[0]["eto"] > 0


def test_an_intake_by_the_api(live: Browser) -> None:
    made = live.post(
        "/api/v1/intakes",
        data={"station": "bench"},
        files={"file": ("new.csv", FOUND)},
    )
    assert made.status_code == 201
    preview = made.json()
    assert preview["rows_accepted"] == 2
    number = preview["id"]
    mapping = preview["mapping"]
    again = live.request("PUT", f"/api/v1/intakes/{number}/mapping", json=mapping)
    assert again.json()["mapping"] == mapping
    bad = live.request("PUT", f"/api/v1/intakes/{number}/mapping", json={**mapping, "x": 1})
    assert bad.status_code == 422
    applied = live.post(f"/api/v1/intakes/{number}/apply").json()
    assert applied["days_changed"] >= 1
    assert live.post(f"/api/v1/intakes/{number}/apply").status_code == 422
    assert live.post(f"/api/v1/intakes/{number}/undo").json()["days_changed"] >= 1
    assert live.request("DELETE", f"/api/v1/intakes/{number}").status_code == 422
    assert live.get("/api/v1/intakes?station=bench").json()[0]["state"] == "undone"
    assert live.get("/api/v1/intakes/9999").status_code == 404
    nowhere = live.post(
        "/api/v1/intakes", data={"station": "moon"}, files={"file": ("a.csv", "a\n")}
    )
    assert nowhere.json()["errors"][0]["field"] == "station"


def test_every_answer_of_the_openapi_examples_is_taken(live: Browser) -> None:
    document = live.get("/api/v1/openapi.json").json()
    schemas = document["components"]["schemas"]
    example = {**schemas["EventIn"]["examples"][0], "day": "2026-06-30"}
    assert live.post(f"{BASE}/events", json=example).status_code == 201


def test_pages_and_api_on_both_databases(db: Database) -> None:
    basin.fill(db)
    browser = Browser(db, today=basin.TODAY)
    for path in (
        "/",
        "/fields/long-piece",
        "/fields/two-halves?block=lower&season=whole",
        "/fields/long-piece/days/2026-06-30",
        "/stations",
        "/stations/bench",
        "/stations/bench/days/2026-06-30",
        "/intake",
        "/intake/1",
        "/api/v1/rounds",
        "/api/v1/stations",
        "/fields/long-piece/ledger.csv",
    ):
        answer = browser.get(path)
        assert answer.status_code == 200, (path, answer.text[:300])
    odd = {"day": "2026-06-30", "amount": 1, "token": "nul\0nul", "note": "a\0b"}
    assert browser.post(f"{BASE}/events", json=odd).status_code == 201


@pytest.mark.parametrize(
    ("place", "change", "says"),
    [
        (1, {"quantity": "temprature"}, "'temprature' is no quantity known here"),
        (0, {"quantity": "rain", "unit": "mm"}, "a column that says when cannot be read as rain"),
        (2, {"quantity": "air_temperature_max"}, "are both mapped to air_temperature_max"),
        (1, {"unit": "mm"}, "the unit 'mm' does not measure"),
        (1, {"factor": 0.0}, "its factor is 0"),
        (1, {"needs_body": True}, "air_temperature_max takes no body temperature"),
    ],
)
def test_a_mapping_that_contradicts_itself_is_refused_by_column(
    live: Browser, place: int, change: dict[str, Any], says: str
) -> None:
    sent = {"file": ("found.csv", FOUND.encode(), "text/csv")}
    made = live.post("/api/v1/intakes", data={"station": "bench"}, files=sent).json()
    mapping = made["mapping"]
    mapping["columns"][place].update(change)
    answer = live.request("PUT", f"/api/v1/intakes/{made['id']}/mapping", json=mapping)
    assert answer.status_code == 422
    assert says in answer.json()["detail"]


@pytest.mark.parametrize(
    ("change", "says"),
    [
        *(({"encoding": name}, "is not known") for name in ("undefined", "idna", "utf-32", "hex")),
        ({"time_zone": "Mars"}, "There is no time zone 'Mars'"),
        ({"delimiter": "ab"}, "The delimiter 'ab' is not known"),
        ({"columns": []}, "No column is taken for a weather quantity"),
    ],
)
def test_a_mapping_no_file_can_be_read_by_is_refused(
    live: Browser, change: dict[str, Any], says: str
) -> None:
    sent = {"file": ("found.csv", FOUND.encode(), "text/csv")}
    made = live.post("/api/v1/intakes", data={"station": "bench"}, files=sent).json()
    path = f"/api/v1/intakes/{made['id']}"
    answer = live.request("PUT", f"{path}/mapping", json={**made["mapping"], **change})
    assert answer.status_code == 422
    assert says in answer.json()["detail"]
    assert live.get(path).json()["mapping"] == made["mapping"]


def test_a_database_that_another_holds_is_said_so(live: Browser, monkeypatch: Any) -> None:
    with live.db.write() as session:
        session.execute(text("SELECT 1"))  # takes the lock
        monkeypatch.setattr(
            live.db, "engine", create_engine(live.db.url, connect_args={"timeout": 0.1})
        )
        event.listen(live.db.engine, "begin", _begin_sqlite)
        answer = live.post(f"{BASE}/events", json={**EVENT, "token": "busy"})
    assert answer.status_code == 503
    assert answer.headers["retry-after"]
    assert "Nothing was stored" in answer.json()["detail"]
    assert live.db.url not in answer.text
