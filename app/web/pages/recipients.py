"""Who gets letters, and who covers for an advisor who is away."""

from datetime import UTC, date, datetime
from typing import Annotated, Any

from fastapi import APIRouter, Form, HTTPException, Query, Request, Response
from fastapi.responses import RedirectResponse
from pydantic import ValidationError
from sqlalchemy import select, update
from sqlalchemy.exc import IntegrityError

from app.book.schema import WEEKDAYS, RecipientPart
from app.storage import pages as store
from app.storage import recipients as people
from app.storage.tables import Farm
from app.storage.tables_letters import Cover, Letter, Recipient
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsNumber, AsToday, Clean, read_day
from app.web.problems import RefusedError
from app.web.render import page
from app.wording.catalogue import LANGUAGE_NAMES

router = APIRouter()
Text = Annotated[Clean, Form(max_length=254)]


@router.get("/recipients")
def recipients(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    done: Annotated[str, Query(max_length=20)] = "",
) -> Response:
    """Every recipient by farm, and covers."""
    with db.read() as session:
        rows = people.recipients(session, viewer.farms)
        farms = store.farms(session, viewer.farms)
        covers = people.covers_to_come(session, today, viewer.farms)
    return page(
        request,
        "pages/recipients.html",
        rows=rows,
        farms=farms,
        covers=covers,
        today=today,
        weekdays=list(enumerate(name.capitalize() for name in WEEKDAYS)),
        languages=LANGUAGE_NAMES,
        said={"changed": "Changed.", "added": "Added."}.get(done, ""),
    )


def read_recipient(
    name: str, address: str, language: str, units: str, weekday: int, hour: int, paused: bool
) -> dict[str, Any]:
    """A recipient's settings as the book takes them; raises RefusedError with each reason."""
    try:
        part = RecipientPart.model_validate(
            {
                "name": name,
                "address": address,
                "language": language,
                "units": units,
                "weekday": WEEKDAYS[weekday],
                "hour": hour,
                "paused": paused,
            }
        )
    except ValidationError as error:
        first = error.errors()[0]
        field = str(first["loc"][0])
        raise RefusedError(
            f"{field} is {str(first.get('input'))[:60]!r}, which cannot be used.",
            field,
            str(first.get("input"))[:60],
            "Write an e-mail address such as ana@example.org."
            if field == "address"
            else str(first["msg"]),
        ) from None
    return {**part.model_dump(), "weekday": weekday}


Weekday = Annotated[int, Form(ge=0, le=6)]
Hour = Annotated[int, Form(ge=0, le=23)]


@router.post("/recipients")
def add(
    db: AsDatabase,
    viewer: AsViewer,
    farm: Text,
    name: Text,
    address: Text,
    language: Text = "en",
    units: Text = "metric",
    weekday: Weekday = 6,
    hour: Hour = 18,
    paused: Annotated[bool, Form()] = False,
) -> Response:
    """Add a recipient to a farm, or change the one at that address."""
    values = read_recipient(name, address, language, units, weekday, hour, paused)
    with db.write() as session:
        keys = {key for key, _ in store.farms(session, viewer.farms)}
        number = session.scalar(select(Farm.id).where(Farm.key == farm, Farm.key.in_(keys)))
        if number is None:
            raise HTTPException(404, "There is no such farm.")
        people.put_recipient(session, number, values, viewer.who)
    return RedirectResponse("/recipients?done=added", status_code=303)


@router.post("/recipients/{number}")
def change(
    db: AsDatabase,
    viewer: AsViewer,
    number: AsNumber,
    name: Text,
    address: Text,
    language: Text = "en",
    units: Text = "metric",
    weekday: Weekday = 6,
    hour: Hour = 18,
    paused: Annotated[bool, Form()] = False,
) -> Response:
    """Change a recipient; letters released to another address become drafts again."""
    values = read_recipient(name, address, language, units, weekday, hour, paused)
    try:
        with db.write() as session:
            row = session.get(Recipient, number)
            if row is None or not people.recipients(session, viewer.farms, number):
                raise HTTPException(404, "There is no such recipient.")
            people.change_recipient(session, row, values, viewer.who, people.kept(row))
            session.execute(
                update(Letter)
                .where(Letter.recipient_id == number, Letter.state == "released")
                .where(Letter.to != values["address"])
                .values(state="draft", data=None, content=None)
            )
    except IntegrityError:
        raise RefusedError(
            f"{address} gets this farm's letters already.", "address", address, "Change that one."
        ) from None
    return RedirectResponse("/recipients?done=changed", status_code=303)


@router.post("/covers")
def cover(
    db: AsDatabase,
    viewer: AsViewer,
    name: Text,
    first: Text,
    last: Text,
    farm: Text = "",
) -> Response:
    """Hand a farm, or all of them, to somebody else for some days."""
    begins, ends = read_day(first, "the first day"), read_day(last, "the last day")
    if ends < begins:
        raise RefusedError("The last day is before the first.", "last", last)
    if not name.strip():
        raise RefusedError("Nobody is named.", "name", "", "Write who covers.")
    with db.write() as session:
        keys = {key for key, _ in store.farms(session, viewer.farms) if farm in ("", key)}
        numbers = list(session.scalars(select(Farm.id).where(Farm.key.in_(keys))))
        if not numbers:
            raise HTTPException(404, "There is no such farm.")
        for number in numbers:
            session.add(_cover(number, begins, ends, name.strip()[:80], viewer.who))
    return RedirectResponse("/recipients?done=added#cover", status_code=303)


def _cover(farm: int, first: date, last: date, name: str, who: str) -> Cover:
    return Cover(
        farm_id=farm, first=first, last=last, name=name, who=who, entered=datetime.now(UTC),
        ended=None,
    )  # fmt: skip


@router.post("/covers/{number}/end")
def end(db: AsDatabase, viewer: AsViewer, number: AsNumber) -> Response:
    """End a cover."""
    with db.write() as session:
        if not people.end_cover(session, number, viewer.farms):
            raise HTTPException(404, "There is no such cover.")
    return RedirectResponse("/recipients?done=changed#cover", status_code=303)
