"""What loggers push and what people say of a station: readings, marks, the sensor log."""

import secrets
from dataclasses import asdict
from datetime import date, datetime, time
from typing import Annotated, Any, Literal

from fastapi import APIRouter, Response
from pydantic import AwareDatetime, BaseModel, ConfigDict, Field

from app.storage import judgement
from app.storage.tables import SensorEntry, SpanMark
from app.web.access import AsViewer
from app.web.api.events import refused
from app.web.api.schemas import AppliedOut, Logged
from app.web.needs import AsDatabase, AsKey, AsNumber, AsToday, Clean
from app.web.pages.station_words import own_word, past_day
from app.web.pages.stations import own_station
from app.web.problems import RefusedError
from app.workflows.judge import (
    log_sensor,
    mark_span,
    take_back_entry,
    take_back_mark,
)
from app.workflows.once import EntryError
from app.workflows.push_readings import MOST_ROWS, PushedRow, PushError, push_readings

router = APIRouter(prefix="/api/v1", tags=["stations"])
Name = Annotated[Clean, Field(max_length=80)]
Said = Annotated[Clean, Field(max_length=400)]
Token = Annotated[Clean, Field(min_length=4, max_length=80)]


def _given(example: dict[str, Any]) -> ConfigDict:
    return ConfigDict(
        extra="forbid", allow_inf_nan=False, json_schema_extra={"examples": [example]}
    )


class RowIn(BaseModel):
    """One row: the end of its interval, with offset, and its values; null is missing."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False)
    at: AwareDatetime
    values: dict[Name, float | None]


class ReadingsIn(BaseModel):
    """Rows of a logger; the same rows sent again change nothing."""

    model_config = _given(
        {
            "interval_s": 600,
            "units": {"air_temperature": "degC", "shortwave_down": "W/m2"},
            "rows": [
                {
                    "at": "2026-07-13T10:10:00-07:00",
                    "values": {"air_temperature": 24.1, "shortwave_down": 812.0},
                }
            ],
        }
    )
    interval_s: int = Field(ge=1, le=86400, description="seconds that one row covers")
    units: dict[Name, Name] = Field(description="unit of each quantity", min_length=1)
    rows: list[RowIn] = Field(min_length=1, max_length=MOST_ROWS)


class CellOut(BaseModel):
    """A cell that was left out; rows count from 1."""

    row: int
    quantity: str
    value: str
    why: str
    remedy: str


class PushedOut(AppliedOut):
    """What a push did: its intake can be looked at and undone.

    A push that brings nothing new leaves none: the earlier one with the same rows, or null.
    """

    intake: int | None
    problems: list[CellOut]


class MarkIn(BaseModel):
    """A word on a span of readings, both days included; times in local standard time."""

    model_config = _given(
        {
            "quantity": "longwave_down",
            "first": "2026-07-09",
            "last": "2026-07-11",
            "verdict": "bad",
            "why": "dust on the window, wiped on the 11th",
            "token": "a1b2",
        }
    )
    quantity: Name
    first: date
    last: date
    from_time: time | None = None
    to_time: time | None = None
    verdict: Literal["bad", "good"]
    why: Said
    token: Token


class MarkOut(BaseModel):
    """A mark that stands: it counts after `first` up to `last`, ends of intervals."""

    id: int
    quantity: str
    first: datetime
    last: datetime
    verdict: str
    why: str
    who: str
    entered: datetime


class EntryIn(BaseModel):
    """A line of the sensor log; a calibration names its quantity and factor."""

    model_config = _given(
        {
            "kind": "calibration",
            "day": "2026-07-09",
            "quantity": "shortwave_down",
            "factor": 0.98,
            "note": "certificate of the yearly calibration",
            "token": "a1b2",
        }
    )
    kind: Literal["calibration", "cleaning", "levelling", "moved", "note"]
    day: date
    quantity: Name | None = None
    factor: float | None = None
    note: Said = ""
    token: Token


class EntryOut(BaseModel):
    """A line of the sensor log that stands."""

    id: int
    quantity: str | None
    day: date
    kind: str
    factor: float | None
    note: str
    who: str
    entered: datetime


@router.post("/stations/{key}/readings")
def readings(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, push: ReadingsIn
) -> PushedOut:
    """Take a logger's rows in, whole; a value no sensor can read is left out and listed."""
    own_station(db, viewer, today, key)
    rows = [PushedRow(row.at, row.values) for row in push.rows]
    try:
        done = push_readings(db, key, rows, push.units, push.interval_s, viewer.who, today)
    except PushError as error:
        raise RefusedError(error.says, error.field, error.value, error.remedy) from None
    return PushedOut(
        **asdict(done.applied),
        intake=done.intake_id,
        problems=[
            CellOut(
                row=problem.line - 1,
                quantity=(problem.column or "").partition(" (")[0],
                value=problem.value or "",
                why=problem.why,
                remedy=problem.remedy,
            )
            for problem in done.problems
        ],
    )


@router.get("/stations/{key}/marks")
def marks(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey) -> list[MarkOut]:
    """The marks that stand, in the order of entry."""
    station = own_station(db, viewer, today, key)
    with db.read() as session:
        return [MarkOut(**mark._asdict()) for mark in judgement.marks(session, station.id)]


@router.post("/stations/{key}/marks", status_code=201)
def mark(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, given: MarkIn) -> Logged:
    """Mark a span bad or good; days, ledgers and advice follow at once."""
    own_station(db, viewer, today, key)
    try:
        number = mark_span(
            db, key, given.quantity, past_day(str(given.first), "first", today),
            past_day(str(given.last), "last", today), given.verdict, given.why, viewer.who,
            given.token, today, _local(given.from_time) or time.min, _local(given.to_time),
        )  # fmt: skip
    except EntryError as error:
        raise refused(error) from None
    return Logged(id=number)


def _local(given: time | None) -> time | None:
    return given.replace(tzinfo=None) if given else given


@router.delete("/stations/{key}/marks/{number}", status_code=204)
def unmark(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, number: AsNumber
) -> Response:
    """A mark no longer counts; it stays in the history."""
    own_word(db, own_station(db, viewer, today, key).id, SpanMark, number)
    take_back_mark(db, number, viewer.who, secrets.token_urlsafe(12), today)
    return Response(status_code=204)


@router.get("/stations/{key}/log")
def sensor_log(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey) -> list[EntryOut]:
    """The sensor log, by day."""
    station = own_station(db, viewer, today, key)
    with db.read() as session:
        return [EntryOut(**line._asdict()) for line in judgement.sensor_log(session, station.id)]


@router.post("/stations/{key}/log", status_code=201)
def log(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, given: EntryIn) -> Logged:
    """Write a line into the sensor log."""
    own_station(db, viewer, today, key)
    try:
        number = log_sensor(
            db, key, given.kind, past_day(str(given.day), "day", today), given.note, viewer.who,
            given.token, today, given.quantity, given.factor,
        )  # fmt: skip
    except EntryError as error:
        raise refused(error) from None
    return Logged(id=number)


@router.delete("/stations/{key}/log/{number}", status_code=204)
def unlog(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, number: AsNumber
) -> Response:
    """An entry of the sensor log no longer counts; it stays in the history."""
    own_word(db, own_station(db, viewer, today, key).id, SensorEntry, number)
    take_back_entry(db, number, viewer.who, secrets.token_urlsafe(12), today)
    return Response(status_code=204)
