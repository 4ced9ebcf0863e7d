"""Events from a file through its page, the API, and as somebody who may not know every farm."""

import html

import pytest

from tests.web import factory
from tests.web.conftest import Browser
from tests.web.test_people import add, enter

ROW = "field,day,what,amount,unit\nlong-piece,2026-06-29,irrigation,{},hours\n"


def send(live: Browser, text: str, **form: str) -> tuple[int, str]:
    answer = live.post("/events/file", data=form, files={"file": ("july.csv", text.encode())})
    return answer.status_code, html.unescape(answer.text)


def test_look_log_and_again(live: Browser) -> None:
    status, text = send(live, ROW.format(5), deed="look")
    assert (status, "would bring 1 event" in text) == (200, True)
    status, text = send(live, ROW.format(5), deed="log")
    assert "july.csv: 1 event logged" in text
    logged = live.get("/api/v1/fields/long-piece/events").json()
    assert (logged[0]["amount"], logged[0]["unit"]) == (5, "hours")
    assert "changed nothing" in send(live, ROW.format(5))[1]
    status, text = send(live, ROW.format(6))
    assert status == 422
    assert "from elsewhere" in text
    assert "box below" in text


def test_problems_are_told_by_line(live: Browser) -> None:
    status, text = send(live, ROW.format("<b>much") + "nowhere,2026-06-29,irrigation,5,hours\n")
    assert status == 422
    assert "This is no number" in text
    assert live.post("/events/file", data={"deed": "log"}).status_code == 422
    assert "workbook" in send(live, "PK\x03\x04")[1]


def test_the_api_logs_and_names_every_problem(live: Browser) -> None:
    address = "/api/v1/events/file"
    files = {"file": ("a.csv", ROW.format(5).encode())}
    assert live.post(address, data={"look": "true"}, files=files).json()["new"] == 1
    assert live.post(address, files=files).json() == {
        "new": 1, "already": 0, "first": "2026-06-29", "last": "2026-06-29", "fields": 1,
    }  # fmt: skip
    assert live.post(address, files=files).json()["already"] == 1
    bad = live.post(address, files={"file": ("a.csv", ROW.format("x").encode())})
    assert bad.status_code == 422
    assert bad.headers["content-type"] == "application/problem+json"
    assert bad.json()["errors"][0]["line"] == 2


def test_a_file_that_names_anothers_field(empty_db: object) -> None:
    db = empty_db
    factory.fill(db)  # type: ignore[arg-type]
    add(db, "bo@example.org", "Bo Lane", "advisor", "hollin")  # type: ignore[arg-type]
    browser = enter(db, "bo@example.org")  # type: ignore[arg-type]
    row = "field,day,what,note\nfield-1,2026-07-10,note,x\nLong Piece 1,2026-07-10,note,x\n"
    status, text = send(browser, row)
    assert status == 422
    assert text.count("There is no such field") == 2
    own = "field,day,what,note\nfield-3,2026-07-10,note,x\n"
    assert send(browser, own)[0] == 200


@pytest.mark.parametrize("path", ["/", "/fields/long-piece"])
def test_the_page_is_reached_from_where_water_is_logged(live: Browser, path: str) -> None:
    assert 'href="/events/file"' in live.get(path).text
    assert live.get("/events/file").status_code == 200
