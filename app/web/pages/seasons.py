"""What is planted on a field: put a season in, or change one."""

from collections.abc import Mapping
from datetime import date
from typing import Annotated, Any

from fastapi import APIRouter, Form, Query, Request, Response
from fastapi.responses import RedirectResponse

from app import handbook
from app.storage import pages_field as store_field
from app.storage.database import Database
from app.storage.tables import WHOLE
from app.web.access import AsViewer, Viewer
from app.web.crops import crop_name
from app.web.needs import AsDatabase, AsKey, AsToday, Clean, read_day, read_number
from app.web.pages.fields import choose, own_blocks, said
from app.web.problems import RefusedError
from app.web.render import page
from app.workflows.once import EntryError

router = APIRouter()
Text = Annotated[Clean, Form(max_length=200)]
DEPTHS = {"refill_to_mm": "depletion to leave", "rain_room_mm": "room for rain"}
SHARES = {
    "mad": "MAD",
    "initial_depletion_fraction": "depletion at the start",
    "allowed_at_maturity": "depletion allowed at maturity",
}
METRES = {"root_depth_min_m": "least root depth", "root_depth_max_m": "greatest root depth"}
DATES = {"end": "last day", "ledger_start": "first day of the ledger"}
FOURS = {
    "mad_by_stage": "MAD by stage",
    "refill_to_by_stage": "depletion to leave by stage",
    "et_target_by_stage": "share of crop ET by stage",
    "floor_by_stage": "most depletion to leave by stage",
}
NAMES = (
    "block", "was", "crop", "planting", "end", "coefficients", "stage_days", "mad", "mad_by_stage",
    "root_depth_min_m", "root_depth_max_m", "ledger_start", "initial_depletion_fraction",
    "refill_to_mm", "rain_room_mm", "allowed_at_maturity",
    "refill_to_by_stage", "et_target_by_stage", "floor_by_stage", "note",
)  # fmt: skip


@router.get("/fields/{key}/seasons")
def seasons(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    block: Annotated[Clean, Query(max_length=80)] = "",
    planting: Annotated[Clean, Query(max_length=10)] = "",
) -> Response:
    """The field's seasons, and a form for a new one or for the one planted on `planting`."""
    return shown(request, db, viewer, today, key, block, planting, None)


def shown(
    request: Request,
    db: Database,
    viewer: Viewer,
    today: date,
    key: str,
    block: str,
    planting: str,
    typed: Mapping[str, str] | None,
    error: str = "",
) -> Response:
    """The page; with what was typed, and what is wrong with it."""
    blocks = own_blocks(db, viewer, key)
    chosen = choose(blocks, block or blocks[0].key)
    with db.read() as session:
        rows = store_field.seasons_of_block(session, chosen.id)
    kept = next((row for row in rows if str(row.planting) == planting), None)
    if typed is None:
        typed = _written(kept.details if kept else {}, planting if kept else "")
    return page(
        request,
        "pages/seasons.html",
        422 if error else 200,
        block=chosen,
        blocks=blocks if len(blocks) > 1 else [],
        seasons=[
            (
                row.planting,
                (row.details.get("own_crop") or {}).get("name") or crop_name(row.crop, whole=True),
                row.details.get("end"),
                row.details.get("note") or "",
            )
            for row in rows
        ],
        crops=sorted(
            ((row.crop_id, row.crop_name) for row in handbook.crops().values()),
            key=lambda crop: crop[1].casefold(),
        ),
        typed=dict.fromkeys(NAMES, "") | {"coefficients": "dual", "block": block} | dict(typed),
        error=error,
        today=today,
    )


@router.post("/fields/{key}/seasons")
def put(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    block: Text = "",
    was: Text = "",
    crop: Text = "",
    planting: Text = "",
    end: Text = "",
    coefficients: Text = "dual",
    stage_days: Text = "",
    mad: Text = "",
    mad_by_stage: Text = "",
    root_depth_min_m: Text = "",
    root_depth_max_m: Text = "",
    ledger_start: Text = "",
    initial_depletion_fraction: Text = "",
    refill_to_mm: Text = "",
    rain_room_mm: Text = "",
    allowed_at_maturity: Text = "",
    refill_to_by_stage: Text = "",
    et_target_by_stage: Text = "",
    floor_by_stage: Text = "",
    note: Text = "",
) -> Response:
    """Plant, or change a season; ledgers and advice follow at once."""
    from app.workflows.plant import plant

    blocks = own_blocks(db, viewer, key)
    values = locals()
    typed = {name: values[name] for name in NAMES}
    try:
        on = None
        if block and block != WHOLE:
            on = choose(blocks, block).key
        told = _told(typed)
        plant(db, key, on, told, read_day(was, "the season") if was else None, viewer.who, today)
    except (EntryError, RefusedError) as error:
        return shown(request, db, viewer, today, key, block, was, typed, said(error))
    return RedirectResponse(f"/fields/{key}" + (f"?block={on}" if on else ""), status_code=303)


def _told(typed: Mapping[str, str]) -> dict[str, Any]:
    """The form as a season of the book: what is left empty is the handbook's or the default."""

    def number(name: str, label: str) -> float | None:
        return read_number(typed[name].rstrip("% "), label) if typed[name].strip() else None

    told: dict[str, Any] = {
        "crop": typed["crop"],
        "planting": read_day(typed["planting"], "the planting day"),
        "coefficients": typed["coefficients"],
        "note": typed["note"].strip() or None,
        "stage_days": _four(typed["stage_days"], "the stage lengths"),
        **{name: _four(typed[name], label, 100) for name, label in FOURS.items()},
    }
    for name, label in DATES.items():
        told[name] = read_day(typed[name], label) if typed[name].strip() else None
    for name, label in METRES.items():
        told[name] = number(name, label)
    for name, label in DEPTHS.items():
        told[name] = number(name, label) or 0
    for name, label in SHARES.items():
        value = number(name, label)
        told[name] = None if value is None else value / 100
    if told["initial_depletion_fraction"] is not None:
        told["initial_depletion_mm"] = None
    return told


def _four(text: str, label: str, over: int = 1) -> list[float | None] | None:
    """Four figures, one a stage, apart by spaces or semicolons; a dash leaves one out."""
    parts = text.replace(";", " ").split()
    if not parts:
        return None
    if len(parts) != 4:
        raise RefusedError(
            f"{label} has {len(parts)} figures.", label, text, "Write four, one for each stage."
        )
    found = [None if part in "-–" else read_number(part, label) / over for part in parts]
    return [None if one is None else one if one % 1 else int(one) for one in found]


def _written(details: Mapping[str, Any], planting: str) -> dict[str, str]:
    """A season as the form shows it."""

    def plain(value: float | None, times: int = 1) -> str:
        return "" if value is None else f"{round(value * times, 6):g}"

    shares = [*SHARES]
    return {
        "was": planting,
        "planting": planting,
        "crop": details.get("crop", ""),
        "coefficients": details.get("coefficients", "dual"),
        "note": details.get("note") or "",
        "stage_days": " ".join(plain(n) for n in details.get("stage_days") or ()),
        **{
            name: " ".join("-" if n is None else plain(n, 100) for n in details.get(name) or ())
            for name in FOURS
        },
        **{name: details.get(name) or "" for name in DATES},
        **{name: plain(details.get(name)) for name in METRES},
        **{name: plain(details.get(name) or None) for name in DEPTHS},
        **{name: plain(details.get(name), 100) for name in shares},
    }
