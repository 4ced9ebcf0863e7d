"""Bring station days up to date from their readings: only what is dirty, from its first dirty day.

A day rests on its own readings as people have judged them, on the station's own days before it
(the taught model, the usual for the date), and on what neighbours measured that day. A change is
therefore felt by the station from a few days before its first changed day on, and by neighbours
that lack what it measures.
"""

from collections.abc import Iterator
from dataclasses import replace
from datetime import date, timedelta
from typing import Any

import numpy as np
from sqlalchemy import select, update
from sqlalchemy.orm import Session

from app.intake import SHAPE, Clock, DayNote, Rows, aggregate, hours_of, watched
from app.science.energy.day_checks import REACH_DAYS
from app.science.energy.hourly import hourly_days
from app.science.energy.net_sensor import WindFactor, net_corrected_for_wind
from app.science.energy.records import DailyWeather, StationDays
from app.science.energy.station_day import station_days
from app.science.energy.taught import lessons, teach
from app.science.energy.usual import Usual, usual_for_date
from app.storage import book, judgement
from app.storage.records import Record, needs_neighbours, read_record
from app.storage.series import days_with_rows, numbers, replace_station_days
from app.storage.tables import Station
from app.workflows import agronomy
from app.workflows.compare import stored_rows
from app.workflows.hourly_step import BY_STEP, Steps, hourly
from app.workflows.judged import judged
from app.workflows.neighbourhood import Neighbourhood

REACH = timedelta(days=max(1, REACH_DAYS))
"""How far a change of readings is felt to either side: by checks, and by gaps over midnight."""
DAYS_AT_A_TIME = timedelta(days=62)
MEASURED = (
    "tmean",
    "rh_max",
    "rh_min",
    "shortwave_down",
    "shortwave_up",
    "longwave_down",
    "longwave_up",
    "soil_heat_flux",
    "sensible_heat",
    "latent_heat",
)
OPEN_SKY = 0.85
"""Clear-sky ratio of the neighbours' day from which the sky of its morning was open (working
value): a longwave window that then read like a black body was covered."""
ASSUMED_WIND = 2.0
"""m/s at a net sensor where wind was not measured (the methods page, wind)."""
COMPUTED = (
    "tmax",
    "tmin",
    "vapour_pressure",
    "wind_2m",
    "rain",
    "rs",
    "rso",
    "ra",
    "rn",
    "rn_uncertainty",
    "rn_measured",
    "rn_modelled",
    "rh_min_used",
    "eto",
    "etr",
    "eto_uncertainty",
)


def recompute_stations(session: Session) -> int:
    """Recompute the days of dirty stations and of those that lean on them; returns days written.

    The blocks that hang on a recomputed station are marked as dirty.
    """
    every = session.execute(
        select(Station.id, Station.details, Station.dirty_from).order_by(Station.id)
    ).all()
    dirty = {
        number: max(since, book.BEGINNING + REACH) - REACH
        for number, _, since in every
        if since is not None
    }
    if not dirty:
        return 0
    around = Neighbourhood({number: details for number, details, _ in every})
    written = 0
    changed: dict[int, date] = {}
    # Own readings first, then what leans on neighbours' measured sun and wind, then what was
    # taught: none of the later moves what the earlier rest on, so that the order is enough.
    for find in (
        lambda: dirty,
        lambda: _near(session, around, dirty),
        lambda: _pupils(around, changed),
    ):
        for number, first in find().items():
            written += _recompute(session, around, number, first)
            changed[number] = min(first, changed.get(number, first))
    session.execute(update(Station).where(Station.id.in_(dirty)).values(dirty_from=None))
    return written


def _near(session: Session, around: Neighbourhood, changed: dict[int, date]) -> dict[int, date]:
    """Stations that rest on what changed ones measured, as neighbours, and since when."""
    since: dict[int, date] = {}
    for number in around.details:
        near = [changed[other] for other in around.of(number) if other in changed]
        if near and needs_neighbours(session, [number], min(near)):
            since[number] = min(near)
    return since


def _pupils(around: Neighbourhood, changed: dict[int, date]) -> dict[int, date]:
    """Stations whose model a changed one teaches, and since when."""
    teachers = {number: around.teacher(number) for number in around.details}
    return {
        number: changed[teacher]
        for number, teacher in teachers.items()
        if teacher is not None and teacher in changed
    }


def _recompute(session: Session, around: Neighbourhood, station: int, first: date) -> int:
    rows = list(_days(session, around, station, first))
    book.dirty_blocks(session, book.station_blocks(session, station), first)
    return replace_station_days(session, station, first, rows)


