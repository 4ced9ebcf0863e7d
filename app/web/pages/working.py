"""A day's working: every term of one ledger day, its equation, its inputs, where they came from."""

from dataclasses import dataclass
from datetime import date, timedelta
from typing import Any

from fastapi import APIRouter, HTTPException, Request, Response

from app import wording
from app.storage import pages as store
from app.storage import pages_field as store_field
from app.storage.database import Database
from app.storage.pages_field import BlockRow
from app.web.access import AsViewer, Viewer
from app.web.needs import AsDatabase, AsDay, AsKey, AsToday
from app.web.pages.fields import choose, own_blocks
from app.web.render import page
from app.web.working_view import Section, working
from app.workflows.day_working import Opened, open_day
from app.workflows.managed import managed

router = APIRouter()
ONE = timedelta(days=1)


@dataclass(frozen=True)
class Found:
    """A ledger day with the days beside it, what it rests on, and how many blocks the field has."""

    block: BlockRow
    blocks: int
    row: dict[str, Any]
    before: dict[str, Any] | None
    after: dict[str, Any] | None
    opened: Opened
    sections: list[Section]
    stations: dict[int, str]
    """Stations behind the day, number to key."""


def find(db: Database, viewer: Viewer, today: date, key: str, day: date, block: str) -> Found:
    """The day of a field's block as the viewer may see it; 404 otherwise."""
    blocks = own_blocks(db, viewer, key)
    with db.read() as session:
        if not block:
            morning = store.last_morning(session, today)
            block = managed(store.rounds_rows(session, morning, viewer.farms, key)).block_key
        chosen = choose(blocks, block)
        rows = store_field.ledger_days(session, chosen.id, day - ONE, day + ONE)
        by_day = {row["day"]: row for row in rows}
        opened = open_day(session, chosen.id, day) if day in by_day else None
        if opened is None:
            raise HTTPException(404, f"The ledger of this field has no {wording.full_day(day)}.")
        sources = {
            variable: row
            for (number, variable), row in store.current(
                store.sources(session, day, viewer.farms)
            ).items()
            if number == chosen.field_id
        }
        stations = {row.station_id: row.station_key for row in sources.values()}
        station_days = {
            row["station_id"]: row
            for row in store_field.station_days(session, sorted(stations), day, day)
        }
        heights = {row.id: row.details.get("elevation_m", 0.0) for row in store.stations(session)}
        events = [e for e in store.events_since(session, day, [chosen.id]) if e.day == day]
    before = by_day.get(day - ONE)
    sections = working(by_day[day], before, chosen, opened, sources, station_days, heights, events)
    after = by_day.get(day + ONE)
    return Found(chosen, len(blocks), by_day[day], before, after, opened, sections, stations)


@router.get("/fields/{key}/days/{day}")
def days_working(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    day: AsDay,
    block: str = "",
) -> Response:
    """Every term of one ledger day: its equation, its inputs, where they came from."""
    found = find(db, viewer, today, key, day, block)
    return page(
        request,
        "pages/working.html",
        block=found.block,
        many=found.blocks > 1,
        day=day,
        before=found.before,
        after=found.after,
        row=found.row,
        sections=found.sections,
    )
