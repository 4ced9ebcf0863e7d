"""Water logged on the Field page: put down, corrected, deleted."""

import secrets
from typing import Annotated

from fastapi import APIRouter, Form, Request, Response

from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsKey, AsNumber, AsToday, Clean, read_day, read_number
from app.web.pages.fields import back, own_blocks, own_event, said, show
from app.web.problems import RefusedError
from app.workflows.once import EntryError

router = APIRouter()
Text = Annotated[Clean, Form(max_length=400)]


@router.post("/fields/{key}/events")
def log(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    day: Text = "",
    amount: Text = "",
    unit: Text = "hours",
    block: Text = "",
    purpose: Text = "crop",
    confirmation: Text = "reported",
    share: Text = "",
    note: Text = "",
    token: Text = "",
) -> Response:
    """Log an irrigation, or rain of the field's own gauge."""
    from app.workflows.log_event import Water, log_water

    own_blocks(db, viewer, key)
    token = token or secrets.token_urlsafe(12)
    try:
        rain = unit == "rain_mm"
        water = Water(
            day=read_day(day, "the day"),
            amount=read_number(amount, "the amount"),
            unit=unit,
            purpose="crop" if rain else purpose,
            confirmation="measured" if rain else confirmation,
            note=note.strip() or None,
            area_share=1.0 if rain else part_of(share),
        )
        log_water(db, key, None if rain else block or None, water, viewer.who, token, today)
    except (EntryError, RefusedError) as error:
        typed = {"day": day, "amount": amount, "unit": unit, "note": note}
        return show(request, db, viewer, today, key, error=said(error), typed=typed)
    return back(key, block)


@router.post("/fields/{key}/events/{event_id}")
def correct(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    event_id: AsNumber,
    day: Text = "",
    amount: Text = "",
    unit: Text = "hours",
    purpose: Text = "",
    confirmation: Text = "",
    share: Text = "",
    note: Text = "",
    token: Text = "",
) -> Response:
    """Correct an entry: the old one stays in the history."""
    from app.workflows.log_event import correct_event

    own_event(db, viewer, key, event_id)
    token = token or secrets.token_urlsafe(12)
    try:
        on, much = read_day(day, "the day"), read_number(amount, "the amount")
        correct_event(
            db, event_id, on, much, unit, viewer.who, token, today, note.strip(),
            purpose=purpose or None, confirmation=confirmation or None,
            area_share=part_of(share) if share.strip() else None,
        )  # fmt: skip
    except (EntryError, RefusedError) as error:
        return show(request, db, viewer, today, key, error=said(error), refused="Not corrected.")
    return back(key)


@router.post("/fields/{key}/events/{event_id}/delete")
def delete(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    event_id: AsNumber,
    token: Text = "",
) -> Response:
    """Delete an entry: it no longer counts, and stays in the history."""
    from app.workflows.log_event import void_event

    own_event(db, viewer, key, event_id)
    try:
        void_event(db, event_id, viewer.who, token or secrets.token_urlsafe(12), today)
    except EntryError as error:
        return show(request, db, viewer, today, key, error=said(error), refused="Not deleted.")
    return back(key)


def part_of(share: str) -> float:
    """The part of a block that was watered, written in per cent; all of it where left empty."""
    return (
        read_number(share.strip().rstrip("%"), "the part watered") / 100 if share.strip() else 1.0
    )
