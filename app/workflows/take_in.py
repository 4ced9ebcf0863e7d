"""One uploaded file: kept, previewed, applied whole or not at all, undone exactly.

The state of an intake: previewed -> applied -> undone, or previewed -> same (nothing in it was
new), or previewed -> away (put away unread). Only `apply` and `undo` change readings, each in one
transaction together with all that follows from it.
"""

from dataclasses import asdict, dataclass, field, replace
from datetime import UTC, date, datetime, time, timedelta
from pathlib import PurePath
from typing import Any, BinaryIO

import numpy as np
from sqlalchemy import select
from sqlalchemy.orm import Session

from app.errors import InputError
from app.intake import (
    Clock,
    IntakeError,
    Mapping,
    Problem,
    Reading,
    Rows,
    Sniffed,
    check_mapping,
    pack,
    read,
    sniff,
    station_day,
    unanswered,
)
from app.intake.model import Progress
from app.storage import book, intakes
from app.storage.database import Database
from app.storage.tables import Intake, IntakeProblem, Station
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.compare import as_day, changed_without, compare

PROBLEMS_SHOWN = 200


class TakeInError(InputError):
    """An intake that cannot be taken further; the message says why and what to do."""


@dataclass(frozen=True)
class Applied:
    """What an apply or undo did; already_here: every row was there and the same."""

    already_here: bool
    rows: int
    first_day: date | None
    days_changed: int
    blocks: int


@dataclass(frozen=True)
class Preview:
    """What a file would bring, before anything is stored as a reading.

    columns: one dict a column of the file (position, name, examples, why); questions: one dict
    each (field, asks, choices [{value, label}], why, suggested, blocking). message: what is wrong
    with the whole file, or "". Rows are counted as accepted (of them same as stored, differing
    from stored, dated ahead of now) and refused.
    """

    intake_id: int
    file_name: str
    station_key: str
    station_name: str
    state: str
    who: str
    at: datetime
    message: str
    mapping: Mapping | None
    remembered: bool
    columns: list[dict[str, Any]]
    questions: list[dict[str, Any]]
    notes: list[str]
    rows_accepted: int
    rows_refused: int
    rows_same: int
    rows_differing: int
    rows_ahead: int
    first_day: date | None
    last_day: date | None
    days_changed: list[date]
    fields_touched: int
    problems: list[Problem] = field(default_factory=list)
    problems_total: int = 0


def receive(
    db: Database,
    station_key: str,
    file_name: str,
    source: BinaryIO,
    who: str,
    mapping: Mapping | None = None,
    progress: Progress | None = None,
    as_stated: bool = False,
    today: date | None = None,
) -> int:
    """Keep a file for a station and preview it; returns the intake's number.

    With `as_stated` the mapping given is read as it stands and nothing of the file is guessed;
    else it must be of this file's header. A file that cannot be read is kept too, with the message
    that says why. Rows are ahead of now by the clock, or by `today` where that lies later. Raises
    TakeInError for no such station and a mapping that contradicts itself.
    """
    _checked(mapping)
    sha256, pieces = intakes.compress(source)
    with db.read() as session:
        station = _station(session, station_key)
        seen = _look(session, station, source, mapping, progress, as_stated, today)
    with db.write() as session:
        intake = Intake(
            station_id=station.id,
            file_name=PurePath(file_name.replace("\\", "/")).name[:200] or "unnamed",
            sha256=sha256,
            who=who,
            at=datetime.now(UTC),
            state="previewed",
        )
        _keep(session, intake, seen)
        intakes.keep_file(session, intake.id, pieces)
        return intake.id


def remap(
    db: Database, intake_id: int, mapping: Mapping, who: str, today: date | None = None
) -> None:
    """Preview again with a corrected mapping, read as it stands; raises TakeInError."""
    _checked(mapping)
    with db.read() as session:
        intake = _open(session, intake_id)
        before = intake.summary
        with intakes.open_file(session, intake_id) as source:
            seen = _look(session, intake.station, source, mapping, None, True, today)
    for told in ("columns", "notes", "remembered"):
        seen.summary[told] = before.get(told, seen.summary.get(told))
    asked = {question["field"]: question for question in before.get("questions", [])}
    seen.summary["questions"] = [
        asked.get(question["field"], question) for question in seen.summary.get("questions", [])
    ]
    with db.write() as session:
        intake = _open(session, intake_id)
        intake.who = who
        _keep(session, intake, seen)


