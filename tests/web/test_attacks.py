"""Bodies too large, JSON that is no JSON, texts no database takes; regression."""

import json
from collections.abc import AsyncIterator

import pytest

from app.storage.database import Database
from app.web import safety
from tests.web.conftest import Browser
from tests.workflows import basin

EVENTS = "/api/v1/fields/long-piece/events"
EVENT = {"day": "2026-06-30", "amount": 1, "unit": "hours", "token": "abcd"}
JSON = {"Content-Type": "application/json"}


def test_a_body_announced_too_large_is_refused_unread(browse: Browser) -> None:
    size = {"Content-Length": str(safety.LARGEST_FILE + 1)}
    for path in ("/intake", "/api/v1/intakes", "/rounds/log"):
        answer = browse.post(path, content=b"", headers=size)
        assert answer.status_code == 413, path
        assert "MB" in answer.text


@pytest.mark.parametrize("path", ["/intake", "/api/v1/intakes", "/rounds/log", EVENTS])
def test_a_body_that_grows_too_large_is_refused(
    browse: Browser, path: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(safety, "LARGEST_FILE", 10_000)
    monkeypatch.setattr(safety, "LARGEST_FORM", 10_000)
    kind, first = "application/x-www-form-urlencoded", b"h.x="
    if path == EVENTS:
        kind, first = "application/json", b""
    elif path != "/rounds/log":
        kind = "multipart/form-data; boundary=b"
        first = b'--b\r\nContent-Disposition: form-data; name="file"; filename="a.csv"\r\n\r\n'

    async def body() -> AsyncIterator[bytes]:
        yield first
        for _ in range(20):
            yield b"1" * 1000

    answer = browse.request("POST", path, content=body(), headers={"Content-Type": kind})
    assert answer.status_code == 413
    assert "content-security-policy" in answer.headers


@pytest.mark.parametrize("amount", ["NaN", "-Infinity", "1e400", "1" * 400, '"\\ud800"'])
def test_figures_that_are_none_are_refused_in_words(browse: Browser, amount: str) -> None:
    body = json.dumps({**EVENT, "amount": "here"}).replace('"here"', amount)
    answer = browse.post(EVENTS, content=body, headers=JSON)
    assert answer.status_code == 422
    assert answer.json()["errors"][0]["field"] == "amount"
    mapping = browse.request("PUT", "/api/v1/intakes/1/mapping", content=body, headers=JSON)
    assert mapping.status_code in (404, 422)


def test_an_origin_that_is_no_address_is_foreign(browse: Browser) -> None:
    answer = browse.post("/rounds/log", data={"day": "x"}, headers={"Origin": "http://["})
    assert answer.status_code == 403


def test_a_token_cannot_pass_for_a_mark_of_the_book(live: Browser) -> None:
    forged = {**EVENT, "token": "book:long-piece/whole/irrigation/2026-06-30/1~9"}
    answer = live.post(EVENTS, json=forged)
    assert answer.status_code == 422
    assert answer.json()["errors"][0]["field"] == "token"


def test_texts_no_database_takes_are_taken_on_both(db: Database) -> None:
    basin.fill(db)
    browser = Browser(db, today=basin.TODAY)
    form = {"h.long-piece": "0.5", "day": "2026-06-30", "token": "a\0b"}
    assert browser.post("/rounds/log", data=form).status_code == 303
    odd = '{"day":"2026-06-30","amount":1,"unit":"hours","token":"abcd","note":"\\ud800\\u0000"}'
    assert browser.post(EVENTS, content=odd, headers=JSON).status_code == 201
    lines = ["time,Air temp\0erature (degC),RH (%)"]
    lines += [f"2026-06-29 {hour:02}:00,20\0.5,5\0{hour % 10}" for hour in range(1, 24)]
    lines += ["2026-06-30 00:00,\0,\0\0", "\0\0\0\0"]
    answer = browser.post(
        "/api/v1/intakes",
        data={"station": "bench"},
        files={"file": ("nul.csv", "\n".join(lines).encode())},
    )
    assert answer.status_code == 201
    assert browser.get(f"/intake/{answer.json()['id']}").status_code == 200


@pytest.mark.parametrize("position", [50, 10**9, 10**21])
def test_a_mapping_that_points_beyond_the_row(live: Browser, position: int) -> None:
    rows = [f"2026-06-29 {hour:02}:00,20,50" for hour in range(1, 24)]
    text = "\n".join(["time,Air temperature (degC),RH (%)", *rows])
    sent = live.post(
        "/api/v1/intakes", data={"station": "bench"}, files={"file": ("m.csv", text.encode())}
    ).json()
    address = f"/api/v1/intakes/{sent['id']}/mapping"
    for change in ("columns", "time"):
        mapping = json.loads(json.dumps(sent["mapping"]))
        columns = mapping["columns"] if change == "columns" else mapping["time"]["columns"]
        columns[0]["position"] = position
        answer = live.request("PUT", address, json=mapping)
        assert answer.status_code in (200, 422), (change, answer.text)