def _days(
    session: Session, around: Neighbourhood, station: int, since: date
) -> Iterator[dict[str, Any]]:
    """Rows of station_day from `since`, or the first readings after it, to the last readings."""
    span = days_with_rows(session, station, since)
    if span is None:
        return
    details = around.details[station]
    site, clock = agronomy.site(details), Clock(details["utc_offset_h"], details["time_zone"])
    marks, log = judgement.marks(session, station), judgement.sensor_log(session, station)
    past = read_record(session, station, before=span[0])
    steps = Steps.before(session, station, span[0]) if hourly(details) else None
    teacher = around.teacher(station)
    taught_by = None if teacher is None else read_record(session, teacher)
    first, last = span
    while first <= last:
        until = min(first + DAYS_AT_A_TIME, last)
        stored = stored_rows(session, station, first - 2 * REACH, until + 2 * REACH)
        one = judged(stored, marks, log, clock)
        days = np.datetime64(first - REACH) + np.arange((until - first + 2 * REACH).days + 1)
        rows = _net_for_wind(one.rows, agronomy.net_wind(details))
        ratio, wind = around.measured(session, station, days)
        seen = watched(rows, site, days, details.get("surface"), ratio >= OPEN_SKY)
        weather, notes = aggregate(seen.rows, site, days, one.good)
        said = one.marks_of_days(days, clock)
        plain = station_days(site, weather, watched=seen.findings, marks=said)
        inside = (days >= np.datetime64(first)) & (days <= np.datetime64(until))
        past = past.joined(_as_record(weather, plain, inside))
        taught = teach(days, _lessons(past))
        if taught_by is not None:
            taught = taught.or_else(teach(days, _lessons(taught_by), teacher=True))
        computed = station_days(
            site,
            weather,
            taught=taught,
            neighbour_ratio=ratio,
            neighbour_wind=wind,
            usual=_usual(past, days),
            rn_widening=seen.widening,
            watched=seen.findings,
            marks=said,
        )
        told = _station_rows(station, weather, computed, seen.shape, [*notes, *one.notes])
        if steps is not None:
            hours = hours_of(seen.rows, site, days, one.good)
            by_hour = hourly_days(
                site,
                hours,
                day_rung=computed.rung,
                day_rn=computed.rn,
                day_wind_2m=computed.wind_2m,
                day_vapour_pressure=computed.vapour_pressure,
            )
            steps = steps.stepped(told, by_hour, inside)
        for row in told:
            if first <= row["day"] <= until:
                yield row
        first = until + timedelta(days=1)


def _as_record(weather: DailyWeather, days: StationDays, inside: Any) -> Record:
    """The computed days of a window as a record to learn from."""
    found = {name: getattr(weather, name) for name in ("shortwave_down", "shortwave_up")}
    for name in ("tmax", "tmin", "vapour_pressure", "rn_measured", "rn_modelled"):
        found[name] = getattr(days, name)
    for name in ("rs", "rso", "wind_2m"):
        found[name] = getattr(days, name)
    return Record(
        days.date[inside],
        days.rung[inside],
        days.wind_rung[inside],
        {name: values[inside] for name, values in found.items()},
    )


def _lessons(record: Record) -> Any:
    values = record.values
    return lessons(
        record.date,
        values["shortwave_down"],
        values["shortwave_up"],
        values["tmax"],
        values["rn_measured"],
        values["rn_modelled"],
    )


def _usual(record: Record, days: Any) -> Usual:
    values = record.values
    return Usual(
        ratio=usual_for_date(days, record.date, record.clear_sky_ratio),
        tmax=usual_for_date(days, record.date, values["tmax"]),
        tmin=usual_for_date(days, record.date, values["tmin"]),
        vapour_pressure=usual_for_date(days, record.date, values["vapour_pressure"]),
    )


def _net_for_wind(rows: Rows, factors: tuple[WindFactor, WindFactor] | None) -> Rows:
    """Rows with their net radiation corrected for wind as the sensor's certificate states."""
    if factors is None or "net_radiation" not in rows.values:
        return rows
    wind = rows.values.get("wind_speed", np.full(len(rows), np.nan))
    wind = np.where(np.isnan(wind), ASSUMED_WIND, wind)
    net = net_corrected_for_wind(rows.values["net_radiation"], wind, *factors)
    return replace(rows, values={**rows.values, "net_radiation": net})


def _net_radiation(weather: DailyWeather) -> Any:
    """Net radiation over whatever lies under the sensors: components, else a net sensor."""
    components = weather.shortwave_down - weather.shortwave_up
    components = components + weather.longwave_down - weather.longwave_up
    return np.where(np.isnan(components), weather.net_radiation, components)


def _station_rows(
    station: int,
    weather: DailyWeather,
    days: StationDays,
    shape: dict[str, Any],
    notes: list[DayNote],
) -> list[dict[str, Any]]:
    columns = {name: numbers(getattr(weather, name)) for name in MEASURED}
    columns |= {name: numbers(getattr(days, name)) for name in COMPUTED}
    columns |= {name: numbers(shape[name]) for name in SHAPE}
    columns["net_radiation"] = numbers(_net_radiation(weather))
    columns |= {name: [None] * days.date.size for name in BY_STEP}
    words: dict[date, list[str]] = {}
    for note in notes:
        words.setdefault(note.day, []).append(
            f"{note.quantity}:{note.what}:{note.figure:g}:{note.reason}"
        )
    return [
        {
            "station_id": station,
            "day": day,
            "rung": int(days.rung[place]),
            "why_not": str(days.why_not[place]),
            "humidity_rung": int(days.humidity_rung[place]),
            "wind_rung": int(days.wind_rung[place]),
            "flags": str(days.flags[place]),
            "notes": "\n".join(words.get(day, [])),
            **{name: values[place] for name, values in columns.items()},
        }
        for place, day in enumerate(days.date.tolist())
    ]
