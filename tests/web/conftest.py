"""The real app over a real database, in this process; no network."""

import asyncio
import sqlite3
from collections.abc import Callable, Iterator
from datetime import date
from pathlib import Path
from typing import Any

import httpx
import pytest

from app.main import create_app
from app.settings import Mail, Settings
from app.storage.database import Database
from tests.web.factory import TODAY, fill
from tests.workflows import basin

CHEAP_KIB = 64
"""Passwords in tests are to be quick, not safe."""


class Browser:
    """Sends requests to the app as a page of its own would, and keeps the cookie."""

    def __init__(
        self,
        db: Database,
        demo: bool = False,
        today: date = TODAY,
        signed_in: bool = False,
        mail: Mail = Mail(folder=Path("/nowhere")),  # noqa: B008 (frozen)
    ) -> None:
        self.db = db
        settings = Settings(
            database=db.url, today=today, demo=demo, password_memory_kib=CHEAP_KIB, mail=mail
        )
        self.app = create_app(settings, db)
        self.headers = {"Sec-Fetch-Site": "same-origin"} if signed_in else {}
        self.cookies = httpx.Cookies()

    def request(self, method: str, path: str, **more: Any) -> httpx.Response:
        """One request."""

        async def send() -> httpx.Response:
            transport = httpx.ASGITransport(self.app, raise_app_exceptions=False)
            async with httpx.AsyncClient(
                transport=transport,
                base_url="http://localhost",
                cookies=self.cookies,
                headers=self.headers,
            ) as client:
                answer = await client.request(method, path, **more)
                self.cookies.update(client.cookies)
                return answer

        return asyncio.run(send())

    def get(self, path: str, **more: Any) -> httpx.Response:
        """GET."""
        return self.request("GET", path, **more)

    def post(self, path: str, **more: Any) -> httpx.Response:
        """POST."""
        return self.request("POST", path, **more)


@pytest.fixture
def empty_db(tmp_path: Path) -> Iterator[Database]:
    """A migrated database without rows."""
    db = Database(f"sqlite:///{tmp_path / 'pages.sqlite'}")
    db.migrate()
    yield db
    db.close()


@pytest.fixture(scope="module")
def filled_db(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Database]:
    """A database with the factory's rows, for tests that only read."""
    db = Database(f"sqlite:///{tmp_path_factory.mktemp('filled') / 'pages.sqlite'}")
    db.migrate()
    fill(db)
    yield db
    db.close()


@pytest.fixture(scope="module")
def basin_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A database file of the workflows' small basin, filled by the real workflows."""
    path = tmp_path_factory.mktemp("basin") / "basin.sqlite"
    db = Database(f"sqlite:///{path}")
    db.migrate()
    basin.fill(db)
    db.close()
    return path


@pytest.fixture
def live(basin_file: Path, tmp_path: Path) -> Iterator[Browser]:
    """The admin's browser on a copy of the basin, to be changed at will."""
    copy = tmp_path / "copy.sqlite"
    with sqlite3.connect(basin_file) as source, sqlite3.connect(copy) as target:
        source.backup(target)
    source.close()
    target.close()
    db = Database(f"sqlite:///{copy}")
    yield Browser(db, today=basin.TODAY)
    db.close()


@pytest.fixture
def browse(filled_db: Database) -> Browser:
    """The admin's browser on the factory's rows."""
    return Browser(filled_db)


@pytest.fixture
def open_browser() -> Callable[..., Browser]:
    """A browser on any database."""
    return Browser
