"""The Letters desk: this week's letters, each as it will be sent, and what to do with them."""

from datetime import date, datetime
from pathlib import Path
from typing import Annotated

from fastapi import APIRouter, Form, HTTPException, Query, Request, Response
from fastapi.responses import RedirectResponse
from sqlalchemy.orm import Session
from starlette.datastructures import FormData

from app import wording
from app.letters.content import Content, Item
from app.settings import Settings
from app.storage import letters as store
from app.storage import recipients as people
from app.storage.letters import LetterRow
from app.web import letters_view as view
from app.web.access import AsViewer, Viewer
from app.web.headers import POLICY
from app.web.letter_mail import body, headers, letter_html, parsed
from app.web.needs import AsDatabase, AsNow, AsNumber, AsSettings, AsToday, Clean
from app.web.problems import RefusedError
from app.web.render import page
from app.wording.desk import DEEDS_DONE, NO_SERVER
from app.workflows import release_letters as deeds
from app.workflows.draft_letters import see_to_drafts
from app.workflows.once import EntryError
from app.workflows.write_letters import contents, write_letters

router = APIRouter()
Short = Annotated[str, Query(max_length=80)]


@router.get("/letters")
def desk(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    done: Short = "",
) -> Response:
    """Last week's letters, this week's and the next, those that need somebody first."""
    weeks = view.weeks_shown(today)
    see_to_drafts(db, settings.mail, now)
    with db.read() as session:
        rows = store.letters(session, weeks, viewer.farms)
        said = _said_today(session, rows, settings, today)
        answers = store.answers(session, [row.letter.id for row in rows])
        offsets = people.farm_offsets(session)
        covers = people.covers_to_come(session, today, viewer.farms)
    shown: dict[date, list[view.DeskRow]] = {}
    for row in rows:
        content = view.content_of(row, said)
        worded = view.desk_row(row, content, offsets.get(row.farm.id, 0.0), now, answers)
        shown.setdefault(row.letter.week, []).append(worded)
    return page(
        request,
        "pages/letters.html",
        weeks=[(week, view.in_order(shown[week])) for week in weeks if week in shown],
        waiting=sum(row.releasable for part in shown.values() for row in part),
        covers=covers,
        said=DEEDS_DONE.get(done, ""),
        no_server=_no_server(settings),
        farms=sorted({(row.farm.key, row.farm.name) for row in rows}, key=lambda farm: farm[1]),
        today=today,
    )


def _said_today(
    session: Session, rows: list[LetterRow], settings: Settings, today: date
) -> dict[int, tuple[Content, list[Item]] | None]:
    """What the open letters would say today."""
    open_ = [row for row in rows if row.letter.content is None]
    found = contents(session, open_, settings, today) if open_ else []
    return {row.letter.id: said for row, said in zip(open_, found, strict=True)}


def _no_server(settings: Settings) -> str:
    """Where letters go without a mail server."""
    if settings.mail.host:
        return ""
    return NO_SERVER.format(folder=Path(settings.mail.folder).absolute())


@router.post("/letters/release")
async def release_many(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
) -> Response:
    """Release the letters that are ticked."""
    from starlette.concurrency import run_in_threadpool

    form = await request.form(max_fields=5_000)
    return await run_in_threadpool(_release_many, form, db, viewer, settings, now, today)


def _release_many(
    form: FormData,
    db: AsDatabase,
    viewer: Viewer,
    settings: Settings,
    now: datetime,
    today: date,
) -> Response:
    numbers = [int(value) for value in map(str, form.getlist("letter")) if value.isdecimal()]
    if not numbers:
        raise RefusedError("No letter was ticked.", remedy="Tick those to release.")
    with db.write() as session:
        for number in numbers:
            _own(session, number, viewer)
        try:
            deeds.release(session, numbers, viewer.who, settings, now, today)
        except EntryError as error:
            raise RefusedError(str(error)) from None
    return RedirectResponse("/letters?done=release", status_code=303)


def _own(session: Session, number: int, viewer: Viewer) -> LetterRow:
    """A letter the viewer may see; 404 for others."""
    rows = store.letters(session, farms=viewer.farms, one=number)
    if not rows:
        raise HTTPException(404, "There is no such letter.")
    return rows[0]


