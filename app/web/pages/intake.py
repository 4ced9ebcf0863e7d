"""Intake: upload, mapping, preview, apply, undo, history."""

from datetime import date
from typing import Annotated

from fastapi import (
    APIRouter,
    Depends,
    Form,
    HTTPException,
    Path,
    Query,
    Request,
    Response,
    UploadFile,
)
from fastapi.responses import RedirectResponse
from starlette.concurrency import run_in_threadpool

from app import wording
from app.intake import IntakeError
from app.storage import pages as store
from app.storage import pages_station as store_station
from app.storage.database import Database
from app.web import intake_view as view
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsNumber, AsToday, Clean, without_nul
from app.web.own_files import NO_STATION, AsOwnStations, stations_within_reach
from app.web.render import page
from app.workflows import take_in
from app.workflows.take_in import TakeInError

router = APIRouter(dependencies=[Depends(stations_within_reach)])


LINES = 50
PUSHES = 200


@router.get("/intake")
def intakes(
    request: Request,
    db: AsDatabase,
    own: AsOwnStations,
    station: Annotated[Clean, Query(max_length=80)] = "",
    before: Annotated[int | None, Query(ge=1, le=2**31 - 1)] = None,
) -> Response:
    """Upload a file; what was uploaded before."""
    return _start(request, db, own, station, before=before)


def _start(
    request: Request,
    db: Database,
    own: frozenset[str] | None,
    station: str = "",
    error: str = "",
    before: int | None = None,
) -> Response:
    with db.read() as session:
        stations = [row for row in store.stations(session) if own is None or row.key in own]
        history = store_station.received(session, LINES + 1, before=before, own=own)
    return page(
        request,
        "pages/intake.html",
        422 if error else 200,
        stations=stations,
        chosen=station,
        history=history[:LINES],
        older=history[LINES - 1].id if len(history) > LINES else None,
        before=before,
        states=wording.INTAKE_STATES,
        error=error,
    )


@router.get("/intake/pushes/{station}/{day}")
def pushes(
    request: Request,
    db: AsDatabase,
    station: Annotated[Clean, Path(max_length=80)],
    day: date,
    before: Annotated[int | None, Query(ge=1, le=2**31 - 1)] = None,
) -> Response:
    """The pushes of one station day, one by one."""
    with db.read() as session:
        rows = store_station.intakes(session, PUSHES + 1, station, before, day)
    if not rows and before is None:
        raise HTTPException(404, f"Nothing was pushed to {station} for {day}.")
    return page(
        request,
        "pages/intake_pushes.html",
        station=station,
        day=day,
        rows=rows[:PUSHES],
        older=rows[PUSHES - 1].id if len(rows) > PUSHES else None,
        states=wording.INTAKE_STATES,
    )


@router.post("/intake")
def upload(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    own: AsOwnStations,
    file: UploadFile | str = "",
    station: Annotated[Clean, Form(max_length=80)] = "",
) -> Response:
    """Keep a file and preview it; nothing is taken in yet."""
    if isinstance(file, str) or not file.filename:
        return _start(request, db, own, station, "Choose a file first.")
    if own is not None and station not in own:
        return _start(request, db, own, station, NO_STATION)
    try:
        name = without_nul(file.filename)
        number = take_in.receive(db, station, name, file.file, viewer.who, today=today)
    except (TakeInError, IntakeError) as error:
        return _start(request, db, own, station, str(error))
    return RedirectResponse(f"/intake/{number}", status_code=303)


@router.get("/intake/{intake_id}")
def intake(request: Request, db: AsDatabase, intake_id: AsNumber) -> Response:
    """One file: its columns, questions, problems, and what it would change."""
    return _show(request, db, intake_id)


def _show(request: Request, db: Database, intake_id: int, error: str = "") -> Response:
    try:
        preview = take_in.preview_of(db, intake_id)
    except TakeInError as missing:
        raise HTTPException(404, str(missing)) from None
    lead, rest = view.headline(preview)
    mapping = preview.mapping
    return page(
        request,
        "pages/intake_file.html",
        422 if error else 200,
        p=preview,
        lead=lead,
        rest=rest,
        doubtful=view.doubtful(preview),
        effects=view.effects(preview),
        open=preview.state == "previewed",
        ready=view.ready(preview),
        next_step=view.next_step(preview),
        columns=view.columns(preview),
        quantities=view.quantity_choices(),
        orders=view.ORDERS,
        row_times=view.ROW_TIMES,
        delimiters=view.DELIMITERS,
        steps=view.step_choices(mapping.interval_s if mapping else None),
        terms={name: term for name, term in view.quantity_choices()},
        problems=view.problems(preview),
        severities=wording.SEVERITIES,
        states=wording.INTAKE_STATES,
        error=error,
    )


@router.post("/intake/{intake_id}/mapping")
async def remap(
    request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday, intake_id: AsNumber
) -> Response:
    """Preview again with corrected columns."""
    form = await request.form(max_fields=5000)
    values = {name: str(value) for name, value in form.multi_items()}

    def work() -> Response:
        try:
            preview = take_in.preview_of(db, intake_id)
            if preview.mapping is None:
                return _show(request, db, intake_id, "This file has no columns to be corrected.")
            mapping = view.corrected(preview.mapping, values)
            take_in.remap(db, intake_id, mapping, viewer.who, today)
        except (TakeInError, IntakeError) as error:
            return _show(request, db, intake_id, str(error))
        return RedirectResponse(f"/intake/{intake_id}#preview", status_code=303)

    return await run_in_threadpool(work)


@router.post("/intake/{intake_id}/apply")
def apply(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    intake_id: AsNumber,
    ahead: Annotated[bool, Form()] = False,
) -> Response:
    """Take the file in, whole."""
    try:
        take_in.apply(db, intake_id, viewer.who, today, ahead=ahead)
    except (TakeInError, IntakeError) as error:
        return _show(request, db, intake_id, str(error))
    return RedirectResponse(f"/intake/{intake_id}", status_code=303)


@router.post("/intake/{intake_id}/undo")
def undo(
    request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday, intake_id: AsNumber
) -> Response:
    """Take the file out again."""
    try:
        take_in.undo(db, intake_id, viewer.who, today)
    except (TakeInError, IntakeError) as error:
        return _show(request, db, intake_id, str(error))
    return RedirectResponse(f"/intake/{intake_id}", status_code=303)


@router.post("/intake/{intake_id}/discard")
def discard(request: Request, db: AsDatabase, viewer: AsViewer, intake_id: AsNumber) -> Response:
    """Put a previewed file away."""
    try:
        take_in.discard(db, intake_id, viewer.who)
    except (TakeInError, IntakeError) as error:
        return _show(request, db, intake_id, str(error))
    return RedirectResponse("/intake", status_code=303)
