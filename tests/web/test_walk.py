"""Every route for every role, with another farm's identifiers: refused as if they were not there.

Nothing of another farm is told in any answer, and nothing of it is changed. The API answers nothing
that its OpenAPI document does not declare.
"""

import json
from collections import Counter
from collections.abc import Iterator
from datetime import UTC, date, datetime
from typing import Any

import pytest
from sqlalchemy import select

from app.storage.database import Database
from app.storage.tables import Base, Event, Intake, SensorEntry, SpanMark
from app.storage.tables_letters import Cover
from app.storage.tables_meters import Meter, MeterField, MeterReading
from app.storage.tables_people import Account, SignIn
from app.storage.tables_supply import Supply, SupplyField
from app.web.access import MAY
from app.workflows import tokens
from tests.web import factory
from tests.web.conftest import Browser
from tests.web.test_people import add, enter

OWN, FOREIGN = "hollin", "tern"
"""Fields 3, 6, ... are of hollin and rest on station north; 1, 4, ... of tern, on bench."""
LEAKS = (
    "Tern Creek",
    "Long Piece 1<",
    "Long Piece 10",
    "Bench",
    "field-10",
    "foreign.csv",
    "Di Foe",
)
VALUES = {
    "/fields/": {"key": "field-1", "event_id": "1", "number": "1", "day": "2026-07-13"},
    "/stations/": {"key": "bench", "number": "1", "day": "2026-07-13"},
    "/intake": {"intake_id": "1", "station": "bench", "day": "2026-07-13"},
    "/farm/": {"key": FOREIGN, "number": "3"},
    "/letters/": {"number": "3", "deed": "release"},
    "/recipients/": {"number": "2"},
    "/covers/": {"number": "1"},
    "/people/": {"number": "1"},
    "/supply/": {"key": "tern-ditch"},
    "/meters/": {"key": "tern-gate", "number": "1"},
    "/me/": {"number": "1"},
}
OPEN = ("/static/", "/enter", "/sign-", "/forgot", "/link/", "/answer/", "/stop/", "/calendar/")
BY_SECRET = {"path": "nothing.css", "role": "advisor", "secret": "x" * 43, "token": "x" * 43}
ROLES = ("nobody", "grower", "advisor", "station", "reader", "admin")
BODY = {
    "day": "2026-07-13", "amount": 5, "unit": "hours", "token": "abcdef", "quantity": "rain",
    "first": "2026-07-10", "last": "2026-07-11", "verdict": "bad", "why": "x", "kind": "note",
    "note": "x", "station": "bench", "h.field-1": "5", "farm": FOREIGN, "name": "x",
    "address": "x@example.org", "interval_s": 600, "units": {"air_temperature": "degC"},
    "rows": [{"at": "2026-07-13T10:10:00-07:00", "values": {"air_temperature": 24.0}}],
}  # fmt: skip


@pytest.fixture(scope="module")
def walked(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Database]:
    """The factory's rows; what stands under number 1 (or 2) everywhere is another farm's."""
    db = Database(f"sqlite:///{tmp_path_factory.mktemp('walk') / 'walk.sqlite'}")
    db.migrate()
    factory.fill(db)
    now = datetime(2026, 7, 13, tzinfo=UTC)
    add(db, "di@example.org", "Di Foe", "advisor", FOREIGN)
    add(db, "ada@example.org", "Ada Reed", "admin")
    add(db, "cy@example.org", "Cy Moor", "grower", OWN)
    add(db, "bo@example.org", "Bo Lane", "advisor", OWN)
    with db.write() as session:
        event = session.get(Event, 1)
        assert event is not None
        session.add(
            Intake(
                id=1,
                station_id=2,
                file_name="foreign.csv",
                sha256="0",
                mapping={},
                who="Di Foe",
                at=now,
                state="previewed",
                rows=0,
                summary={},
            )
        )
        for table, more in (
            (
                SpanMark,
                {"quantity": "rain", "first": now, "last": now, "verdict": "bad", "why": "x"},
            ),
            (SensorEntry, {"day": date(2026, 7, 1), "kind": "note", "note": "x"}),
        ):
            given: dict[str, Any] = {**more, "who": "Di Foe", "entered": now, "origin": "x"}
            session.add(table(station_id=2, **given))
        session.add(SignIn(id=1, secret="x", account_id=1, browser="x", since=now, ends=now))
        day = date(2026, 7, 1)
        session.add(
            Cover(id=1, farm_id=2, first=day, last=day, name="Di Foe", who="Di Foe", entered=now)
        )
        session.add(
            Meter(id=1, key="tern-gate", name="Tern Creek", farm_id=2, unit="m3", multiplier=1)
        )
        session.add(
            Supply(
                id=1,
                key="tern-ditch",
                name="Tern Creek",
                details={"key": "tern-ditch", "name": "x", "flow_m3_h": 9.0},
            )
        )
        session.flush()
        session.add(SupplyField(supply_id=1, field_id=1))
        session.add(MeterField(meter_id=1, field_id=1))
        session.add(
            MeterReading(id=1, meter_id=1, kind="reading", day=day, register=1, restarts=False,
                         note="", who="Di Foe", entered=now, origin="x")
        )  # fmt: skip
        tokens.make_token(session, "push", "foreign", "Di Foe", station="bench")
    enter(db, "ada@example.org").get("/letters")  # drafts: letter 3 is of tern
    yield db
    db.close()


