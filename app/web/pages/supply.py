"""Shared supplies and their plan for the days ahead; what is tried by hand is not stored."""

from datetime import date
from typing import Annotated
from urllib.parse import urlencode

from fastapi import APIRouter, HTTPException, Query, Request, Response

from app.storage import supplies as store
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsKey, AsToday, Clean, read_day, read_number
from app.web.pages.fields import said
from app.web.problems import RefusedError
from app.web.render import page
from app.web.supply_view import SupplyView, supply_view
from app.workflows.once import EntryError
from app.workflows.plan_supply import planned

router = APIRouter()
Short = Annotated[Clean, Query(max_length=40)]
LEAST_DAYS, MOST_DAYS, MOST_PINS = 7, 14, 100


@router.get("/supply")
def supplies(request: Request, db: AsDatabase, viewer: AsViewer) -> Response:
    """Every supply all of whose fields the viewer may know of."""
    with db.read() as session:
        rows = [
            (row, sorted({name for _, _, name, _ in store.blocks_on(session, row.id)}))
            for row in store.supplies(session, viewer.farms)
        ]
    return page(request, "pages/supplies.html", rows=rows)


@router.get("/supply/{key}")
def supply(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    days: Annotated[int, Query(ge=LEAST_DAYS, le=MOST_DAYS)] = LEAST_DAYS,
    pin: Annotated[list[Short] | None, Query(max_length=MOST_PINS)] = None,
    block: Short = "",
    day: Short = "",
    hours: Short = "",
) -> Response:
    """The plan of one supply, around what is pinned by hand (0 hours forbid a day)."""
    error, found = "", None
    pins: dict[tuple[int, date], float] = {}
    with db.read() as session:
        row = next((r for r in store.supplies(session, viewer.farms) if r.key == key), None)
        if row is None:
            raise HTTPException(404, "There is no such supply, or not all of it is yours.")
        try:
            for text in pin or []:
                pins |= _pin(*text.split("~")) if text.count("~") == 2 else _pin("", "", "")
            if hours:
                pins |= _pin(block, day, hours)
            found = planned(session, row, today, days, pins)
        except (EntryError, RefusedError) as refusal:
            error = said(refusal)
        name, details = row.name, row.details
    view: SupplyView | None = None if found is None else supply_view(found, pins, today)
    kept = [f"{number}~{at}~{value:g}" for (number, at), value in sorted(pins.items())]
    return page(
        request,
        "pages/supply.html",
        422 if error else 200,
        name=name,
        key=key,
        details=details,
        view=view,
        error=error,
        pins=kept,
        without=[
            "?" + urlencode([("days", days), *(("pin", k) for k in kept if k != one)])
            for one in kept
        ],
        days=days,
        today=today,
    )


def _pin(block: str, day: str, hours: str) -> dict[tuple[int, date], float]:
    if not block.isascii() or not block.isdigit():
        raise EntryError("a pin names no block; choose one")
    on, value = read_day(day, "the day"), read_number(hours, "the hours")
    if not 0.0 <= value <= 24.0:
        raise EntryError(f"the hours are {value:g}; give 0 to 24")
    return {(int(block), on): value}
