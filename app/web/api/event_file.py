"""Events and soil readings as CSV."""

from datetime import date
from typing import Annotated, Literal

from fastapi import APIRouter, File, Form, UploadFile
from fastapi.responses import JSONResponse, Response
from pydantic import BaseModel

from app.errors import InputError
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsToday
from app.web.pages.event_file import MOST_BYTES
from app.web.problems import RefusedError, problem
from app.workflows.log_file import log_file

router = APIRouter(prefix="/api/v1", tags=["events"])


class FileLoggedOut(BaseModel):
    """What a file brought: events new and already here, and the days and fields of the new."""

    new: int
    already: int
    first: date | None
    last: date | None
    fields: int


@router.post("/events/file", status_code=201, response_model=FileLoggedOut)
def take(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    file: Annotated[UploadFile, File()],
    order: Annotated[Literal["dmy", "mdy"] | None, Form()] = None,
    beside: Annotated[bool, Form()] = False,
    look: Annotated[bool, Form(description="only say what it would bring")] = False,
) -> Response | FileLoggedOut:
    """Log every event of a file, or none: each problem names line, column, value and remedy."""
    try:
        told = log_file(
            db, file.file.read(MOST_BYTES), viewer.who, today, viewer.farms,
            order=order, beside=beside, keep=not look,
        )  # fmt: skip
    except InputError as error:
        raise RefusedError(str(error), "file", None, "Put the file right.") from None
    if told.problems:
        refused: JSONResponse = problem(
            422,
            f"{len(told.problems)} lines have to be put right first; nothing was stored.",
            [
                {
                    "line": one.line,
                    "field": one.column,
                    "value": one.value,
                    "detail": one.why,
                    "remedy": one.remedy,
                }
                for one in told.problems
            ],
        )
        return refused
    return FileLoggedOut(new=told.new, already=told.already, first=told.first, last=told.last,
                         fields=told.fields)  # fmt: skip
