"""What was seen on a field, logged from its page."""

import secrets
from datetime import date

from fastapi import APIRouter, Request, Response
from fastapi.concurrency import run_in_threadpool

from app.storage.database import Database
from app.web.access import AsViewer, Viewer
from app.web.needs import AsDatabase, AsKey, AsToday, read_day, without_nul
from app.web.pages.fields import back, own_blocks, said, show
from app.web.problems import RefusedError
from app.web.seen_view import figures
from app.workflows.once import EntryError

router = APIRouter()


@router.post("/fields/{key}/seen")
async def log(
    request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey
) -> Response:
    """Log a stage, cover, a cutting, a reading, a keep-off or a note."""
    form = await request.form(max_fields=60)
    typed = {name: without_nul(str(value))[:400] for name, value in form.multi_items()}
    return await run_in_threadpool(_log, request, db, viewer, today, key, typed)


def _log(
    request: Request,
    db: Database,
    viewer: Viewer,
    today: date,
    key: str,
    form: dict[str, str],
) -> Response:
    from app.workflows.log_seen import log_seen

    own_blocks(db, viewer, key)
    try:
        amount, details = figures(form)
        log_seen(
            db,
            key,
            form.get("block") or None,
            form.get("kind", ""),
            read_day(form.get("day", ""), "the day"),
            viewer.who,
            form.get("token") or secrets.token_urlsafe(12),
            today,
            amount=amount,
            details=details,
            note=form.get("note", "").strip() or None,
        )
    except (EntryError, RefusedError) as error:
        return show(request, db, viewer, today, key, error=said(error))
    return back(key, form.get("block", ""))