def browsers(db: Database) -> dict[str, Browser]:
    """One browser or program for each role."""
    with db.write() as session:
        push = tokens.make_token(session, "push", "box", "test", station="north")
        reader = session.scalar(select(Account.id).where(Account.name == "Bo Lane"))
        read = tokens.make_token(session, "read", "sheet", "test", reader)
    found = {
        "nobody": Browser(db, signed_in=True),
        "grower": enter(db, "cy@example.org"),
        "advisor": enter(db, "bo@example.org"),
        "station": Browser(db),
        "reader": Browser(db),
        "admin": enter(db, "ada@example.org"),
    }
    found["station"].headers = {"Authorization": f"Bearer {push}"}
    found["reader"].headers = {"Authorization": f"Bearer {read}"}
    return found


def address(pattern: str) -> str:
    """A route's address with another farm's identifiers; fails for one nobody thought of."""
    plain = pattern.removeprefix("/api/v1")
    known = BY_SECRET if plain.startswith(OPEN) else {}
    for start, values in VALUES.items():
        if plain.startswith(start):
            known = values
    path = pattern
    for name in [part.split("}")[0] for part in pattern.split("{")[1:]]:
        value = known[name.split(":")[0]]  # a new kind of identifier: say here what is another's
        path = path.replace(f"{{{name}}}", value)
    return path


def foreign(db: Database) -> str:
    """Every row of the book, the facts and the people, as text; without sign-ins and tries."""
    left_out = {"sign_in", "sign_in_try", "one_time_link", "ledger_day", "station_day", "advice"}
    with db.read() as session:
        rows = {
            table.name: sorted(map(repr, session.execute(select(table)).all()))
            for table in Base.metadata.sorted_tables
            if table.name not in left_out
        }
    return json.dumps(rows, indent=1)


def request(browser: Browser, method: str, path: str) -> Any:
    """One request with a body that names another farm's things."""
    more: dict[str, Any] = {}
    if method in ("POST", "PUT"):
        more = {"json": BODY} if path.startswith("/api/") else {"data": _flat()}
    if method == "DELETE":
        path += "?token=abcdef"
    return browser.request(method, path, **more)


def _flat() -> dict[str, str]:
    return {name: str(value) for name, value in BODY.items() if isinstance(value, str | int)}


def test_every_route_for_every_role(walked: Database) -> None:
    counts: Counter[tuple[str, int]] = Counter()
    before = foreign(walked)
    document = Browser(walked).get("/api/v1/openapi.json").json()
    declared = {
        path: {method: operation["responses"] for method, operation in methods.items()}
        for path, methods in document["paths"].items()
    }
    for role, browser in browsers(walked).items():
        if role == "admin":
            continue  # knows of every farm
        if role == "nobody":
            before = foreign(walked)
        for (method, pattern), allowed in MAY.items():
            if pattern in ("/sign-out", "/rounds/up-to-date"):
                continue
            named = "{" in pattern and not pattern.startswith(OPEN)
            answer = request(browser, method, address(pattern))
            what = (role, method, pattern, answer.status_code)
            counts[role, answer.status_code] += 1
            reading = role == "reader" and method == "GET" and pattern.startswith("/api/")
            acts = (
                {"reader": "advisor"}.get(role, role) if role != "reader" or reading else "nobody"
            )
            if role == "station" and not pattern.startswith("/api/"):
                acts = "nobody"
            if acts == "nobody" and "nobody" not in allowed:
                assert answer.status_code == (401 if pattern.startswith("/api/") else 303), what
            elif acts not in allowed:
                assert answer.status_code == 403, what
            elif named:
                assert answer.status_code in (404, 422), what
            assert answer.status_code < 500, what
            if pattern in declared:
                assert str(answer.status_code) in declared[pattern][method.lower()], what
                if answer.status_code >= 400:
                    assert answer.headers["content-type"] == "application/problem+json", what
            for word in LEAKS:
                assert word not in answer.text, (*what, word)
    own_doing = {"token", "book_change"}
    was, now = json.loads(before), json.loads(foreign(walked))
    for table in was:
        if table not in own_doing:
            assert was[table] == now[table], table
    print(len(MAY), "routes;", dict(counts))


def test_an_admin_reaches_every_route(walked: Database) -> None:
    admin = browsers(walked)["admin"]
    for (method, pattern), allowed in MAY.items():
        if method == "GET" and "admin" in allowed:
            assert admin.get(address(pattern)).status_code not in (401, 403, 500), pattern


def test_the_walk_knows_every_identifier() -> None:
    for _, pattern in MAY:
        assert "{" not in address(pattern)
