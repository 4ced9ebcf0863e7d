"""The grower's farm page: this week, what was done, past letters, the calendar; for the phone."""

import secrets
from datetime import date, datetime, timedelta
from typing import Annotated

from fastapi import APIRouter, Form, HTTPException, Path, Query, Request, Response
from fastapi.responses import RedirectResponse
from sqlalchemy.orm import Session

from app.letters import links
from app.letters.view import Links, view
from app.settings import Settings
from app.storage import letters as store
from app.storage import pages
from app.storage import recipients as people
from app.storage.recipients import RecipientRow
from app.storage.tables_letters import Recipient
from app.web.access import AsViewer, Viewer
from app.web.letter_mail import letter_html
from app.web.needs import AsDatabase, AsKey, AsNow, AsNumber, AsSettings, AsToday, Clean
from app.web.pages.answers import read_amount, read_past_day
from app.web.problems import RefusedError
from app.web.render import page
from app.web.rounds_view import bar
from app.wording.catalogue import LANGUAGE_NAMES
from app.wording.reader import Reader, reader
from app.workflows.draft_letters import see_to_drafts
from app.workflows.farm_calendar import farm_calendar
from app.workflows.letter_facts import FarmFacts, farm_facts, letter_content
from app.workflows.letter_weeks import monday
from app.workflows.log_event import log_irrigation, log_rain
from app.workflows.once import EntryError

router = APIRouter()
Short = Annotated[str, Query(max_length=20)]
Text = Annotated[Clean, Form(max_length=200)]
LOGGED_DAYS = 14
LETTERS_SHOWN = EVENTS_SHOWN = 12


@router.get("/farm")
def own(viewer: AsViewer) -> Response:
    """The grower's own farm; the first by key of several."""
    own_farms = sorted(viewer.farms or ())
    if not own_farms:
        raise HTTPException(404, "No farm is yours yet.")
    return RedirectResponse(f"/farm/{own_farms[0]}", status_code=303)


def _farm(session: Session, key: str, viewer: Viewer) -> str:
    """The name of a farm the viewer may see; 404 for others."""
    known = viewer.farms is None or key in viewer.farms
    found = pages.farms(session, frozenset({key})) if known else []
    if not found:
        raise HTTPException(404, "There is no such farm.")
    return found[0][1]


def farm_reader(rows: list[RecipientRow], language: str, units: str) -> Reader:
    """The language and units asked for, else those of the farm's first recipient."""
    first = rows[0] if rows else None
    zone = first.farm.get("time_zone") if first else None
    return reader(
        language or (first.language if first else "en"),
        units or (first.units if first else "metric"),
        zone,
    )


@router.get("/farm/{key}")
def farm(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    key: AsKey,
    language: Short = "",
    units: Short = "",
    done: Short = "",
) -> Response:
    """The farm's week."""
    return _show(request, db, viewer, settings, now, today, key, language, units, done)


def _show(
    request: Request,
    db: AsDatabase,
    viewer: Viewer,
    settings: Settings,
    now: datetime,
    today: date,
    key: str,
    language: str,
    units: str,
    done: str = "",
    problem: str = "",
) -> Response:
    see_to_drafts(db, settings.mail, now)
    with db.read() as session:
        name = _farm(session, key, viewer)
        signing = store.signing_key(session)
        facts = farm_facts(session, today, frozenset({key}))[key]
        rows = people.recipients(session, frozenset({key}))
        sent = store.letters(session, farms=frozenset({key}), states=("sent",), most=LETTERS_SHOWN)
        events = pages.events_since(session, today - timedelta(days=LOGGED_DAYS), facts.blocks)
    who = farm_reader(rows, language, units)
    content = letter_content(facts, monday(today), today, settings.mail.domain)
    worded = None if content is None else view(content, who, Links({}, "", "", ""))
    token = links.sign(signing, "feed", key, who.language, who.units)
    return page(
        request,
        "pages/farm.html",
        422 if problem else 200,
        reader=who,
        name=name,
        key=key,
        letter=worded,
        content=content,
        bars=_bars(facts, who),
        fields=[(one.row.field_key, one.row.field_name) for one in facts.fields],
        events=[_event_words(event, facts, who, today) for event in events[:EVENTS_SHOWN]],
        sent=[(row, who.short_day(row.letter.first_day)) for row in sent],
        recipients=rows,
        feed=f"{settings.mail.base_url}/calendar/{token}.ics",
        languages=LANGUAGE_NAMES,
        weekdays=[(number, who.weekday(number)) for number in range(7)],
        token=secrets.token_urlsafe(12),
        today=today,
        first=today - timedelta(days=28),
        problem=problem,
        done=done == "logged",
        changed=done == "changed",
    )


