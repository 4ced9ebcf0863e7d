"""Who may do what, and what stands before every request."""

from collections.abc import Callable

import pytest

from app.storage.database import Database
from app.web import api, assets, pages
from app.web.access import MAY
from tests.web.conftest import Browser

GROWER = "hollin"
OWN, FOREIGN = "field-3", "field-1"


@pytest.fixture
def demo(filled_db: Database) -> Browser:
    """A browser in demo mode that has not entered."""
    return Browser(filled_db, demo=True)


def test_every_route_stands_in_the_table_and_the_other_way_round() -> None:
    routes = {("GET", "/api/v1/openapi.json")}
    for router in (assets.router, *pages.PARTS, *api.PARTS):
        for route in router.routes:
            methods = getattr(route, "methods", set())
            routes |= {(method, str(getattr(route, "path", ""))) for method in methods}
    assert routes - set(MAY) == set()
    assert set(MAY) - routes == set()


def test_the_openapi_document_names_no_route_beyond_the_table(browse: Browser) -> None:
    document = browse.get("/api/v1/openapi.json").json()
    for path, methods in document["paths"].items():
        for method, operation in methods.items():
            assert (method.upper(), path) in MAY
            assert {"403", "404", "422"} <= set(operation["responses"])
    assert browse.get("/docs").status_code == 404
    assert browse.get("/redoc").status_code == 404


def test_outside_demo_mode_there_are_no_ways_in(browse: Browser) -> None:
    assert browse.get("/enter").headers["location"] == "/"
    answer = browse.get("/enter/grower")
    assert answer.headers["location"] == "/"
    assert "set-cookie" not in answer.headers


def test_in_demo_mode_the_door_comes_first(demo: Browser) -> None:
    assert demo.get("/").headers["location"] == "/enter"
    assert demo.get("/api/v1/rounds").status_code == 401
    door = demo.get("/enter")
    assert door.status_code == 200
    assert "/enter/grower?farm=hollin" in door.text
    assert demo.get("/enter/king").status_code == 404
    assert demo.get("/enter/grower?farm=nobody").status_code == 404
    assert demo.get("/enter/admin").headers["location"] == "/intake"
    assert demo.get("/intake").status_code == 200
    demo.get("/enter/advisor")
    assert demo.get("/").status_code == 200


def test_a_grower_sees_the_own_farm_only(demo: Browser) -> None:
    demo.get(f"/enter/grower?farm={GROWER}")
    rounds = demo.get("/").text
    assert OWN in rounds
    assert f'"{FOREIGN}"' not in rounds
    assert "Tern Creek" not in rounds
    assert "Bench" not in rounds
    assert "/intake" not in rounds
    assert demo.get(f"/fields/{OWN}").status_code == 200
    for path in (
        f"/fields/{FOREIGN}",
        f"/fields/{FOREIGN}/days/2026-07-13",
        f"/fields/{FOREIGN}/ledger.csv",
        f"/api/v1/fields/{FOREIGN}",
        f"/api/v1/fields/{FOREIGN}/ledger",
        f"/api/v1/fields/{FOREIGN}/advice",
        f"/api/v1/fields/{FOREIGN}/events",
        "/stations/bench",
        "/api/v1/stations/bench",
        "/stations/bench/days.csv",
        "/stations/bench/days/2026-07-13",
    ):
        assert demo.get(path).status_code == 404, path
    assert {f["farm"] for f in demo.get("/api/v1/rounds").json()["fields"]} == {GROWER}
    assert {f["farm"] for f in demo.get("/api/v1/fields").json()} == {GROWER}
    assert [s["key"] for s in demo.get("/api/v1/stations").json()] == ["north"]
    assert "Bench" not in demo.get("/stations").text


