"""Forms of the station page: mark a span, write into the sensor log, take either back."""

import secrets
from datetime import date, time
from typing import Annotated

from fastapi import APIRouter, Form, HTTPException, Request, Response
from fastapi.responses import RedirectResponse

from app.storage import judgement
from app.storage.database import Database
from app.storage.tables import SensorEntry, SpanMark
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsKey, AsNumber, AsToday, Clean, read_day, read_number
from app.web.pages.fields import said
from app.web.pages.stations import own_station, show
from app.web.problems import RefusedError
from app.workflows.judge import (
    log_sensor,
    mark_span,
    take_back_entry,
    take_back_mark,
)
from app.workflows.once import EntryError

router = APIRouter()
Text = Annotated[Clean, Form(max_length=400)]
FIRST_DAY = date(1980, 1, 1)


@router.post("/stations/{key}/marks")
def mark(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    quantity: Text = "",
    first: Text = "",
    last: Text = "",
    from_time: Text = "",
    to_time: Text = "",
    verdict: Text = "bad",
    why: Text = "",
    token: Text = "",
) -> Response:
    """Mark a span of readings bad or good."""
    own_station(db, viewer, today, key)
    try:
        mark_span(
            db, key, quantity, past_day(first, "the first day", today),
            past_day(last, "the last day", today), verdict, why, viewer.who,
            token or secrets.token_urlsafe(12), today,
            read_time(from_time, "the time from") or time.min, read_time(to_time, "the time until"),
        )  # fmt: skip
    except (EntryError, RefusedError) as error:
        typed = {
            "quantity": quantity, "first": first, "last": last, "from_time": from_time,
            "to_time": to_time, "verdict": verdict, "why": why,
        }  # fmt: skip
        return show(request, db, viewer, today, key, error=said(error), typed=typed)
    return back(key)


@router.post("/stations/{key}/log")
def log(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    kind: Text = "",
    day: Text = "",
    quantity: Text = "",
    factor: Text = "",
    note: Text = "",
    token: Text = "",
) -> Response:
    """Write a line into the sensor log."""
    own_station(db, viewer, today, key)
    try:
        log_sensor(
            db, key, kind, past_day(day, "the day", today), note, viewer.who,
            token or secrets.token_urlsafe(12), today, quantity or None,
            read_number(factor, "the factor") if factor.strip() else None,
        )  # fmt: skip
    except (EntryError, RefusedError) as error:
        typed = {"kind": kind, "day": day, "sensor": quantity, "factor": factor, "note": note}
        return show(request, db, viewer, today, key, error=said(error), typed=typed)
    return back(key)


@router.post("/stations/{key}/marks/{number}/take-back")
def unmark(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, number: AsNumber
) -> Response:
    """A mark no longer counts; pressed twice it is taken back once."""
    own_word(db, own_station(db, viewer, today, key).id, SpanMark, number)
    take_back_mark(db, number, viewer.who, secrets.token_urlsafe(12), today)
    return back(key)


@router.post("/stations/{key}/log/{number}/take-back")
def unlog(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, number: AsNumber
) -> Response:
    """An entry of the sensor log no longer counts; pressed twice it is taken back once."""
    own_word(db, own_station(db, viewer, today, key).id, SensorEntry, number)
    take_back_entry(db, number, viewer.who, secrets.token_urlsafe(12), today)
    return back(key)


def own_word(
    db: Database, station: int, table: type[SpanMark] | type[SensorEntry], number: int
) -> None:
    """404 unless a mark or entry of that number was made of the station."""
    with db.read() as session:
        if judgement.said_of_station(session, table, number) != station:
            raise HTTPException(404, "There is no such mark or entry at this station.")


def past_day(text: str, field: str, today: date) -> date:
    """A day between 1980 and today; raises RefusedError with the remedy."""
    day = read_day(text, field)
    if not FIRST_DAY <= day <= today:
        raise RefusedError(
            f"{field} is {day}, which lies {'to come' if day > today else 'before 1980'}.",
            field,
            text[:40],
            f"Give a day between {FIRST_DAY} and {today}.",
        )
    return day


def read_time(text: str, field: str) -> time | None:
    """A time of day as time inputs send it, `06:30`, none when empty; raises RefusedError."""
    if not text.strip():
        return None
    try:
        read = time.fromisoformat(text.strip())
    except ValueError:
        read = None
    if read is None or read.tzinfo is not None:
        raise RefusedError(
            f"{field} is {text.strip()[:40]!r}, which is no time of day.",
            field,
            text[:40],
            "Write the time as 06:30, or leave it empty for whole days.",
        )
    return read


def back(key: str) -> Response:
    """Back to what is said of the station."""
    return RedirectResponse(f"/stations/{key}#words", status_code=303)
