"""Rounds at 500 fields: in parts small enough for a poor signal; time and size are printed."""

import gzip
import re
import time
from collections.abc import Callable
from pathlib import Path

import pytest
from sqlalchemy import update

from app.storage.database import Database
from app.storage.tables import Advice, Field
from app.web.rounds_view import ROWS_ON_A_PAGE, Sieve, first_row, parts
from tests.test_wording import FIGURES
from tests.web.conftest import Browser
from tests.web.factory import fill

LIMIT_BYTES = 200_000
"""A page over 200 kB must never happen."""


@pytest.fixture(scope="module")
def many(tmp_path_factory: pytest.TempPathFactory) -> Database:
    db = Database(f"sqlite:///{tmp_path_factory.mktemp('many') / 'many.sqlite'}")
    db.migrate()
    fill(db, fields=500, days=15, hostile=False)
    return db


def test_five_hundred_fields(many: Database, open_browser: Callable[..., Browser]) -> None:
    browser = open_browser(many)
    answer = browser.get("/")
    took = []
    for _ in range(5):
        start = time.perf_counter()
        answer = browser.get("/")
        took.append(time.perf_counter() - start)
    whole = answer.content
    rows = len(re.findall(rb"<tr id=", whole))
    print(
        f"\nrounds of 500 fields: {rows} rows, {len(whole)} bytes, "
        f"{len(gzip.compress(whole, 5))} gzipped, {1000 * sorted(took)[2]:.0f} ms"
    )
    assert rows == min(ROWS_ON_A_PAGE, 500)
    assert len(whole) <= LIMIT_BYTES
    assert "gzip" in answer.headers["content-encoding"]


def test_a_part_full_of_long_names_and_bad_news_is_still_small(
    many: Database, open_browser: Callable[..., Browser]
) -> None:
    long = {"name": "A field name of eighty letters, " * 2 + "and so on to the end"}
    reason = {"reason": "falling_behind", "unsure": "stale:lane:4 range:9", "standing": "late"}
    with many.write() as session:
        session.execute(update(Field).where(Field.id <= 250).values(**long))
        session.execute(update(Advice).where(Advice.block_id < 2510).values(**reason))
        session.execute(update(Advice).values(figures=FIGURES))
    whole = open_browser(many).get("/").content
    print(f"\nthe worst part: {len(whole)} bytes, {len(gzip.compress(whole, 5))} gzipped")
    assert whole.count(b"<tr id=") == ROWS_ON_A_PAGE
    assert len(whole) <= LIMIT_BYTES


def test_a_longer_list_comes_in_parts_and_none_is_lost(
    many: Database, open_browser: Callable[..., Browser], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("app.web.rounds_view.ROWS_ON_A_PAGE", 200)
    browser = open_browser(many)
    seen: list[str] = []
    for part in ("", "2", "3"):
        seen += re.findall(r'<tr id="([\w-]+)"', browser.get(f"/?part={part}").text)
    assert len(seen) == len(set(seen)) == 500
    assert "401 to 500" in browser.get("/?part=3").text


def test_parts() -> None:
    assert parts(Sieve(), ROWS_ON_A_PAGE) == []
    assert first_row("2", ROWS_ON_A_PAGE + 1) == ROWS_ON_A_PAGE
    for odd in ("0", "-1", "3", "x", "99999999999"):
        assert first_row(odd, ROWS_ON_A_PAGE + 1) == 0


def test_the_style_and_the_script_are_small() -> None:
    from app.resources import resource

    for name in ("rillbook.css", "rillbook.js"):
        assert (Path(resource("static")) / name).stat().st_size < 30_000
