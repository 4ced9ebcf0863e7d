"""Events: water logged, corrected, deleted."""

from datetime import date, timedelta
from typing import Annotated, Any

from fastapi import APIRouter, Query, Response

from app.storage import pages as store
from app.web.access import AsViewer
from app.web.api.schemas import EventChange, EventIn, EventOut, Logged
from app.web.needs import AsDatabase, AsKey, AsNumber, AsToday, Clean
from app.web.pages.fields import own_blocks, own_event
from app.web.problems import RefusedError
from app.workflows.once import EntryError

router = APIRouter(prefix="/api/v1", tags=["events"])


@router.get("/fields/{key}/events")
def events(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    since: Annotated[date | None, Query(description="a year back when not given")] = None,
) -> list[EventOut]:
    """The entries that stand, newest day first."""
    blocks = own_blocks(db, viewer, key)
    with db.read() as session:
        rows = store.events_since(
            session, since or today - timedelta(days=366), [block.id for block in blocks]
        )
    return [EventOut(block=row.block_key, **_plain(row)) for row in rows]


def _plain(row: store.EventRow) -> dict[str, Any]:
    hidden = ("block_id", "block_key", "block_name")
    return {name: value for name, value in row._asdict().items() if name not in hidden}


@router.post("/fields/{key}/events", status_code=201)
def log(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, event: EventIn) -> Logged:
    """Log an irrigation, or rain of the field's own gauge (`rain_mm`)."""
    from app.workflows.log_event import Water, log_water

    own_blocks(db, viewer, key)
    rain = event.unit == "rain_mm"
    try:
        water = Water(
            day=event.day,
            amount=event.amount,
            unit=event.unit,
            purpose="crop" if rain else event.purpose,
            confirmation="measured" if rain else event.confirmation,
            note=event.note,
            area_share=event.area_share,
            wetted_fraction=event.wetted_fraction,
        )
        block = None if rain else event.block
        number = log_water(db, key, block, water, viewer.who, event.token, today)
    except EntryError as error:
        raise refused(error) from None
    return Logged(id=number)


@router.put("/fields/{key}/events/{event_id}")
def correct(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    event_id: AsNumber,
    event: EventChange,
) -> Logged:
    """Put a corrected entry in place of one; the old one stays in the history."""
    from app.workflows.log_event import correct_event

    own_event(db, viewer, key, event_id)
    try:
        number = correct_event(
            db, event_id, event.day, event.amount, event.unit, viewer.who, event.token, today,
            event.note, purpose=event.purpose, confirmation=event.confirmation,
            area_share=event.area_share,
        )  # fmt: skip
    except EntryError as error:
        raise refused(error) from None
    return Logged(id=number)


@router.delete("/fields/{key}/events/{event_id}", status_code=204)
def delete(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    event_id: AsNumber,
    token: Annotated[Clean, Query(min_length=4, max_length=80)],
) -> Response:
    """Delete an entry: it no longer counts, and stays in the history."""
    from app.workflows.log_event import void_event

    own_event(db, viewer, key, event_id)
    try:
        void_event(db, event_id, viewer.who, token, today)
    except EntryError as error:
        raise refused(error) from None
    return Response(status_code=204)


def refused(error: Exception) -> RefusedError:
    """A workflow's refusal as problem details: `day is 2030-01-01; log water when it has run`."""
    text = str(error)
    field, _, rest = text.partition(" is ")
    value, _, remedy = rest.partition("; ")
    if remedy and " " not in field:
        return RefusedError(text, field, value, remedy)
    return RefusedError(text)
