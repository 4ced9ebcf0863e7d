"""Chromium against a real server on a free loopback port; skipped by name where it is missing."""

import os
import shutil
import socket
import threading
import time
from collections.abc import Iterator
from datetime import date
from pathlib import Path
from typing import Any

import pytest
import uvicorn

from app.main import create_app
from app.settings import Settings
from app.storage.database import Database
from tests.web import factory
from tests.workflows import basin

FLAGS = ["--no-sandbox", "--disable-background-networking"]


def chromium() -> str | None:
    """Where Chromium is: RILLBOOK_CHROMIUM, else on the path."""
    names = ("chromium", "chromium-browser", "google-chrome")
    return os.environ.get("RILLBOOK_CHROMIUM") or next(filter(None, map(shutil.which, names)), None)


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    """One Chromium for all; not for the session, for its event loop would bar every other."""
    playwright = pytest.importorskip("playwright.sync_api", reason="NO PLAYWRIGHT: not installed")
    path = chromium()
    if path is None:
        pytest.skip("NO CHROMIUM: the browser tests did not run; install chromium")
    with playwright.sync_playwright() as driver:
        started = driver.chromium.launch(executable_path=path, args=FLAGS)
        yield started
        started.close()


class Served:
    """A server in a thread, on a free port of 127.0.0.1."""

    def __init__(self, db: Database, today: date) -> None:
        with socket.socket() as probe:
            probe.bind(("127.0.0.1", 0))
            self.port = probe.getsockname()[1]
        app = create_app(Settings(database=db.url, today=today), db)
        config = uvicorn.Config(app, host="127.0.0.1", port=self.port, log_level="error", ws="none")
        self.server = uvicorn.Server(config)
        self.thread = threading.Thread(target=self.server.run, daemon=True)

    def __enter__(self) -> str:
        self.thread.start()
        while not self.server.started:
            time.sleep(0.02)
        return f"http://127.0.0.1:{self.port}"

    def __exit__(self, *_: object) -> None:
        self.server.should_exit = True
        self.thread.join(timeout=10)


@pytest.fixture(scope="module")
def sheet(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """The factory's rows served: long and hostile names, bad news, no advice."""
    db = Database(f"sqlite:///{tmp_path_factory.mktemp('sheet') / 'sheet.sqlite'}")
    db.migrate()
    factory.fill(db, fields=40)
    with Served(db, factory.TODAY) as address:
        yield address
    db.close()


@pytest.fixture
def valley(tmp_path: Path) -> Iterator[str]:
    """The workflows' small basin served, to be changed at will."""
    db = Database(f"sqlite:///{tmp_path / 'valley.sqlite'}")
    db.migrate()
    basin.fill(db)
    with Served(db, basin.TODAY) as address:
        yield address
    db.close()
