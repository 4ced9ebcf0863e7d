"""Rounds: the morning page, and logging irrigations in its rows."""

import secrets
from collections import Counter, defaultdict
from datetime import date, timedelta
from typing import Annotated
from urllib.parse import urlencode

from fastapi import APIRouter, Query, Request, Response
from fastapi.responses import RedirectResponse
from starlette.datastructures import FormData

from app import wording
from app.storage import pages as store
from app.storage.database import Database
from app.storage.since_yesterday import since_yesterday
from app.web import rounds_view as view
from app.web.access import AsViewer, Viewer
from app.web.needs import AsDatabase, AsToday, read_day, read_number, without_nul
from app.web.problems import RefusedError
from app.web.render import page
from app.web.trouble import troubles
from app.workflows.managed import ORDER, one_a_field
from app.workflows.once import EntryError

router = APIRouter()
EVENTS_SHOWN_DAYS = 4
LONGEST_RUN_H = 168  # a week; more in one row is a slip of the finger
# Hours in one row are asked again above this many times the advised and this many hours more, and
# above FREE_HOURS where nothing was advised (working values).
DOUBTED_SHARE, DOUBTED_MORE, FREE_HOURS = 1.5, 3.0, 12.0
Short = Annotated[str, Query(max_length=80)]


@router.get("/")
def rounds(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    farm: Short = "",
    crop: Short = "",
    station: Short = "",
    standing: Short = "",
    find: Short = "",
    sort: Short = "urgency",
    part: Short = "",
    logged: Short = "",
) -> Response:
    """All fields the viewer answers for, most urgent first."""
    sieve = view.Sieve(farm, crop, station, standing, find, sort, part)
    return _show(request, db, viewer, today, sieve, logged=logged)


@router.post("/rounds/log")
async def log(request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday) -> Response:
    """Log the hours of every row that was filled in, then back to the first of them."""
    from starlette.concurrency import run_in_threadpool

    form = await request.form(max_fields=20_000)
    return await run_in_threadpool(_log, request, form, db, viewer, today)


def _log(request: Request, form: FormData, db: Database, viewer: Viewer, today: date) -> Response:
    from app.workflows.log_event import log_irrigation

    sieve = view.Sieve(**{name: str(form.get(name, "")) for name in vars(view.Sieve())})
    token = without_nul(str(form.get("token", ""))) or secrets.token_urlsafe(12)
    filled = {
        name.removeprefix("h."): str(value)
        for name, value in form.multi_items()
        if name.startswith("h.") and str(value).strip()
    }
    errors: dict[str, str] = {}
    sure: set[str] = set()
    done: list[str] = []
    with db.read() as session:
        own = store.field_keys(session, viewer.farms)
        rows = store.rounds_rows(session, store.last_morning(session, today), viewer.farms)
    advised: dict[str, float] = {}
    for row in rows:
        advised[row.field_key] = max(advised.get(row.field_key, 0.0), row.hours or 0.0)
    for key, typed in filled.items():
        try:
            if key not in own:
                raise RefusedError("There is no such field.")
            day = read_day(str(form.get("day", "")), "the day")
            hours = read_number(typed, "hours")
            if not 0 < hours <= LONGEST_RUN_H:
                raise RefusedError(
                    f"hours is {typed.strip()}; one run takes above 0, at most {LONGEST_RUN_H}.",
                    remedy="Log longer runs day by day.",
                )
            if form.get(f"sure.{key}") != typed and (doubt := _doubt(hours, advised.get(key, 0.0))):
                sure.add(key)
                raise RefusedError(doubt, remedy="If that is right, log it again as it stands.")
            log_irrigation(db, key, None, day, hours, "hours", viewer.who, f"{token}.{key}", today)
            done.append(key)
        except RefusedError as error:
            errors[key] = f"{error.says} {error.remedy}".strip()
        except EntryError as error:
            errors[key] = str(error)
    if request.headers.get("rillbook-fragment") == "rows":
        shown = set(filled)
        return _show(
            request, db, viewer, today, view.Sieve(), errors, filled, sure, only=shown, done=done
        )
    if errors:
        return _show(request, db, viewer, today, sieve, errors, filled, sure, done=done)
    query = sieve.query() | ({"logged": str(len(done))} if done else {})
    anchor = f"#{done[0]}" if done else ""
    return RedirectResponse(f"/?{urlencode(query)}{anchor}", status_code=303)


