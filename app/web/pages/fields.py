"""Field: chart, advice with its reasons, ledger, events."""

import secrets
from datetime import date, timedelta
from typing import Annotated

from fastapi import APIRouter, HTTPException, Query, Request, Response
from fastapi.responses import RedirectResponse, StreamingResponse

from app import wording
from app.storage import pages as store
from app.storage import pages_field as store_field
from app.storage.database import Database
from app.storage.pages_field import BlockRow
from app.storage.seen import seen_since
from app.web import field_view as view
from app.web import seen_view
from app.web.access import AsViewer, Viewer
from app.web.balance_view import crop_balance
from app.web.closing_view import closing_words
from app.web.measured import compare
from app.web.needs import AsDatabase, AsKey, AsToday
from app.web.problems import RefusedError
from app.web.render import page
from app.workflows.both_ways import both_ways
from app.workflows.closing_water import closing_water
from app.workflows.managed import managed
from app.workflows.measuring_saved import MEASURED_RUNGS, measuring_saved

router = APIRouter()
ENTRIES_SHOWN = 30
NO_FIELD = "There is no such field, or it is not on your farm."


@router.get("/fields/{key}")
def field(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    block: str = "",
    season: Annotated[str, Query(max_length=10)] = "",
    entries: Annotated[str, Query(max_length=10)] = "",
) -> Response:
    """One field: what to do, why, and the whole ledger behind it."""
    return show(
        request, db, viewer, today, key, block, season == "whole", every_entry=entries == "all"
    )


def show(
    request: Request,
    db: Database,
    viewer: Viewer,
    today: date,
    key: str,
    block_key: str = "",
    whole: bool = False,
    error: str = "",
    typed: dict[str, str] | None = None,
    every_entry: bool = False,
    refused: str = "Not logged.",
) -> Response:
    """The Field page; with an error over its forms, and what was typed still in them."""
    blocks = own_blocks(db, viewer, key)
    with db.read() as session:
        morning = store.last_morning(session, today)
        rounds = store.rounds_rows(session, morning, viewer.farms, key)
        chosen = choose(blocks, block_key or managed(rounds).block_key)
        season = store_field.season_at(session, chosen.id, today)
        first = view.first_ledger_day(season, today, whole)
        ledger = store_field.ledger_days(session, chosen.id, first) if season else []
        advice = store_field.last_advice(session, chosen.id, today) if season else None
        closes = closing_water(session, chosen.id, today) if advice else None
        past = store_field.past_advice(session, chosen.id, today)
        unconfirmed = both_ways(session, chosen.id, today)
        events = store.events_since(
            session,
            season.planting - timedelta(days=60) if season else today - timedelta(days=365),
            [chosen.id],
        )
        sums = store_field.season_sums(session, season.id) if season else None
        noticed = seen_since(
            session, [chosen.id], season.planting if season else today - timedelta(days=365)
        )
        shifts = (
            store_field.ledger_days(session, chosen.id, season.planting)
            if season is not None and any(row.correction_mm for row in noticed)
            else []
        )
        sources = store.current(store.sources(session, today, viewer.farms))
        stations = store.stations(session)
        energy = sources.get((chosen.field_id, "energy"))
        station_days = (
            store_field.station_days(
                session, [energy.station_id], season.planting, today - timedelta(days=1)
            )
            if energy is not None and season is not None
            else []
        )
        height = {item.id: item.details.get("elevation_m", 0.0) for item in stations}
        stands_in = {item.id: item.details.get("stands_in") for item in stations}
        et = (
            [
                (row["day"], row["et_actual_mm"])
                for row in store_field.ledger_days(session, chosen.id, season.planting)
            ]
            if season is not None and key in stands_in.values()
            else []
        )
        saved = (
            measuring_saved(
                session, energy.station_id, height.get(energy.station_id, 0.0), today, field=key
            ).fields
            if energy is not None and any(day["rung"] in MEASURED_RUNGS for day in station_days)
            else ()
        )
    if advice is not None and season is not None and advice["season_id"] != season.id:
        advice = None
    over_crop = (
        station_days if energy is not None and stands_in.get(energy.station_id) == key else []
    )
    return page(
        request,
        "pages/field.html",
        422 if error else 200,
        today=today,
        yesterday=today - timedelta(days=1),
        block=chosen,
        blocks=blocks if len(blocks) > 1 else [],
        standings={row.block_key: row.standing or "none" for row in rounds},
        managed_by=managed(rounds).block_key,
        title=view.title(chosen, season, today),
        season=season,
        decision=view.decided(rounds, chosen.key, today),
        may_decide=viewer.may("POST", "/fields/{key}/decision"),
        order=view.order(advice, today, {item.key: item.name for item in stations}),
        bar=view.bar_of(advice) if advice else None,
        advice=advice,
        facts=view.facts(advice, chosen, season, today),
        closing=closing_words(closes, today) if closes else None,
        chart=view.chart(ledger, advice, whole),
        ahead=view.ahead_rows(advice),
        ledger=list(reversed(ledger if whole else ledger[-view.LEDGER_DAYS :])),
        whole=whole,
        past=past,
        unconfirmed=unconfirmed,
        near_day=wording.near_day,
        events=events if every_entry else events[:ENTRIES_SHOWN],
        earlier=0 if every_entry else max(len(events) - ENTRIES_SHOWN, 0),
        so_far=view.season_so_far(sums, season),
        intake_warning=view.intake_words(chosen),
        seen=[seen_view.worded(row) for row in noticed],
        suspicion=seen_view.suspicion_words(shifts),
        seen_words={
            "methods": seen_view.METHODS,
            "trusts": seen_view.TRUSTS,
            "stages": seen_view.STAGES,
            "depths": seen_view.DEPTHS,
        },
        units=wording.UNITS,
        unit_choices=wording.UNIT_CHOICES,
        log_units=[*wording.UNIT_CHOICES.items(), ("rain_mm", wording.OWN_GAUGE)],
        purposes=wording.PURPOSES,
        confirmations=wording.CONFIRMATIONS,
        variables=wording.VARIABLES,
        sources=[row for (number, _), row in sources.items() if number == chosen.field_id],
        energy=energy,
        compared=compare(station_days, height.get(energy.station_id, 0.0)) if energy else None,
        saved=saved[0] if saved else None,
        balance=crop_balance(over_crop, et) if over_crop else None,
        soil=view.soil_rows(chosen.soil),
        season_facts=view.season_facts(season, noticed),
        token=secrets.token_urlsafe(12),
        error=error,
        refused=refused,
        typed={"day": str(today - timedelta(days=1)), "amount": "", "unit": "hours", "note": ""}
        | (typed or {}),
    )


