"""Stations: their days, rungs, checks, and measured against modelled energy."""

import secrets
from datetime import date, timedelta
from typing import Annotated

from fastapi import APIRouter, HTTPException, Query, Request, Response

from app import wording
from app.intake import unpack
from app.storage import pages as store
from app.storage import pages_field as store_field
from app.storage import pages_station as store_station
from app.storage.database import Database
from app.web import station_view as view
from app.web.access import AsViewer, Viewer
from app.web.balance_view import crop_balance, et_by_residual
from app.web.charts import energy_chart
from app.web.measured import by_month, by_season, compare
from app.web.needs import AsDatabase, AsDay, AsKey, AsToday
from app.web.pages.fields import csv_answer
from app.web.render import page
from app.web.sensor_words import verdicts
from app.web.station_watch import watch
from app.web.station_words import said_of
from app.web.trouble import troubles
from app.workflows.measuring_saved import measuring_saved
from app.workflows.sensor_health import sensor_health

router = APIRouter()
SPANS = {"month": 30, "season": 120, "year": 366}
RECENT_DAYS = 30
NOTHING_TYPED = dict.fromkeys(
    [
        "quantity",
        "first",
        "last",
        "from_time",
        "to_time",
        "verdict",
        "why",
        "day",
        "kind",
        "sensor",
        "factor",
        "note",
    ],
    "",
)


def own_stations(db: Database, viewer: Viewer, today: date) -> list[store.StationRow]:
    """The stations a viewer may see: every one, those that feed their farms, a logger's own."""
    with db.read() as session:
        stations = store.stations(session)
        if viewer.farms is None:
            return stations
        if viewer.station is not None:
            return [station for station in stations if station.key == viewer.station]
        fed = {row.station_id for row in store.sources(session, today, viewer.farms)}
    return [station for station in stations if station.id in fed]


def own_station(db: Database, viewer: Viewer, today: date, key: str) -> store.StationRow:
    """One of them by key; 404 otherwise."""
    for station in own_stations(db, viewer, today):
        if station.key == key:
            return station
    raise HTTPException(404, "There is no such station, or it feeds none of your fields.")


@router.get("/stations")
def stations(request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday) -> Response:
    """Every station, its last data and its rungs."""
    shown = own_stations(db, viewer, today)
    with db.read() as session:
        spans = store_station.spans(session)
        counts = store_station.rung_counts(session, today - timedelta(days=RECENT_DAYS))
        last = store.last_days(session)
        recent = store.recent_days(session, today)
        energy = store.current(store.sources(session, today, viewer.farms, "energy"))
    fields: dict[int, int] = {}
    for source in energy.values():
        fields[source.station_id] = fields.get(source.station_id, 0) + 1
    trouble = {item.key: item for item in troubles(shown, recent, last, fields, today)}
    return page(
        request,
        "pages/stations.html",
        stations=[
            {
                "key": station.key,
                "name": station.name,
                "place": view.place(station.details),
                "last": last.get(station.id),
                "span": view.span_words(spans.get(station.id)),
                "rungs": view.rung_share(counts.get(station.id, {})),
                "fields": fields.get(station.id, 0),
                "trouble": trouble.get(station.key),
            }
            for station in shown
        ],
    )


@router.get("/stations/{key}")
def station(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    span: Annotated[str, Query(max_length=10)] = "month",
) -> Response:
    """One station: days, rungs and why no better one, measured against modelled, gaps, flags."""
    return show(request, db, viewer, today, key, span)