def discard(db: Database, intake_id: int, who: str) -> None:
    """Put a previewed file away; raises TakeInError."""
    with db.write() as session:
        intake = _open(session, intake_id)
        intake.state, intake.who = "away", who


def apply(
    db: Database,
    intake_id: int,
    who: str,
    today: date | None,
    progress: Progress | None = None,
    keep_same: bool = True,
    ahead: bool = False,
) -> Applied:
    """Take a previewed file in, whole; raises TakeInError, and then nothing is changed.

    Ledgers and advice of `today` follow in the same transaction; with None they are left marked
    as dirty, for whoever takes many files in and brings all up to date at the end. Without
    `keep_same` a file that brings nothing new is forgotten. Rows dated after now are taken only
    where `ahead` says so.
    """
    with db.read() as session:
        intake = _open(session, intake_id)
        mapping, clock = intake.mapping, _clock(intake.station)
        if not mapping:
            raise TakeInError(intake.summary.get("message") or "This file cannot be read.")
        if (late := intake.summary.get("rows_ahead", 0)) and not ahead:
            raise TakeInError(
                f"{late} of its rows {'is' if late == 1 else 'are'} dated after now. Mend the "
                "dates or how they are read; or say that they are to be taken all the same."
            )
        try:
            with intakes.open_file(session, intake_id) as source:
                reading = read(source, Mapping.model_validate(mapping), clock, progress)
        except IntakeError as error:
            raise TakeInError(str(error)) from None
    with db.write() as session:
        intake = _open(session, intake_id)
        station = intake.station
        if intake.mapping != mapping:
            raise TakeInError("Somebody changed how this file is read; look at it again.")
        changed = compare(session, station.id, reading.rows, clock).days
        intake.who, intake.applied_at = who, datetime.now(UTC)
        if not changed:
            intake.state = "same"
            nothing = Applied(True, len(reading.rows), intake.first_day, 0, 0)
            if not keep_same:
                intakes.forget(session, intake)
            return nothing
        packs = pack(reading.rows, clock)
        intakes.contribute(session, intake, ((p.day, p.rows, p.blob) for p in packs))
        intake.state, intake.applied_order = "applied", intakes.next_order(session)
        intake.rows = len(reading.rows)
        del reading, packs  # a large file's rows need not lie about while its days are recomputed
        intakes.remember(session, station.id, intake.mapping["signature"], intake.mapping)
        session.flush()
        return _land(session, station, intake, changed, today)


def undo(db: Database, intake_id: int, who: str, today: date) -> Applied:
    """Take an applied file out again: its days are exactly what they were without it."""
    with db.write() as session:
        intake = session.get(Intake, intake_id, with_for_update=True)
        if intake is None or intake.state != "applied":
            raise TakeInError("Only a file that has been taken in can be undone.")
        changed = changed_without(session, intake, _clock(intake.station))
        intake.state = "undone"
        session.flush()
        intake.summary = {**intake.summary, "undone_by": who, "undone_at": str(datetime.now(UTC))}
        return _land(session, intake.station, intake, changed, today)


