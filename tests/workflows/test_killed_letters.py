"""A worker killed with SIGKILL at any point: the letter goes once or not at all, never twice.

After each death two workers go on, at once and again when every claim has run out; whatever they
do, the server must have the letter at most once, and where it has none, or might have one, the
letter's state must say so.
"""

import os
import random
import shutil
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from app.settings import Mail
from app.storage.database import Database
from tests.letters.server import Post, serving
from tests.workflows import letter_basin as world
from tests.workflows.letter_basin import EVENING, HOUR, copy_rows, run, states
from tests.workflows.post_and_die import POINTS

ROOT = Path(__file__).resolve().parents[2]
# Where the kill falls: letters the server has in the end, and the state that says so.
TABLE = {
    "before the claim": (1, "sent"),
    "claimed, not committed": (1, "sent"),
    "claimed": (1, "sent"),
    "connected": (1, "sent"),
    "body sent, no dot": (1, "sent"),
    "sending, not committed": (1, "sent"),
    "sending, no dot": (0, "unsure"),
    "dot sent, no answer read": (1, "unsure"),
    "answer read, not kept": (1, "unsure"),
    "sent, not committed": (1, "unsure"),
    "sent": (1, "sent"),
}


@pytest.fixture(scope="module")
def released(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A SQLite file of the basin with one letter released and due."""
    path = tmp_path_factory.mktemp("released") / "basin.sqlite"
    db = Database(f"sqlite:///{path}")
    db.migrate()
    world.fill(db, recipients=[world.ANA])
    world.release_all(db, world.settings(db, Mail(sender="letters@example.org")))
    db.close()
    return path


@pytest.fixture(params=["sqlite", "postgres"])
def one_letter(
    request: pytest.FixtureRequest, released: Path, tmp_path: Path
) -> Iterator[Database]:
    """One letter, released and due."""
    if request.param == "sqlite":
        url = f"sqlite:///{shutil.copy(released, tmp_path / 'copy.sqlite')}"
    else:
        url = str(request.getfixturevalue("postgres_url"))
        copy_rows(f"sqlite:///{released}", url)
    db = Database(url)
    yield db
    db.close()


def worker(db: Database, mail: Mail, point: str) -> subprocess.Popen[bytes]:
    """A worker in a process of its own."""
    command = [sys.executable, "-m", "tests.workflows.post_and_die"]
    command += [db.url, mail.host, str(mail.port), str(EVENING), point]
    return subprocess.Popen(
        command, cwd=ROOT, env={**os.environ, "PYTHONPATH": str(ROOT)}, stderr=subprocess.PIPE
    )


def go_on(db: Database, mail: Mail) -> None:
    """Two workers at once, now, after 20 minutes, and after a day."""
    for later in (0.0, 20 / 60, 24.0):
        now = EVENING + later * HOUR
        pair = [
            threading.Thread(target=run, args=(db, world.settings(db, mail), now)) for _ in range(2)
        ]
        for thread in pair:
            thread.start()
        for thread in pair:
            thread.join()


def test_the_table_names_every_point() -> None:
    assert set(TABLE) == set(POINTS)


@pytest.mark.parametrize("point", POINTS)
def test_killed_at(point: str, one_letter: Database) -> None:
    post = Post()
    with serving(post) as mail:
        process = worker(one_letter, mail, point)
        _, errors = process.communicate(timeout=60)
        assert process.returncode == -signal.SIGKILL, errors.decode()
        go_on(one_letter, mail)
    letters, state = TABLE[point]
    assert len(post.ids) == letters, point
    assert states(one_letter)["Ana"] == state, point


def test_killed_at_random_moments_by_the_clock(released: Path, tmp_path: Path) -> None:
    chance = random.Random(6)
    for number in range(3):
        db = Database(f"sqlite:///{shutil.copy(released, tmp_path / f'{number}.sqlite')}")
        post = Post(wait_s=0.15)
        with serving(post) as mail:
            process = worker(db, mail, "sent")
            time.sleep(chance.uniform(0.3, 1.2))
            process.kill()
            process.communicate()
            go_on(db, mail)
        state = states(db)["Ana"]
        assert len(post.ids) <= 1
        assert state in ("sent", "unsure")
        assert len(post.ids) == 1 or state == "unsure"
        db.close()