@router.get("/letters/{number}")
def letter(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    number: AsNumber,
    done: Short = "",
) -> Response:
    """One letter as it will be sent, was sent, or would be sent now."""
    see_to_drafts(db, settings.mail, now)
    with db.read() as session:
        row = _own(session, number, viewer)
        data = _bytes(session, row, settings, now, today)
        said = _said_today(session, [row], settings, today)
        answers = store.answers(session, [number])
        offsets = people.farm_offsets(session)
        others = store.letters(session, [row.letter.week], frozenset({row.farm.key}))
    message = None if data is None else parsed(data)
    answer = page(
        request,
        "pages/letter.html",
        row=row,
        desk=view.desk_row(
            row, view.content_of(row, said), offsets.get(row.farm.id, 0.0), now, answers
        ),
        headers=[] if message is None else headers(message),
        text="" if message is None else body(message, "plain"),
        size="" if data is None else f"{wording.number(len(data) / 1000)} kB",
        deeds=_deeds(row),
        several=sum(other.letter.state in store.OPEN for other in others) > 1,
        open=row.letter.state in store.OPEN,
        said=DEEDS_DONE.get(done, ""),
        no_server=_no_server(settings),
    )
    answer.headers["Content-Security-Policy"] = f"{POLICY}; frame-src 'self'"
    return answer


def _deeds(row: LetterRow) -> list[tuple[str, str, bool]]:
    """What can be done with a letter: address, label, whether it is the plain button."""
    return {
        "draft": [
            ("release", "Release", False),
            ("send", "Send now", True),
            ("hold", "Hold", True),
        ],
        "held": [("release", "Release", False), ("back", "Back to draft", True)],
        "released": [("back", "Take back", True), ("hold", "Hold", True)],
        "refused": [("again", "Write and send again", False)],
        "unsure": [("arrived", "It arrived", False), ("again", "Send again", True)],
    }.get(row.letter.state, [])


def _bytes(
    session: Session, row: LetterRow, settings: Settings, now: datetime, today: date
) -> bytes | None:
    if row.letter.data is not None:
        return row.letter.data
    written = write_letters(session, [row], settings, now, today)[row.letter.id]
    return None if written is None else written.data


@router.get("/letters/{number}/html")
def html(
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    number: AsNumber,
) -> Response:
    """A letter's HTML body."""
    return letter_html(_whole(db, viewer, settings, now, today, number))


@router.get("/letters/{number}/letter.eml")
def eml(
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    number: AsNumber,
) -> Response:
    """A letter as a file, byte for byte."""
    return Response(
        _whole(db, viewer, settings, now, today, number),
        media_type="message/rfc822",
        headers={"Content-Disposition": f'attachment; filename="letter-{number}.eml"'},
    )


def _whole(
    db: AsDatabase,
    viewer: Viewer,
    settings: Settings,
    now: datetime,
    today: date,
    number: int,
) -> bytes:
    see_to_drafts(db, settings.mail, now)
    with db.read() as session:
        row = _own(session, number, viewer)
        data = _bytes(session, row, settings, now, today)
    if data is None:
        raise HTTPException(404, "No advice has been worked out to write this letter from.")
    return data


@router.post("/letters/{number}/note")
def note(
    db: AsDatabase,
    viewer: AsViewer,
    number: AsNumber,
    note: Annotated[Clean, Form()] = "",
    whole_farm: Annotated[bool, Form()] = False,
) -> Response:
    """Put the advisor's note in."""
    with db.write() as session:
        _own(session, number, viewer)
        try:
            deeds.set_note(session, number, note, whole_farm)
        except EntryError as error:
            raise RefusedError(str(error)) from None
    return RedirectResponse(f"/letters/{number}?done=note", status_code=303)


@router.post("/letters/{number}/{deed}")
def do(
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    number: AsNumber,
    deed: str,
    why: Annotated[Clean, Form(max_length=200)] = "",
) -> Response:
    """Release, send, hold, take back, send again, or settle a letter."""
    with db.write() as session:
        _own(session, number, viewer)
        try:
            if deed in ("release", "send"):
                deeds.release(
                    session, [number], viewer.who, settings, now, today, at_once=deed == "send"
                )
            elif deed == "hold":
                deeds.hold(session, number, why)
            elif deed == "back":
                deeds.take_back(session, number)
            elif deed == "again":
                deeds.send_again(session, number, viewer.who, settings, now, today)
            elif deed == "arrived":
                deeds.it_arrived(session, number)
            else:
                raise HTTPException(404, "There is nothing of that name to do with a letter.")
        except EntryError as error:
            raise RefusedError(str(error)) from None
    return RedirectResponse(f"/letters/{number}?done={deed}", status_code=303)
