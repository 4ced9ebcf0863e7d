"""Since yesterday: the change of a field's depletion with what made it, and what moved its day."""

import re
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

from sqlalchemy import update

from app.storage.database import Database
from app.storage.tables import Event
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.log_event import log_irrigation
from tests.web.conftest import Browser
from tests.workflows import basin

TODAY = basin.TODAY
ONE = timedelta(days=1)


def begun(path: Path) -> Database:
    """A basin as it stood yesterday morning, its entries made long before."""
    db = Database(f"sqlite:///{path / 'basin.sqlite'}")
    db.migrate()
    basin.fill(db, TODAY - ONE)
    bring_up_to_date(db, TODAY - ONE)
    with db.write() as session:
        session.execute(update(Event).values(entered=datetime(2026, 6, 12, tzinfo=UTC)))
    return db


def rounds(db: Database, today: date = TODAY) -> str:
    text = Browser(db, today=today).get("/").text
    row = text[text.index('id="long-piece"') :]
    return row[: row.index('name="h.')]


def test_rounds_say_what_changed_and_why(tmp_path: Path) -> None:
    db = begun(tmp_path)
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv(), TODAY)
    bring_up_to_date(db, TODAY)
    plain = rounds(db)
    assert re.search(r"\+[\d.]+ mm, ET\. ", plain)
    assert "than thought" not in plain
    # an irrigation of some days ago, told only now
    log_irrigation(db, "long-piece", None, TODAY - 5 * ONE, 30, "gross_mm", "a", "t1", TODAY)
    told = rounds(db)
    assert "mm wetter than thought: entries since." in told
    # water of yesterday is one of its terms
    log_irrigation(db, "long-piece", None, TODAY - ONE, 10, "gross_mm", "a", "t2", TODAY)
    assert "watered 8" in rounds(db)


def test_new_data_of_a_station_are_named_as_the_cause(tmp_path: Path) -> None:
    db = begun(tmp_path)
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv(warmer=4), TODAY)
    bring_up_to_date(db, TODAY)
    assert "mm drier than thought: new data or a changed book." in rounds(db)