def own_blocks(db: Database, viewer: Viewer, key: str) -> list[BlockRow]:
    """The blocks of a field the viewer may see; 404 otherwise."""
    with db.read() as session:
        blocks = store_field.field_blocks(session, key, viewer.farms)
    if not blocks:
        raise HTTPException(404, NO_FIELD)
    return blocks


def choose(blocks: list[BlockRow], key: str) -> BlockRow:
    """The block of a key; 404 when the field has none of that key."""
    for block in blocks:
        if block.key == key:
            return block
    raise HTTPException(404, "This field has no such block.")


def own_event(db: Database, viewer: Viewer, key: str, event_id: int) -> None:
    """404 unless the event is of this field and the field is the viewer's."""
    own_blocks(db, viewer, key)
    with db.read() as session:
        if store_field.event_owner(session, event_id) != key:
            raise HTTPException(404, "There is no such entry on this field.")


def said(error: Exception) -> str:
    """An error of a form in one line, with its remedy."""
    if isinstance(error, RefusedError):
        return f"{error.says} {error.remedy}".strip()
    text = str(error)
    return text[:1].upper() + text[1:] + "."


def back(key: str, block: str = "") -> Response:
    """Back to the field's events."""
    query = f"?block={block}" if block else ""
    return RedirectResponse(f"/fields/{key}{query}#events", status_code=303)


@router.get("/fields/{key}/ledger.csv")
def ledger_file(db: AsDatabase, viewer: AsViewer, key: AsKey, block: str = "") -> Response:
    """The ledger as CSV, the caution in its header."""
    from app.workflows.export import ledger_csv

    blocks = own_blocks(db, viewer, key)
    if block:
        choose(blocks, block)
    return csv_answer(ledger_csv(db, key, block or None), f"ledger-{key}.csv")


def csv_answer(lines: object, name: str) -> StreamingResponse:
    """A CSV file to be saved."""
    return StreamingResponse(
        lines,  # type: ignore[arg-type]
        media_type="text/csv; charset=utf-8",
        headers={"Content-Disposition": f'attachment; filename="{name}"'},
    )


@router.get("/advice.csv")
def advice_file(db: AsDatabase, viewer: AsViewer, today: AsToday) -> Response:
    """The morning's advice as CSV."""
    from app.workflows.export import advice_csv

    with db.read() as session:
        morning = store.last_morning(session, today) or today
    return csv_answer(advice_csv(db, morning, viewer.farms), f"advice-{morning}.csv")
