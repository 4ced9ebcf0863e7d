"""Which day it is: RILLBOOK_TODAY when set, else the date at the stations."""

from datetime import UTC, date, datetime, time, timedelta

from sqlalchemy import select

from app.settings import Settings
from app.storage.database import Database
from app.storage.tables import Station


def day_it_is(db: Database, settings: Settings) -> date:
    """The day of the morning's rounds: the latest date at any station, by its fixed offset."""
    if settings.today is not None:
        return settings.today
    return (datetime.now(UTC) + _latest_offset(db)).date()


def moment_it_is(db: Database, settings: Settings) -> datetime:
    """The instant it is: now, moved by whole days to the day RILLBOOK_TODAY names."""
    now = datetime.now(UTC)
    if settings.today is None:
        return now
    there = (now + _latest_offset(db)).date()
    return now + (settings.today - there)


def end_of_day(db: Database, day: date) -> datetime:
    """The instant a day ends at the stations, UTC."""
    midnight = datetime.combine(day + timedelta(days=1), time(), UTC)
    return midnight - _latest_offset(db)


def _latest_offset(db: Database) -> timedelta:
    with db.read() as session:
        offsets = [details["utc_offset_h"] for details in session.scalars(select(Station.details))]
    return timedelta(hours=max(offsets, default=0.0))
