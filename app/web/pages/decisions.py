"""The advisor's decision on an advice: accept, change, withhold, take back."""

import secrets
from typing import Annotated

from fastapi import APIRouter, Form, Request, Response
from fastapi.responses import RedirectResponse

from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsKey, AsToday, Clean, read_day, read_number
from app.web.pages.fields import choose, own_blocks, said, show
from app.web.problems import RefusedError
from app.workflows.once import EntryError

router = APIRouter()
Text = Annotated[Clean, Form(max_length=400)]


@router.post("/fields/{key}/decision")
def decide(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    block: Text = "",
    verdict: Text = "",
    day: Text = "",
    hours: Text = "",
    note: Text = "",
    token: Text = "",
) -> Response:
    """Keep the decision; letters, calendar and the grower's page follow it."""
    from app.workflows.decide_on_advice import decide_on_advice

    blocks = own_blocks(db, viewer, key)
    chosen = choose(blocks, block or blocks[0].key)
    own = verdict in ("change", "withhold")
    try:
        decide_on_advice(
            db, key, chosen.key, verdict, viewer.who, token or secrets.token_urlsafe(12), today,
            day=read_day(day, "the day") if own and day else None,
            hours=read_number(hours, "the hours") if verdict == "change" and hours else None,
            note=note,
        )  # fmt: skip
    except (EntryError, RefusedError) as error:
        return show(
            request, db, viewer, today, key, chosen.key, error=said(error), refused="Not decided."
        )
    return RedirectResponse(f"/fields/{key}?block={chosen.key}", status_code=303)
