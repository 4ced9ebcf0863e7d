"""Connections: one engine, a transaction to read and a transaction to write.

SQLite and PostgreSQL run the same code, and on both writers take turns: SQLite begins a write with
BEGIN IMMEDIATE, PostgreSQL takes one lock for the transaction. Readers never wait. So no update is
lost, no two recomputes meet, and nothing can deadlock.
"""

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from alembic import command
from alembic.config import Config
from alembic.runtime.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Connection, Engine, create_engine, event, text
from sqlalchemy.exc import DBAPIError, OperationalError
from sqlalchemy.orm import Session

from app.errors import InputError
from app.resources import resource

WRITERS = 0x52494C4C
"""The number of the lock that writers on PostgreSQL share."""


class DatabaseError(InputError):
    """The database cannot be used; the message says what to do."""


def make_engine(url: str) -> Engine:
    """An engine for `sqlite:///...` or `postgresql://...`, with the settings the program needs."""
    if url.startswith("postgresql"):
        return create_engine(url, pool_pre_ping=True)
    engine = create_engine(url, connect_args={"timeout": 30})
    event.listen(engine, "connect", _prepare_sqlite)
    event.listen(engine, "begin", _begin_sqlite)
    return engine


def _prepare_sqlite(connection: sqlite3.Connection, _record: Any) -> None:
    connection.isolation_level = None
    for pragma in ("journal_mode=WAL", "synchronous=NORMAL", "foreign_keys=ON"):
        connection.execute(f"PRAGMA {pragma}")


def _begin_sqlite(connection: Connection) -> None:
    write = connection.get_execution_options().get("write", False)
    connection.exec_driver_sql("BEGIN IMMEDIATE" if write else "BEGIN")


class Database:
    """The one door to storage: `with db.read() as session`, `with db.write() as session`."""

    def __init__(self, url: str) -> None:
        self.url = url
        self.engine = make_engine(url)

    @contextmanager
    def read(self) -> Iterator[Session]:
        """A session whose changes, if any, are lost."""
        with Session(self.engine) as session:
            yield session

    @contextmanager
    def write(self) -> Iterator[Session]:
        """A session committed as a whole at the end, or rolled back as a whole on an error."""
        engine = self.engine.execution_options(write=True)
        try:
            with Session(engine) as session, session.begin():
                if engine.dialect.name == "postgresql":
                    session.execute(text("SELECT pg_advisory_xact_lock(:turn)"), {"turn": WRITERS})
                yield session
        except OperationalError as error:  # locked, disk full, read-only, connection lost
            raise DatabaseError(
                f"the database {self.engine.url!r} cannot be written: {error.orig}; "
                "nothing was changed"
            ) from error

    def migrate(self) -> None:
        """Bring the tables to the newest version; an up-to-date database is left as it is."""
        try:
            with self.engine.connect() as connection:
                at = MigrationContext.configure(connection).get_current_heads()
        except DBAPIError as error:
            raise DatabaseError(
                f"the database {self.engine.url!r} cannot be opened: {error.orig}"
            ) from None
        config = alembic_config(self.engine)
        known = {script.revision for script in ScriptDirectory.from_config(config).walk_revisions()}
        if unknown := sorted(set(at) - known):
            raise DatabaseError(
                f"the database {self.engine.url!r} was last used by a newer version of the program "
                f"(tables of {unknown[0]}); install that version, nothing was changed"
            )
        if set(at) != set(ScriptDirectory.from_config(config).get_heads()):
            command.upgrade(config, "head")

    def close(self) -> None:
        """Give the connections back."""
        self.engine.dispose()


def alembic_config(engine: Engine) -> Config:
    """Alembic's settings for an engine, without an ini file."""
    config = Config()
    config.set_main_option("script_location", str(Path(resource("migrations"))))
    config.attributes["engine"] = engine
    return config
