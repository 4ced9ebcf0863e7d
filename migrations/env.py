"""Runs the migrations on the engine handed in, else on RILLBOOK_DATABASE."""

from alembic import context
from sqlalchemy import Connection, Engine

from app.settings import read_settings
from app.storage import (  # noqa: F401 (its tables belong to the metadata)
    tables_decisions,
    tables_letters,
    tables_meters,
    tables_people,
    tables_supply,
)
from app.storage.database import make_engine
from app.storage.tables import Base


def run(engine: Engine) -> None:
    """Migrate in one transaction; foreign keys rest, so that SQLite may rebuild a table."""
    with engine.connect() as connection:
        sqlite = connection.dialect.name == "sqlite"
        if sqlite:
            _foreign_keys(connection, "OFF")
        connection = connection.execution_options(write=True)
        context.configure(
            connection=connection,
            target_metadata=Base.metadata,
            render_as_batch=True,
            transactional_ddl=True,
            compare_type=True,
        )
        with context.begin_transaction():
            context.run_migrations()
        connection.commit()
        if sqlite:
            _foreign_keys(connection, "ON")


def _foreign_keys(connection: Connection, state: str) -> None:
    driver = connection.connection.driver_connection
    assert driver is not None
    driver.execute(f"PRAGMA foreign_keys={state}")


run(context.config.attributes.get("engine") or make_engine(read_settings().database))