def test_a_grower_changes_nothing_of_others(demo: Browser) -> None:
    demo.get(f"/enter/grower?farm={GROWER}")
    for path in ("/intake", "/advice.csv", "/api/v1/intakes", "/intake/1"):
        assert demo.get(path).status_code == 403, path
    for path in ("/intake", "/intake/1/undo", "/rounds/up-to-date", "/api/v1/intakes/1/apply"):
        assert demo.post(path).status_code == 403, path
    event = {"day": "2026-07-13", "amount": 5, "token": "abcd"}
    foreign = f"/api/v1/fields/{FOREIGN}/events"
    assert demo.post(foreign, json=event).status_code == 404
    # event 1 stands on a field of another farm, whichever field the address names
    assert demo.request("DELETE", f"{foreign}/1?token=abcd").status_code == 404
    own = f"/api/v1/fields/{OWN}/events/1"
    assert demo.request("DELETE", f"{own}?token=abcd").status_code == 404
    change = {"day": "2026-07-13", "amount": 5, "unit": "hours", "token": "abcd"}
    assert demo.request("PUT", own, json=change).status_code == 404
    assert demo.post(f"/fields/{FOREIGN}/events", data={"amount": "5"}).status_code == 404
    assert demo.post(f"/fields/{OWN}/events/1/delete", data={"token": "abcd"}).status_code == 404
    rows = demo.post("/rounds/log", data={f"h.{FOREIGN}": "5", "day": "2026-07-13"})
    assert rows.status_code == 422
    assert "Not logged for 1 field" in rows.text


@pytest.mark.parametrize(
    "cookie", ["king", "grower", "grower.", "grower.a'b", "advisor.hollin", "."]
)
def test_a_made_up_cookie_lets_nobody_in(demo: Browser, cookie: str) -> None:
    demo.cookies.set("rillbook_way_in", cookie)
    assert demo.get("/").headers["location"] == "/enter"


@pytest.mark.parametrize(
    ("headers", "refused"),
    [
        ({"Sec-Fetch-Site": "cross-site"}, True),
        ({"Sec-Fetch-Site": "same-site"}, True),
        ({"Origin": "http://evil.example.org"}, True),
        ({"Origin": "null"}, True),
        ({"Sec-Fetch-Site": "same-origin"}, False),
        ({"Origin": "http://localhost"}, False),
        ({}, False),
    ],
)
def test_another_sites_post_is_refused(
    browse: Browser, headers: dict[str, str], refused: bool
) -> None:
    answer = browse.post("/rounds/log", data={"day": "2026-07-13"}, headers=headers)
    assert answer.status_code == (403 if refused else 303)
    api_answer = browse.post("/api/v1/fields/nobody/events", json={}, headers=headers)
    assert api_answer.status_code == (403 if refused else 422)


@pytest.mark.parametrize("host", ["evil.example.org", "localhost.example.org:8000", "", "::1"])
def test_a_foreign_host_name_is_refused(browse: Browser, host: str) -> None:
    assert browse.get("/", headers={"Host": host}).status_code == 421


@pytest.mark.parametrize("host", ["localhost:8000", "127.0.0.1:8000", "[::1]:8000", "[::1]"])
def test_the_machines_own_names_are_answered(browse: Browser, host: str) -> None:
    assert browse.get("/methods", headers={"Host": host}).status_code == 200


def test_safe_headers_stand_on_every_answer(browse: Browser) -> None:
    for path in ("/", "/nowhere", "/api/v1/rounds", "/static/rillbook.css"):
        headers = browse.get(path).headers
        policy = headers["content-security-policy"]
        assert "default-src 'none'" in policy
        assert "unsafe" not in policy
        assert headers["x-content-type-options"] == "nosniff"
    assert "Local water rights" in browse.get("/api/v1/rounds").headers["rillbook-caution"]
    assert browse.get("/").headers["cache-control"] == "no-store"


def test_static_files_are_kept_by_their_hash(browse: Browser) -> None:
    address = browse.app.state.assets.address("rillbook.css")
    assert "immutable" in browse.get(address).headers["cache-control"]
    assert browse.get("/static/rillbook.css?old").headers["cache-control"] == "no-cache"
    for path in ("/static/nothing.css", "/static/../app/main.py", "/static/%2e%2e/pyproject.toml"):
        assert browse.get(path).status_code == 404


def test_the_grower_of_a_farm_without_fields_sees_an_empty_book(
    empty_db: Database, open_browser: Callable[..., Browser]
) -> None:
    browser = open_browser(empty_db, demo=True)
    assert browser.get("/enter/grower").status_code == 404
