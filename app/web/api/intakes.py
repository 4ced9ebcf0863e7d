"""Intakes: upload, preview, correct the columns, apply, undo, put away."""

from dataclasses import asdict
from typing import Annotated, Any

from fastapi import APIRouter, Depends, File, Form, HTTPException, Query, Response, UploadFile

from app.intake import IntakeError, Mapping
from app.storage import pages_station as store_station
from app.storage.database import Database
from app.web.access import AsViewer
from app.web.api.schemas import AppliedOut, IntakeOut, PreviewOut
from app.web.needs import AsDatabase, AsNumber, AsToday, Clean, without_nul
from app.web.own_files import NO_STATION, AsOwnStations, stations_within_reach
from app.web.problems import RefusedError
from app.workflows import take_in
from app.workflows.take_in import TakeInError

router = APIRouter(
    prefix="/api/v1", tags=["intakes"], dependencies=[Depends(stations_within_reach)]
)


@router.get("/intakes")
def intakes(
    db: AsDatabase,
    own: AsOwnStations,
    station: Clean | None = None,
    before: Annotated[int | None, Query(ge=1, le=2**31 - 1)] = None,
) -> list[IntakeOut]:
    """The last 100 uploaded files, newest first; the next with `before` the last number got."""
    with db.read() as session:
        rows = store_station.intakes(session, station=station, before=before, own=own)
    return [
        IntakeOut(
            id=row.id,
            station=row.station_key,
            file_name=row.file_name,
            state=row.state,
            who=row.who,
            at=row.at,
            rows=row.rows,
            first_day=row.first_day,
            last_day=row.last_day,
        )
        for row in rows
    ]


@router.post("/intakes", status_code=201)
def upload(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    own: AsOwnStations,
    station: Annotated[Clean, Form(max_length=80)],
    file: Annotated[UploadFile, File()],
) -> PreviewOut:
    """Keep a file and preview it; nothing is taken in yet."""
    if own is not None and station not in own:
        raise RefusedError(NO_STATION, "station", station, "Name a station that feeds your fields.")
    try:
        name = without_nul(file.filename or "unnamed")
        number = take_in.receive(db, station, name, file.file, viewer.who, today=today)
    except (TakeInError, IntakeError) as error:
        raise RefusedError(str(error), "station", station, "Name a station of the book.") from None
    return _preview(db, number)


@router.get("/intakes/{intake_id}")
def intake(db: AsDatabase, intake_id: AsNumber) -> PreviewOut:
    """What a file would bring, or brought."""
    return _preview(db, intake_id)


def _preview(db: Database, number: int) -> PreviewOut:
    try:
        preview = take_in.preview_of(db, number)
    except TakeInError as error:
        raise HTTPException(404, str(error)) from None
    data: dict[str, Any] = {
        name: getattr(preview, name)
        for name in PreviewOut.model_fields
        if name not in ("id", "station", "mapping", "problems")
    }
    return PreviewOut(
        id=preview.intake_id,
        station=preview.station_key,
        mapping=preview.mapping.model_dump(mode="json") if preview.mapping else None,
        problems=[asdict(problem) for problem in preview.problems],
        **data,
    )


@router.put("/intakes/{intake_id}/mapping")
def remap(
    db: AsDatabase, viewer: AsViewer, today: AsToday, intake_id: AsNumber, mapping: Mapping
) -> PreviewOut:
    """Preview again with a corrected mapping."""
    _preview(db, intake_id)
    try:
        take_in.remap(db, intake_id, mapping, viewer.who, today)
    except (TakeInError, IntakeError) as error:
        raise RefusedError(str(error)) from None
    return _preview(db, intake_id)


@router.post("/intakes/{intake_id}/apply")
def apply(
    db: AsDatabase, viewer: AsViewer, today: AsToday, intake_id: AsNumber, ahead: bool = False
) -> AppliedOut:
    """Take a previewed file in, whole or not at all; with rows dated after now only if `ahead`."""
    _preview(db, intake_id)
    try:
        applied = take_in.apply(db, intake_id, viewer.who, today, ahead=ahead)
    except (TakeInError, IntakeError) as error:
        raise RefusedError(str(error)) from None
    return AppliedOut(**asdict(applied))


@router.post("/intakes/{intake_id}/undo")
def undo(db: AsDatabase, viewer: AsViewer, today: AsToday, intake_id: AsNumber) -> AppliedOut:
    """Take an applied file out again: its days are exactly what they were without it."""
    _preview(db, intake_id)
    try:
        applied = take_in.undo(db, intake_id, viewer.who, today)
    except (TakeInError, IntakeError) as error:
        raise RefusedError(str(error)) from None
    return AppliedOut(**asdict(applied))


@router.delete("/intakes/{intake_id}", status_code=204)
def discard(db: AsDatabase, viewer: AsViewer, intake_id: AsNumber) -> Response:
    """Put a previewed file away."""
    _preview(db, intake_id)
    try:
        take_in.discard(db, intake_id, viewer.who)
    except (TakeInError, IntakeError) as error:
        raise RefusedError(str(error)) from None
    return Response(status_code=204)
