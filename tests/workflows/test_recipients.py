"""Recipients come with the book, and stay as a page changed them."""

from copy import deepcopy
from typing import Any

import pytest
from sqlalchemy import select

from app.book import Book
from app.storage import recipients as store
from app.storage.database import Database
from app.storage.tables import BookChange
from app.storage.tables_letters import Recipient
from app.workflows.load_book import load_book
from tests.workflows import basin

ANA = {"name": "Ana Reed", "address": "ana@example.org", "language": "es", "hour": 6}


def book(**farm: Any) -> Book:
    """The small basin's book, its farm with more said of it."""
    whole = deepcopy(basin.BOOK)
    whole["farms"][0] |= farm
    return Book.model_validate(whole)


def test_the_book_brings_recipients_and_the_page_keeps_its_changes(db: Database) -> None:
    with db.write() as session:
        load_book(session, book(recipients=[ANA]), "admin")
    with db.write() as session:
        (row,) = session.scalars(select(Recipient))
        assert (row.language, row.units, row.weekday, row.hour) == ("es", "metric", 6, 6)
        store.change_recipient(session, row, {"hour": 19}, "advisor", store.kept(row))
    with db.write() as session:
        load_book(session, book(recipients=[ANA], letters="automatic"), "admin")
    with db.read() as session:
        (found,) = store.recipients(session)
        assert found.hour == 19
        assert found.farm["letters"] == "automatic"
        changes = session.scalars(select(BookChange).where(BookChange.kind == "recipient")).all()
        assert [(change.who, (change.after or {})["hour"]) for change in changes] == [
            ("admin", 6),
            ("advisor", 19),
        ]
    with db.write() as session:
        load_book(session, book(recipients=[{**ANA, "hour": 5}]), "admin")
    with db.read() as session:
        assert store.recipients(session, ("reed",))[0].hour == 5
        assert store.farm_offsets(session) == {found.farm_id: -7}


@pytest.mark.parametrize(
    ("farm", "says"),
    [
        ({"recipients": [{**ANA, "address": "ana"}]}, "address"),
        ({"recipients": [{**ANA, "address": "añá@example.org"}]}, "address"),
        ({"recipients": [{**ANA, "address": "a@example.org\nBcc: b@example.org"}]}, "address"),
        ({"recipients": [ANA, {**ANA, "address": "ANA@example.org"}]}, "stands twice"),
        ({"recipients": [{**ANA, "hour": 24}]}, "hour"),
        ({"time_zone": "Mars/Olympus"}, "IANA"),
    ],
)
def test_a_recipient_that_cannot_be_written_to_is_refused(farm: dict[str, Any], says: str) -> None:
    with pytest.raises(ValueError, match=says):
        book(**farm)
