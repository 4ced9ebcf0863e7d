"""Connections and migrations on both engines: nothing half done, nothing lost."""

import threading
from pathlib import Path

import pytest
from alembic import command
from alembic.autogenerate import compare_metadata
from alembic.runtime.migration import MigrationContext
from sqlalchemy import inspect, text
from sqlalchemy.exc import IntegrityError

from app.storage import tables_letters, tables_meters, tables_people  # noqa: F401 (its tables belong to the metadata)
from app.storage.database import Database, DatabaseError, alembic_config
from app.storage.tables import Base, Block, Farm, Station


def test_a_fresh_database_has_every_table_as_the_models_say(db: Database) -> None:
    with db.engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": True})
        assert compare_metadata(context, Base.metadata) == []


def test_migrating_again_changes_nothing_and_keeps_the_rows(db: Database) -> None:
    with db.write() as session:
        session.add(Farm(key="a", name="A", details={}))
    db.migrate()
    with db.read() as session:
        assert [farm.key for farm in session.query(Farm)] == ["a"]


def test_every_migration_goes_down_and_up_again(db: Database) -> None:
    config = alembic_config(db.engine)
    command.downgrade(config, "base")
    assert set(inspect(db.engine).get_table_names()) <= {"alembic_version"}
    command.upgrade(config, "head")
    assert set(Base.metadata.tables) <= set(inspect(db.engine).get_table_names())


def test_a_failed_write_leaves_nothing(db: Database) -> None:
    def fail() -> None:
        with db.write() as session:
            session.add(Farm(key="a", name="A", details={}))
            session.flush()
            raise RuntimeError("half-way")

    with pytest.raises(RuntimeError, match="half-way"):
        fail()
    with db.read() as session:
        assert session.query(Farm).count() == 0


def test_foreign_keys_hold(db: Database) -> None:
    def orphan() -> None:
        with db.write() as session:
            session.add(Block(field_id=7, key="x", name="X", area_ha=1, soil_id=7, system_id=7))

    with pytest.raises(IntegrityError):
        orphan()


def test_concurrent_writers_lose_no_update(db: Database) -> None:
    with db.write() as session:
        session.add(Station(key="s", name="0", details={}))

    def work() -> None:
        for _ in range(20):
            with db.write() as session:
                station = session.query(Station).with_for_update().one()
                station.name = str(int(station.name) + 1)

    threads = [threading.Thread(target=work) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    with db.read() as session:
        assert session.query(Station).one().name == "80"


def test_a_database_that_cannot_be_opened_says_so(tmp_path: Path) -> None:
    db = Database(f"sqlite:///{tmp_path / 'no' / 'such' / 'folder.sqlite'}")
    with pytest.raises(DatabaseError, match="cannot be opened"):
        db.migrate()


def test_sqlite_is_in_wal_with_foreign_keys(sqlite_url: str) -> None:
    db = Database(sqlite_url)
    with db.engine.connect() as connection:
        assert connection.execute(text("PRAGMA journal_mode")).scalar() == "wal"
        assert connection.execute(text("PRAGMA foreign_keys")).scalar() == 1
    db.close()


def test_a_database_of_a_newer_program_is_left_alone(db: Database) -> None:
    with db.write() as session:
        session.execute(text("UPDATE alembic_version SET version_num = '9999'"))
    with pytest.raises(DatabaseError, match="newer version of the program"):
        db.migrate()


def test_a_database_that_cannot_be_written_says_so(tmp_path: Path) -> None:
    db = Database(f"sqlite:///{tmp_path / 'full.sqlite'}")
    db.migrate()

    def fill_it() -> None:
        with db.write() as session:
            pages = session.execute(text("PRAGMA page_count")).scalar()
            session.execute(text(f"PRAGMA max_page_count = {pages}"))
            session.add(Farm(key="a", name="A", details={"long": "x" * 1_000_000}))

    with pytest.raises(DatabaseError, match="cannot be written: database or disk is full"):
        fill_it()
    with db.read() as session:
        assert session.query(Farm).all() == []
    db.close()