def _doubt(hours: float, advised: float) -> str:
    """What to ask of hours that look like a slip: far more than advised, or than a day has."""
    free = max(DOUBTED_SHARE * advised, advised + DOUBTED_MORE) if advised else FREE_HOURS
    if hours <= free:
        return ""
    said = f"the advice was {wording.number(advised, 1)} h" if advised else "no water was advised"
    return f"{wording.plain(hours)} h? {said[:1].upper()}{said[1:]}."


@router.post("/rounds/up-to-date")
def up_to_date(db: AsDatabase, today: AsToday) -> Response:
    """Work out what is not yet worked out for today."""
    from app.workflows.bring_up_to_date import bring_up_to_date

    bring_up_to_date(db, today)
    return RedirectResponse("/", status_code=303)


def _show(
    request: Request,
    db: Database,
    viewer: Viewer,
    today: date,
    sieve: view.Sieve,
    errors: dict[str, str] | None = None,
    typed: dict[str, str] | None = None,
    sure: set[str] | None = None,
    only: set[str] | None = None,
    done: list[str] | None = None,
    logged: str = "",
) -> Response:
    errors, typed = errors or {}, typed or {}
    with db.read() as session:
        morning = store.last_morning(session, today)
        pairs = one_a_field(store.rounds_rows(session, morning, viewer.farms))
        rows = [row for row, _ in pairs]
        stations = store.stations(session)
        energy = store.current(store.sources(session, today, viewer.farms, "energy"))
        recent = store.recent_days(session, today)
        last = store.last_days(session)
        events = store.events_since(session, today - timedelta(days=EVENTS_SHOWN_DAYS))
        since = since_yesterday(session, morning)
    by_block: dict[int, list[store.EventRow]] = defaultdict(list)
    for event in events:
        by_block[event.block_id].append(event)
    facts = view.Facts(
        today=today,
        stations={station.key: station.name for station in stations},
        energy={field: row for (field, _), row in energy.items()},
        events=by_block,
        since=since,
        ahead={row.field_id: others for row, others in pairs if others},
    )
    sifted = view.sift(rows, sieve, facts)
    if only is not None:
        sifted = [row for row in rows if row.field_key in only]
    found = len(sifted)
    first = view.first_row(sieve.part, found)
    sifted = sifted[first : first + view.ROWS_ON_A_PAGE]
    worded = [
        view.word_row(
            row,
            facts,
            errors.get(row.field_key, ""),
            typed.get(row.field_key, "") if row.field_key in errors else "",
            row.field_key in (sure or ()),
        )
        for row in sifted
    ]
    status = 422 if errors else 200
    said = _said(done, logged, len(errors))
    common = {"rows": worded, "token": secrets.token_urlsafe(12), "said": said}
    if only is not None:
        return page(request, "parts/rounds_rows.html", status, **common)
    fields = Counter(source.station_id for source in facts.energy.values())
    # a grower sees the stations that feed the farm, and no other
    shown = [item for item in stations if viewer.farms is None or item.id in fields]
    return page(
        request,
        "pages/rounds.html",
        status,
        **common,
        today=today,
        morning=morning,
        yesterday=today - timedelta(days=1),
        total=len(rows),
        found=found,
        more=view.parts(sieve, found),
        counts=view.counts(rows),
        to_water=view.to_water(rows, today),
        asked=view.asked_for(rows, today),
        troubles=troubles(shown, recent, last, fields, today),
        sieve=sieve,
        sieve_query=sieve.query(),
        sorts=[(name, label) for name, (label, _) in view.SORTS.items()],
        farms=sorted({(row.farm_key, row.farm_name) for row in rows}, key=lambda f: f[1]),
        crops=view.crops_of(rows),
        stations=[(station.key, station.name) for station in shown],
        standings=[*ORDER, "unsure", "none"],
    )


def _said(done: list[str] | None, logged: str, errors: int) -> str:
    count = len(done) if done else int(logged) if logged.isdigit() else 0
    said = f"Logged for {wording.counted(count, 'field', 'fields')}. " if count else ""
    if errors:
        said += f"Not logged for {wording.counted(errors, 'field', 'fields')}: see its row."
    return said.strip()
