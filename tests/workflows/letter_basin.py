"""The small basin with people who get letters, and helpers to post them."""

from copy import deepcopy
from datetime import UTC, date, datetime, timedelta
from typing import Any

from sqlalchemy import create_engine, text

from app.book import Book
from app.settings import Mail, Settings
from app.storage import letters as store
from app.storage.database import Database
from app.storage.letters import LetterRow
from app.storage.tables import Base
from app.workflows.draft_letters import draft_letters
from app.workflows.letter_weeks import monday
from app.workflows.load_book import load_book
from app.workflows.post_letters import Posted, post
from app.workflows.release_letters import release
from tests.workflows import basin

TODAY = basin.TODAY  # a Wednesday
EVENING = datetime(2026, 7, 2, 2, 30, tzinfo=UTC)
"""19:30 on the farm, at seven hours behind: after Wednesday's letters are due."""
ANA = {
    "name": "Ana Reed",
    "address": "ana@example.org",
    "language": "es",
    "weekday": "wednesday",
    "hour": 18,
}
BEN = {
    "name": "Ben Reed",
    "address": "ben@example.org",
    "units": "us",
    "weekday": "wednesday",
    "hour": 18,
}


def book(**farm: Any) -> Book:
    """The small basin's book, with recipients."""
    whole = deepcopy(basin.BOOK)
    whole["farms"][0] |= {"advisor": "D. Arden", "recipients": [ANA, BEN], **farm}
    return Book.model_validate(whole)


def fill(db: Database, **farm: Any) -> None:
    """The small basin, computed, with recipients."""
    basin.fill(db)
    with db.write() as session:
        load_book(session, book(**farm), "admin")


def settings(db: Database, mail: Mail) -> Settings:
    """Settings of a database and a mail server."""
    return Settings(database=db.url, mail=mail)


def drafts(db: Database, with_: Settings, now: datetime = EVENING) -> list[int]:
    """The numbers of the letters there are, drafted first."""
    with db.write() as session:
        draft_letters(session, with_.mail, now)
        return [row.letter.id for row in store.letters(session)]


def release_all(db: Database, with_: Settings, now: datetime = EVENING) -> list[int]:
    """Draft and release every letter."""
    numbers = drafts(db, with_, now)
    with db.write() as session:
        return release(session, numbers, "advisor", with_, now, TODAY)


def run(db: Database, with_: Settings, now: datetime = EVENING, today: date = TODAY) -> Posted:
    """One round of a worker."""
    return post(db, with_, lambda: now, lambda: today)


def rows(db: Database) -> list[LetterRow]:
    """The letters of the week."""
    with db.read() as session:
        found = store.letters(session, [monday(EVENING.date())])
        session.expunge_all()
    return found


def states(db: Database) -> dict[str, str]:
    """State by recipient's first name and revision."""
    return {
        f"{row.recipient.name.split()[0]}{row.letter.revision or ''}": row.letter.state
        for row in rows(db)
    }


def copy_rows(source: str, target: str) -> None:
    """Every row of one database into another, empty one."""
    db = Database(target)
    db.migrate()
    reading = create_engine(source)
    with reading.connect() as rows, db.engine.begin() as connection:
        for table in Base.metadata.sorted_tables:
            found = [row._asdict() for row in rows.execute(table.select())]
            if found:
                connection.execute(table.insert(), found)
            if "id" in table.c and db.engine.dialect.name == "postgresql":
                last = max((row["id"] for row in found), default=1)
                sequence = f"pg_get_serial_sequence('\"{table.name}\"', 'id')"
                connection.execute(text(f"SELECT setval({sequence}, {last})"))
    reading.dispose()
    db.close()


HOUR = timedelta(hours=1)
