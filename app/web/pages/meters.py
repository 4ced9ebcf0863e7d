"""Water meters: put up, read, metered against logged, shared over the irrigations."""

import math
import re
import secrets
from typing import Annotated

from fastapi import APIRouter, Form, HTTPException, Request, Response
from fastapi.responses import RedirectResponse

from app.storage import meters as store
from app.storage import pages as store_pages
from app.storage.database import Database
from app.storage.tables_meters import Meter
from app.web.access import AsViewer, Viewer
from app.web.needs import AsDatabase, AsKey, AsNumber, AsToday, Clean, read_day, read_number
from app.web.pages.fields import said
from app.web.problems import RefusedError
from app.web.render import page
from app.workflows import meters
from app.workflows.once import EntryError

router = APIRouter()
Text = Annotated[Clean, Form(max_length=400)]
NO_METER = "There is no such meter, or it is not on your farm."
UNITS = {
    "m3": "m³",
    "l": "litres",
    "ml": "megalitres",
    "gal": "US gallons",
    "ft3": "cubic feet",
    "acre_in": "acre-inches",
    "acre_ft": "acre-feet",
}


@router.get("/meters")
def meter_list(request: Request, db: AsDatabase, viewer: AsViewer) -> Response:
    """Every meter, what was metered and logged, and the form to put one up."""
    return _list(request, db, viewer)


def _list(request: Request, db: Database, viewer: Viewer, error: str = "") -> Response:
    with db.read() as session:
        rows = [
            (
                meter,
                farm,
                _fed(store.fed_blocks(session, meter.id)),
                sums(meters.intervals(session, meter)),
            )
            for meter, farm in store.meters(session, viewer.farms)
        ]
        farms = [row for row in store_pages.farms(session) if own_farm(viewer, row[0])]
        fields = store.unmetered_fields(session, viewer.farms)
    return page(
        request,
        "pages/meters.html",
        422 if error else 200,
        rows=rows,
        farms=farms,
        fields=fields,
        units=UNITS,
        error=error,
    )


def own_farm(viewer: Viewer, key: str) -> bool:
    """Whether the viewer may know of a farm."""
    return viewer.farms is None or key in viewer.farms


def _fed(blocks: list[store.FedBlock]) -> list[tuple[str, str]]:
    return sorted({(block.field_key, block.field_name) for block in blocks}, key=lambda f: f[1])


def sums(told: list[meters.Interval]) -> tuple[float, float, int]:
    """Metered and logged over the intervals that tell of water, and how many wait."""
    known = [one for one in told if not math.isnan(one.metered_m3)]
    return (
        sum(one.metered_m3 for one in known),
        sum(one.logged_m3 for one in known),
        sum(one.open for one in known),
    )


@router.post("/meters")
def put_up(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    name: Text = "",
    unit: Text = "m3",
    multiplier: Text = "1",
    rolls_over_at: Text = "",
    field: Annotated[list[Clean] | None, Form()] = None,
) -> Response:
    """Put up a meter."""
    try:
        stated = _stated(db, viewer, name, unit, multiplier, rolls_over_at, field or [])
        key = meters.put_meter(db, stated, viewer.who, viewer.farms)
    except (EntryError, RefusedError) as error:
        return _list(request, db, viewer, said(error))
    return RedirectResponse(f"/meters/{key}", status_code=303)


@router.post("/meters/{key}")
def change(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    name: Text = "",
    unit: Text = "m3",
    multiplier: Text = "1",
    rolls_over_at: Text = "",
    field: Annotated[list[Clean] | None, Form()] = None,
) -> Response:
    """Change a meter; what was shared out stays until it is shared again."""
    own_meter(db, viewer, key)
    try:
        stated = _stated(db, viewer, name, unit, multiplier, rolls_over_at, field or [])
        meters.put_meter(db, stated, viewer.who, viewer.farms, key)
    except (EntryError, RefusedError) as error:
        return _show(request, db, viewer, key, str(today), said(error))
    return RedirectResponse(f"/meters/{key}", status_code=303)


