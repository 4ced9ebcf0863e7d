"""Which day it is: RILLBOOK_TODAY when set, else the date at the stations."""

from datetime import UTC, date, datetime, timedelta

from sqlalchemy import select

from app.settings import Settings
from app.storage.database import Database
from app.storage.tables import Station


def day_it_is(db: Database, settings: Settings) -> date:
    """The day of the morning's rounds: the latest date at any station, by its fixed offset."""
    if settings.today is not None:
        return settings.today
    with db.read() as session:
        offsets = [details["utc_offset_h"] for details in session.scalars(select(Station.details))]
    return (datetime.now(UTC) + timedelta(hours=max(offsets, default=0.0))).date()


def moment_it_is(db: Database, settings: Settings) -> datetime:
    """The instant it is: now, moved by whole days to the day RILLBOOK_TODAY names."""
    now = datetime.now(UTC)
    if settings.today is None:
        return now
    with db.read() as session:
        offsets = [details["utc_offset_h"] for details in session.scalars(select(Station.details))]
    there = (now + timedelta(hours=max(offsets, default=0.0))).date()
    return now + (settings.today - there)