def preview_of(db: Database, intake_id: int) -> Preview:
    """The preview as it stands; raises TakeInError when there is no such intake."""
    with db.read() as session:
        intake = session.get(Intake, intake_id)
        if intake is None:
            raise TakeInError(f"There is no intake {intake_id}.")
        summary = intake.summary
        problems = session.scalars(
            select(IntakeProblem)
            .where(IntakeProblem.intake_id == intake_id)
            .order_by(IntakeProblem.id)
            .limit(PROBLEMS_SHOWN)
        )
        return Preview(
            intake_id=intake.id,
            file_name=intake.file_name,
            station_key=intake.station.key,
            station_name=intake.station.name,
            state=intake.state,
            who=intake.who,
            at=intake.at,
            message=summary.get("message", ""),
            mapping=Mapping.model_validate(intake.mapping) if intake.mapping else None,
            remembered=summary.get("remembered", False),
            columns=summary.get("columns", []),
            questions=summary.get("questions", []),
            notes=summary.get("notes", []),
            rows_accepted=intake.rows,
            rows_refused=summary.get("rows_refused", 0),
            rows_same=summary.get("rows_same", 0),
            rows_differing=summary.get("rows_differing", 0),
            rows_ahead=summary.get("rows_ahead", 0),
            first_day=intake.first_day,
            last_day=intake.last_day,
            days_changed=[date.fromisoformat(day) for day in summary.get("days_changed", [])],
            fields_touched=summary.get("fields_touched", 0),
            problems=[
                Problem(
                    line=row.line,
                    column=row.column,
                    value=row.value,
                    why=row.why,
                    remedy=row.remedy,
                    severity=row.severity,  # type: ignore[arg-type]
                    count=row.count,
                    last_line=row.last_line,
                )
                for row in problems
            ],
            problems_total=summary.get("problems_total", 0),
        )


def _station(session: Session, key: str) -> Station:
    station = book.find(session, Station, key)
    if station is None:
        there = ", ".join(sorted(book.keys_of(session, Station))) or "none yet"
        raise TakeInError(f"There is no station {key!r}; the stations are: {there}.")
    return station


def _open(session: Session, intake_id: int) -> Intake:
    intake = session.get(Intake, intake_id, with_for_update=True)
    if intake is None:
        raise TakeInError(f"There is no intake {intake_id}.")
    if intake.state != "previewed":
        state = {"applied": "taken in", "undone": "undone", "same": "found to hold nothing new"}
        raise TakeInError(
            f"This file has already been {state.get(intake.state, 'put away')}; upload it again."
        )
    return intake


def _clock(station: Station) -> Clock:
    return Clock(station.details["utc_offset_h"], station.details["time_zone"])


@dataclass(frozen=True)
class _Look:
    """What a look at a file found: the parts of a preview."""

    mapping: dict[str, Any]
    summary: dict[str, Any]
    rows: int
    first_day: date | None
    last_day: date | None
    problems: tuple[Problem, ...]


def _look(
    session: Session,
    station: Station,
    source: BinaryIO,
    mapping: Mapping | None,
    progress: Progress | None,
    as_stated: bool,
    today: date | None,
) -> _Look:
    """Sniff a file and, where nothing is left open, read it and compare; stores nothing."""
    clock = _clock(station)
    summary: dict[str, Any] = {"message": ""}
    used: dict[str, Any] = {}
    try:
        if as_stated and mapping is not None:
            columns = len(mapping.columns)
            asked = tuple(unanswered(mapping))
            sniffed = Sniffed(mapping, asked, ((),) * columns, ("as stated",) * columns)
        else:
            sniffed = _sniff(session, station, source, clock, mapping)
        used = sniffed.mapping.model_dump(mode="json")
        summary |= _seen(sniffed)
        if any(question.blocking for question in sniffed.questions):
            return _Look(used, summary, 0, None, None, ())
        reading = read(source, sniffed.mapping, clock, progress)
    except IntakeError as error:
        return _Look(used, {**summary, "message": str(error)}, 0, None, None, ())
    rows = reading.rows
    days = station_day(rows.instant, rows.interval_s, clock)
    ahead = _ahead_of_time(rows, clock, today)
    counted = {
        "rows_ahead": sum(item.count for item in ahead),
        "problems_total": len(ahead) + len(reading.problems) + reading.counts.problems_not_listed,
    }
    return _Look(
        used,
        summary | _brings(session, station, reading, clock) | counted,
        len(rows),
        as_day(days.min()) if len(rows) else None,
        as_day(days.max()) if len(rows) else None,
        (*ahead, *reading.problems),
    )