def _bars(facts: FarmFacts, who: Reader) -> list[tuple[str, str, object, str, bool]]:
    """Key and name of each field, its bullet bar, its depletion in words, whether it is unsure."""
    return [
        (
            row.field_key,
            row.field_name,
            bar(
                row.depletion_mm,
                row.limit_mm,
                row.taw_mm,
                row.depletion_p10_mm,
                row.depletion_p90_mm,
            ),
            who.say(
                "pages",
                "depletion",
                depletion=who.depth(max(row.depletion_mm, 0.0)),
                limit=who.depth(row.limit_mm),
            ),
            bool(row.unsure),
        )
        for row in (one.row for one in facts.fields)
    ]


def _event_words(
    event: pages.EventRow, facts: FarmFacts, who: Reader, today: date
) -> tuple[str, str, str]:
    """Day, field and amount of an event."""
    names = {one.row.block_id: one.row.field_name for one in facts.fields}
    if event.unit == "hours":
        amount = who.hours(event.amount)
    elif event.unit == "volume_m3":
        amount = who.volume(event.amount)
    else:
        amount = who.depth(event.amount)
    if event.kind == "rain":
        amount += f", {who.say('pages', 'gauge_rain')}"
    return who.near_day(event.day, today), names[event.block_id], amount


@router.post("/farm/{key}/log")
def log(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    key: AsKey,
    field: Text,
    day: Text,
    amount: Text,
    token: Text,
    unit: Text = "hours",
    note: Text = "",
    language: Text = "",
    units: Text = "",
) -> Response:
    """Log water, or rain of the farm's own gauge."""
    with db.read() as session:
        _farm(session, key, viewer)
        rows = people.recipients(session, frozenset({key}))
        if field not in pages.field_keys(session, frozenset({key})):
            raise HTTPException(404, "There is no such field.")
    who = farm_reader(rows, language, units)
    try:
        when = read_past_day(day, today, who)
        value, kept = read_amount(amount, unit, who)
        if unit == "rain":
            log_rain(db, field, when, value, viewer.who, token, today, note or None)
        else:
            log_irrigation(
                db, field, None, when, value, kept, viewer.who, token, today, note=note or None
            )
    except (RefusedError, EntryError) as error:
        said = error.says if isinstance(error, RefusedError) else ""
        problem = said or who.say("answers", "wrong_amount", typed=amount)
        return _show(
            request, db, viewer, settings, now, today, key, language, units, problem=problem
        )
    return RedirectResponse(_back(key, language, units, "logged"), status_code=303)


def _back(key: str, language: str, units: str, done: str) -> str:
    asked = [("language", language), ("units", units)]
    kept = "".join(f"&{name}={value}" for name, value in asked if value.isalpha())
    return f"/farm/{key}?done={done}{kept}"


@router.post("/farm/{key}/recipients/{number}")
def change(
    db: AsDatabase,
    viewer: AsViewer,
    key: AsKey,
    number: AsNumber,
    language: Text,
    units: Text,
    weekday: Annotated[int, Form(ge=0, le=6)],
    hour: Annotated[int, Form(ge=0, le=23)],
    paused: Annotated[bool, Form()] = False,
) -> Response:
    """How letters reach a recipient of the farm."""
    if language not in LANGUAGE_NAMES or units not in ("metric", "us"):
        raise RefusedError("language is en or es, units are metric or us.")
    with db.write() as session:
        _farm(session, key, viewer)
        row = session.get(Recipient, number)
        if row is None or not people.recipients(session, frozenset({key}), number):
            raise HTTPException(404, "There is no such recipient.")
        values = {
            "language": language,
            "units": units,
            "weekday": weekday,
            "hour": hour,
            "paused": paused,
        }
        people.change_recipient(session, row, values, viewer.who, people.kept(row))
    return RedirectResponse(f"/farm/{key}?done=changed#letters", status_code=303)


@router.get("/farm/{key}/letters/{number}")
def letter(db: AsDatabase, viewer: AsViewer, key: AsKey, number: AsNumber) -> Response:
    """A letter that was sent, as it was sent."""
    with db.read() as session:
        _farm(session, key, viewer)
        found = store.letters(session, farms=frozenset({key}), one=number, states=("sent",))
    if not found or found[0].letter.data is None:
        raise HTTPException(404, "There is no such letter.")
    return letter_html(found[0].letter.data)


@router.get("/calendar/{token}.ics")
def feed(
    db: AsDatabase,
    settings: AsSettings,
    now: AsNow,
    today: AsToday,
    token: Annotated[str, Path(max_length=200)],
) -> Response:
    """A farm's days to water, for whoever has the address."""
    with db.read() as session:
        try:
            key, language, units = links.read(store.signing_key(session), "feed", token, today)
        except links.LinkError:
            raise HTTPException(404, "There is no such calendar.") from None
        rows = people.recipients(session, frozenset({key}))
        data = farm_calendar(session, key, farm_reader(rows, language, units), settings, now, today)
    return Response(data, media_type="text/calendar; charset=utf-8")