def _stated(
    db: Database,
    viewer: Viewer,
    name: str,
    unit: str,
    multiplier: str,
    rolls_over_at: str,
    fields: list[str],
) -> meters.MeterGiven:
    """A meter as the form states it; raises EntryError or RefusedError."""
    with db.read() as session:
        farm = store.farm_of_field(session, fields[0], viewer.farms) if fields else None
    if farm is None:
        raise RefusedError("No field is chosen.", remedy="Choose the fields the meter feeds.")
    rolls = rolls_over_at.strip()
    return meters.MeterGiven(
        name=name,
        farm=farm,
        fields=tuple(fields),
        unit=unit,
        multiplier=read_number(multiplier or "1", "the multiplier"),
        rolls_over_at=read_number(rolls, "the roll-over") if rolls else None,
    )


@router.get("/meters/{key}")
def meter(
    request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey
) -> Response:
    """One meter: its readings, and metered against logged between them."""
    return _show(request, db, viewer, key, str(today))


def _show(
    request: Request, db: Database, viewer: Viewer, key: str, day: str, error: str = ""
) -> Response:
    with db.read() as session:
        found = own_meter(db, viewer, key)
        blocks = store.fed_blocks(session, found.id)
        told = meters.intervals(session, found)
        farm = store.farm_of_field(session, blocks[0].field_key, viewer.farms) if blocks else None
        own = None if farm is None else frozenset({farm})
        free = store.unmetered_fields(session, own)
    return page(
        request,
        "pages/meter.html",
        422 if error else 200,
        meter=found,
        unit=UNITS[found.unit],
        fed=_fed(blocks),
        flows=[
            (block.field_name, block.block_key, 10 * block.area_ha * block.system["rate_mm_h"])
            for block in blocks
        ],
        told=list(reversed(told)),
        sums=sums(told),
        choices=sorted([*_fed(blocks), *((row[0], row[1]) for row in free)], key=lambda f: f[1]),
        chosen=[key for key, _ in _fed(blocks)],
        units=UNITS,
        day=day,
        token=secrets.token_urlsafe(12),
        isnan=math.isnan,
        error=error,
    )


def own_meter(db: Database, viewer: Viewer, key: str) -> Meter:
    """The meter of a key the viewer may see; 404 otherwise."""
    with db.read() as session:
        found = store.meter_of(session, key, viewer.farms)
    if found is None:
        raise HTTPException(404, NO_METER)
    return found


def read_register(text: str) -> float:
    """The number a register shows; RefusedError for one that may be thousands or decimals."""
    if re.fullmatch(r"[0-9]{1,3}([,.][0-9]{3})+", text.strip()) and text.strip()[0] != "0":
        raise RefusedError(
            f"The register is {text.strip()!r}, which can be read as thousands or as decimals.",
            remedy="Write it without marks between the thousands, such as 48210 or 48210.5.",
        )
    return read_number(text, "the register")


@router.post("/meters/{key}/readings")
def read(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    day: Text = "",
    shows: Text = "",
    restarts: Annotated[bool, Form()] = False,
    note: Text = "",
    token: Text = "",
) -> Response:
    """Keep a reading."""
    own_meter(db, viewer, key)
    try:
        meters.read_meter(
            db,
            key,
            read_day(day, "the day"),
            read_register(shows),
            viewer.who,
            token or secrets.token_urlsafe(12),
            today,
            viewer.farms,
            restarts=restarts,
            note=note.strip(),
        )
    except (EntryError, RefusedError) as error:
        return _show(request, db, viewer, key, day, said(error))
    return RedirectResponse(f"/meters/{key}", status_code=303)


@router.post("/meters/{key}/readings/{number}/delete")
def delete(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    number: AsNumber,
    token: Text = "",
) -> Response:
    """Delete a reading."""
    own_meter(db, viewer, key)
    try:
        meters.void_reading(
            db, key, number, viewer.who, token or secrets.token_urlsafe(12), viewer.farms
        )
    except EntryError as error:
        return _show(request, db, viewer, key, str(today), said(error))
    return RedirectResponse(f"/meters/{key}", status_code=303)


@router.post("/meters/{key}/readings/{number}/share")
def share(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    number: AsNumber,
    token: Text = "",
) -> Response:
    """Share what was metered over the irrigations logged meanwhile."""
    own_meter(db, viewer, key)
    try:
        meters.share_out(
            db, key, number, viewer.who, token or secrets.token_urlsafe(12), today, viewer.farms
        )
    except EntryError as error:
        return _show(request, db, viewer, key, str(today), said(error))
    return RedirectResponse(f"/meters/{key}", status_code=303)
