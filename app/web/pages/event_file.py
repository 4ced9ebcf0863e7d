"""Events and soil readings from a file: looked at, or logged whole or not at all."""

from typing import Annotated

from fastapi import APIRouter, Form, Request, Response, UploadFile

from app.errors import InputError
from app.intake.event_file import NAMES
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsToday, Clean, without_nul
from app.web.render import page
from app.workflows.log_file import FileLogged, log_file

router = APIRouter()
MOST_BYTES = 2_000_001
ORDERS = {"": "as the file shows", "dmy": "day first", "mdy": "month first"}


@router.get("/events/file")
def event_file(request: Request) -> Response:
    """The form, and what a file may look like."""
    return _show(request)


@router.post("/events/file")
def take(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    file: UploadFile | str = "",
    order: Annotated[Clean, Form(max_length=3)] = "",
    beside: Annotated[bool, Form()] = False,
    deed: Annotated[Clean, Form(max_length=10)] = "log",
) -> Response:
    """Look at a file, or log all of it."""
    if isinstance(file, str) or not file.filename:
        return _show(request, error="Choose a file first.")
    name, keep = without_nul(file.filename)[:120], deed != "look"
    try:
        told = log_file(
            db,
            file.file.read(MOST_BYTES),
            viewer.who,
            today,
            viewer.farms,
            order=order if order in ("dmy", "mdy") else None,
            beside=beside,
            keep=keep,
        )
    except InputError as error:
        return _show(request, error=f"{name}: {error}", order=order, beside=beside)
    return _show(request, told, name, kept=keep, order=order, beside=beside)


def _show(
    request: Request,
    told: FileLogged | None = None,
    name: str = "",
    kept: bool = False,
    error: str = "",
    order: str = "",
    beside: bool = False,
) -> Response:
    return page(
        request,
        "pages/event_file.html",
        422 if error or (told and told.problems) else 200,
        told=told,
        name=name,
        kept=kept,
        error=error,
        order=order,
        beside=beside,
        orders=ORDERS,
        names=NAMES,
    )