def show(
    request: Request,
    db: Database,
    viewer: Viewer,
    today: date,
    key: str,
    span: str = "month",
    error: str = "",
    typed: dict[str, str] | None = None,
) -> Response:
    """The station page; with an error over its forms, and what was typed still in them."""
    found = own_station(db, viewer, today, key)
    span = span if span in SPANS else "month"
    first = today - timedelta(days=SPANS[span])
    with db.read() as session:
        days = store_field.station_days(session, [found.id], first, today - timedelta(days=1))
        everything = store_station.spans(session).get(found.id)
        last = store.last_days(session)
        recent = store.recent_days(session, today)
        fed = store_station.fed_fields(session, found.id, today, viewer.farms)
        said = said_of(session, found)
        health = sensor_health(session, found.id, today) if last.get(found.id) else None
        saved = measuring_saved(
            session, found.id, found.details.get("elevation_m", 0.0), today, viewer.farms
        )
        files = store_station.intakes(session, 6, key) if viewer.may("GET", "/intake") else []
    elevation = found.details.get("elevation_m", 0.0)
    compared = compare(days, elevation)
    begins = max(first, everything.first) if everything else first
    trouble = troubles([found], recent, last, {found.id: len(fed)}, today)
    return page(
        request,
        "pages/station.html",
        422 if error else 200,
        station=found,
        today=today,
        place=view.place(found.details),
        everything=view.span_words(everything),
        last=last.get(found.id),
        trouble=trouble[0] if trouble else None,
        span=span,
        spans=SPANS,
        days=list(reversed(days)),
        fed=fed,
        saved=saved,
        compared=compared,
        months=by_month(days, elevation),
        seasons=by_season(days, elevation) if span == "year" else [],
        chart=energy_chart(
            [day["day"] for day in days],
            [day["rn_measured"] for day in days],
            [day["rn_modelled"] for day in days],
            [day["rn"] for day in days],
        ),
        rungs=view.rung_lines(days),
        gaps=view.gaps(days, begins, today - timedelta(days=1)) if everything else [],
        watch=watch(
            [day for day in days if day["day"] >= today - timedelta(days=RECENT_DAYS)], today
        ),
        watched_days=RECENT_DAYS,
        verdicts=verdicts(health) if health else [],
        balance=crop_balance(days),
        put_right=health.since if health else None,
        files=files,
        intake_states=wording.INTAKE_STATES,
        variables=wording.VARIABLES,
        said=said,
        may_say=viewer.may("POST", "/stations/{key}/marks"),
        token=secrets.token_urlsafe(12),
        error=error,
        typed=NOTHING_TYPED | (typed or {}),
    )


@router.get("/stations/{key}/days/{day}")
def station_day(
    request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, day: AsDay
) -> Response:
    """One day of a station, down to its readings, each with its file and line."""
    found = own_station(db, viewer, today, key)
    with db.read() as session:
        days = store_field.station_days(session, [found.id], day, day)
        brought = store_field.brought(session, found.id, day)
    if not days:
        raise HTTPException(404, f"{found.name} has nothing for {wording.full_day(day)}.")
    row = days[0]
    return page(
        request,
        "pages/station_day.html",
        station=found,
        day=day,
        before=day - timedelta(days=1),
        after=day + timedelta(days=1),
        row=row,
        why_not=wording.why_codes(row["why_not"]),
        flags=wording.flag_words(row["flags"]),
        et_by_residual=float(et_by_residual([row])[0]),
        notes=view.notes_words(row["notes"]),
        humidity=wording.HUMIDITY_RUNGS[row["humidity_rung"]],
        no_humidity=wording.higher_rungs(wording.HUMIDITY_RUNGS, row["humidity_rung"]),
        wind=wording.WIND_RUNGS[row["wind_rung"]],
        no_wind=wording.higher_rungs(wording.WIND_RUNGS, row["wind_rung"]),
        readings=view.readings(
            [(item.intake_id, item.file_name, unpack(item.data)) for item in brought],
            found.details.get("utc_offset_h", 0.0),
        ),
    )


@router.get("/stations/{key}/days.csv")
def days_file(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey) -> Response:
    """A station's days as CSV, the caution in its header."""
    from app.workflows.export import station_days_csv

    own_station(db, viewer, today, key)
    return csv_answer(station_days_csv(db, key), f"station-{key}.csv")