def _ahead_of_time(rows: Rows, clock: Clock, today: date | None) -> tuple[Problem, ...]:
    """A warning where rows are dated after now: the year, the order of the date or a clock."""
    now = _now(clock, today)
    late = np.flatnonzero(rows.instant > now.timestamp() + np.maximum(rows.interval_s, 3600))
    if not late.size:
        return ()
    first = datetime.fromtimestamp(int(rows.instant[late[0]]), UTC)
    return (
        Problem(
            line=int(rows.line[late].min()),
            last_line=int(rows.line[late].max()),
            column="(date)",
            value=f"{first:%Y-%m-%d %H:%M} UTC",
            why=f"dated after now ({now:%Y-%m-%d %H:%M} UTC)",
            remedy="See whether the year, the order of day and month, or the logger's clock is "
            "wrong. They are taken only if you say so, and count once their day has come.",
            severity="warning",
            count=int(late.size),
        ),
    )


def _now(clock: Clock, today: date | None) -> datetime:
    """The clock's now; the end of the station's `today` where that has not yet begun."""
    now = datetime.now(UTC)
    if today is None:
        return now
    begins = datetime.combine(today, time(), UTC) - timedelta(hours=clock.utc_offset_h)
    return now if begins <= now else begins + timedelta(days=1)


def _checked(mapping: Mapping | None) -> None:
    if mapping is None:
        return
    try:
        check_mapping(mapping)
    except IntakeError as error:
        raise TakeInError(str(error)) from None


def _keep(session: Session, intake: Intake, look: _Look) -> None:
    """Keep what a look at the file found in place of an earlier one."""
    intake.mapping, intake.summary = map(intakes.storable, (look.mapping, look.summary))
    intake.rows, intake.first_day, intake.last_day = look.rows, look.first_day, look.last_day
    session.add(intake)
    session.flush()
    intakes.replace_problems(session, intake.id, (_problem_row(item) for item in look.problems))


def _sniff(
    session: Session,
    station: Station,
    source: BinaryIO,
    clock: Clock,
    mapping: Mapping | None,
) -> Sniffed:
    """A given mapping is kept to; else the one remembered for this header; else a guess."""
    source.seek(0)
    if mapping is not None:
        found = sniff(source, clock, mapping)
        if not found.remembered:
            raise IntakeError(
                "The mapping given is of another header, or its dates are not those of this file: "
                "take the mapping that a preview of this file shows."
            )
        stated = {"interval_s": mapping.interval_s or found.mapping.interval_s}
        return replace(found, mapping=found.mapping.model_copy(update=stated))
    sniffed = sniff(source, clock)
    known = intakes.remembered(session, station.id, sniffed.mapping.signature)
    if known is None:
        return sniffed
    source.seek(0)
    return sniff(source, clock, Mapping.model_validate(known))


def _seen(sniffed: Sniffed) -> dict[str, Any]:
    return {
        "columns": [
            {"position": column.position, "name": column.name, "examples": list(seen), "why": why}
            for column, seen, why in zip(
                sniffed.mapping.columns, sniffed.examples, sniffed.why, strict=False
            )
        ],
        "questions": [asdict(question) for question in sniffed.questions],
        "notes": list(sniffed.notes),
        "remembered": sniffed.remembered,
    }


def _brings(session: Session, station: Station, reading: Reading, clock: Clock) -> dict[str, Any]:
    compared = compare(session, station.id, reading.rows, clock)
    return {
        "rows_refused": reading.counts.rows_refused,
        "rows_same": compared.same,
        "rows_differing": compared.differing,
        "days_changed": [str(day) for day in compared.days],
        "fields_touched": intakes.fields_fed(session, station.id) if compared.days else 0,
        "counts": asdict(reading.counts),
    }


def _problem_row(problem: Problem) -> dict[str, Any]:
    return {
        "line": problem.line,
        "last_line": problem.last_line or problem.line,
        "column": problem.column,
        "value": problem.value,
        "why": problem.why,
        "remedy": problem.remedy,
        "severity": problem.severity,
        "count": problem.count,
    }


def _land(
    session: Session, station: Station, intake: Intake, changed: list[date], today: date | None
) -> Applied:
    """Mark what a change of readings touches and bring it up to date."""
    blocks = 0
    if changed:
        book.dirty_station(session, station.id, changed[0])
        blocks = up_to_date(session, today).blocks if today is not None else 0
    return Applied(False, intake.rows, intake.first_day, len(changed), blocks)
