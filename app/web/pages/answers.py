"""What the links in a letter lead to. Opening one changes nothing; a button does."""

from datetime import UTC, date, datetime, timedelta
from typing import Annotated

from fastapi import APIRouter, Form, Path, Request, Response
from sqlalchemy.orm import Session

from app.letters import links
from app.letters.links import LinkError
from app.storage import letters as store
from app.storage import recipients as people
from app.storage.database import Database
from app.storage.recipients import RecipientRow
from app.storage.tables_letters import Recipient
from app.web.needs import AsDatabase, AsToday, Clean, read_number
from app.web.problems import RefusedError
from app.web.render import page
from app.wording.reader import Reader, reader
from app.workflows.answer_letter import Asked, answer, asked
from app.workflows.once import EntryError
from app.workflows.write_letters import reader_of

router = APIRouter()
AsToken = Annotated[str, Path(max_length=200)]
Text = Annotated[Clean, Form(max_length=40)]
BACK_DAYS = 28


def _broken(request: Request, error: LinkError) -> Response:
    kind = "expired" if error.expired else "broken"
    status = 410 if error.expired else 404
    spanish = reader("es", "metric")
    return page(request, "pages/answer_broken.html", status, kind=kind, spanish=spanish)


def _read(db: Database, purpose: str, token: str, today: date) -> list[str]:
    with db.read() as session:
        key = store.signing_key(session)
    return links.read(key, purpose, token, today)


def _asked(db: Database, token: str, today: date) -> tuple[Asked, str]:
    """What a link asks about, and whether it says done or other; raises LinkError."""
    kind = "done" if token.startswith("done.") else "other"
    number, item = map(int, _read(db, kind, token, today))
    try:
        return asked(db, number, item), kind
    except EntryError:
        raise LinkError from None


@router.get("/answer/{token}")
def ask(request: Request, db: AsDatabase, today: AsToday, token: AsToken) -> Response:
    """The line of the letter, and the buttons that answer it."""
    try:
        to, kind = _asked(db, token, today)
    except LinkError as error:
        return _broken(request, error)
    return _show(request, to, kind, token, today)


def _show(
    request: Request,
    to: Asked,
    kind: str,
    token: str,
    today: date,
    problem: str = "",
    thanks: bool = False,
) -> Response:
    who = reader_of(to.row)
    return page(
        request,
        "pages/answer.html",
        422 if problem else 200,
        reader=who,
        item=to.item,
        kind=kind,
        token=token,
        before=to.before,
        problem=problem,
        thanks=thanks,
        farm=to.row.farm.key,
        day=min(to.item.day, today),
        first=today - timedelta(days=BACK_DAYS),
        today=today,
        hours=f"{to.item.hours:.4g}",
    )


@router.post("/answer/{token}")
def keep(
    request: Request,
    db: AsDatabase,
    today: AsToday,
    token: AsToken,
    said: Text = "done",
    day: Text = "",
    amount: Text = "",
    unit: Text = "hours",
) -> Response:
    """Keep the answer; the irrigation it tells is logged."""
    try:
        to, kind = _asked(db, token, today)
    except LinkError as error:
        return _broken(request, error)
    who = reader_of(to.row)
    try:
        if said == "not":
            answer(db, to, "not", None, None, "hours", today)
        else:
            when = read_past_day(day, today, who)
            done = said == "done"
            value, kept = (to.item.hours, "hours") if done else read_amount(amount, unit, who)
            answer(db, to, "done" if done else "otherwise", when, value, kept, today)
    except RefusedError as error:
        return _show(request, to, kind, token, today, error.says)
    except EntryError:
        problem = who.say("answers", "wrong_amount", typed=amount)
        return _show(request, to, kind, token, today, problem)
    return _show(request, to, kind, token, today, thanks=True)


def read_past_day(text: str, today: date, who: Reader) -> date:
    """A day of the last weeks; raises RefusedError in the reader's words."""
    try:
        day = date.fromisoformat(text)
    except ValueError:
        day = date.min
    if not today - timedelta(days=BACK_DAYS) <= day <= today:
        raise RefusedError(who.say("answers", "wrong_day", typed=text or "–"))
    return day


def read_amount(text: str, unit: str, who: Reader) -> tuple[float, str]:
    """An amount in hours, or in the reader's depths, as events keep it; raises RefusedError in the
    reader's words."""
    try:
        value = read_number(text, "")
    except RefusedError:
        raise RefusedError(who.say("answers", "wrong_number", typed=text or "–")) from None
    return (value, "hours") if unit == "hours" else (who.depth_mm(value), "gross_mm")


# Stopping and starting


@router.get("/stop/{token}")
def ask_stop(request: Request, db: AsDatabase, today: AsToday, token: AsToken) -> Response:
    """Whether to stop the letters, and the button that does."""
    try:
        row, _ = _recipient(db, token, today)
    except LinkError as error:
        return _broken(request, error)
    return _stop_page(request, row, token)


@router.post("/stop/{token}")
def stop(
    request: Request,
    db: AsDatabase,
    today: AsToday,
    token: AsToken,
    start: Annotated[bool, Form()] = False,
) -> Response:
    """Stop the letters, or start them again; what a mail program's own button sends
    (`List-Unsubscribe=One-Click`, RFC 8058) stops them."""
    try:
        row, number = _recipient(db, token, today)
    except LinkError as error:
        return _broken(request, error)
    with db.write() as session:
        kept = session.get(Recipient, number)
        assert kept is not None
        values = {"stopped_at": None if start else kept.stopped_at or datetime.now(UTC)}
        people.change_recipient(session, kept, values, f"{row.name}, by letter", None)
        row = _one(session, number)
    return _stop_page(request, row, token, changed=True)


def _recipient(db: Database, token: str, today: date) -> tuple[RecipientRow, int]:
    (number,) = map(int, _read(db, "stop", token, today))
    with db.read() as session:
        return _one(session, number), number


def _one(session: Session, number: int) -> RecipientRow:
    found = people.recipients(session, one=number)
    if not found:
        raise LinkError
    return found[0]


def _stop_page(request: Request, row: RecipientRow, token: str, changed: bool = False) -> Response:
    who = reader(row.language, row.units, row.farm.get("time_zone"))
    return page(
        request, "pages/stop.html", reader=who, row=row, token=token, changed=changed,
    )  # fmt: skip
