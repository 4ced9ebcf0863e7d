"""What the days ahead would be with water or rain that is not there; nothing is stored."""

from datetime import date
from typing import Annotated

from fastapi import APIRouter, Query, Request, Response

from app import wording
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsKey, AsToday, Clean, read_day, read_number
from app.web.pages.fields import choose, own_blocks, said
from app.web.problems import RefusedError
from app.web.render import page
from app.workflows.once import EntryError

router = APIRouter()
Short = Annotated[Clean, Query(max_length=40)]


@router.get("/fields/{key}/what-if")
def what_if(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    block: Short = "",
    day: Short = "",
    gross: Short = "",
    rain: Short = "",
) -> Response:
    """The days ahead with an application or rain tried on one of them."""
    from app.workflows.what_if import what_if as tried

    blocks = own_blocks(db, viewer, key)
    chosen = choose(blocks, block or blocks[0].key)
    found, error = None, ""
    try:
        on = read_day(day, "the day") if day else today
        water, fallen = (read_number(text or "0", name) for text, name in _boxes(gross, rain))
        with db.read() as session:
            found = tried(session, chosen.id, today, on, water, fallen)
    except (EntryError, RefusedError) as refusal:
        error = said(refusal)
    return page(
        request,
        "pages/what_if.html",
        422 if error else 200,
        block=chosen,
        blocks=blocks if len(blocks) > 1 else [],
        found=found,
        error=error,
        day=day or str(today),
        gross=gross,
        rain=rain,
        today=today,
        passes=_passes(found.passes, today) if found else "",
        tried_passes=_passes(found.tried_passes, today) if found else "",
    )


def _boxes(gross: str, rain: str) -> tuple[tuple[str, str], tuple[str, str]]:
    return (gross, "the water"), (rain, "the rain")


def _passes(day: date | None, today: date) -> str:
    if day is None:
        return "within its limit on all of these days"
    return f"past its limit {wording.near_day(day, today)}"
