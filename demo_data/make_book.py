"""The book of the demo basin: its parts, its seasons, and the water its growers put on."""

import zlib
from copy import deepcopy
from dataclasses import replace
from datetime import date, timedelta
from typing import Any

import make_tables as tables
import numpy as np
from make_crops import CROPS
from make_fields import BLOCKS, GROWERS, KEEP_OFFS, MANAGED_BY, SOURCES, FieldRow, field_rows
from make_growers import Grower, aimed, season_end
from make_water import Days, mixed, station_days
from make_weather import Weather

MEASURES = {"tarrow-north": "four components", "ferrin-bench": "solar", "sand-lane": "temperature"}
RECORD = date(2025, 3, 1)
STARTED = "2025-03-20"


def season_of(field: str, name: str, year: int) -> dict[str, Any]:
    """A crop's season on a field in a year, planted within a few days of the usual date."""
    crop = deepcopy(CROPS[name])
    when = crop["planting"]
    before = when.startswith("since-")
    usual = date.fromisoformat(f"{year - 1}-{when[6:]}" if before else f"{year}-{when}")
    rng = np.random.default_rng(zlib.crc32(f"{field} {name} {year}".encode()))
    planting = usual + timedelta(int(rng.integers(-4, 6)))
    season = {"field": field, **crop, "planting": planting.isoformat()}
    if planting < RECORD:
        season |= {"ledger_start": STARTED, "initial_depletion_fraction": 0.25}
    elif name in {"wheat", "bean", "silage"}:
        season["initial_depletion_fraction"] = round(float(rng.uniform(0.1, 0.35)), 2)
    return season


def field_of(row: FieldRow) -> dict[str, Any]:
    """A field of the book."""
    field: dict[str, Any] = {
        "key": row.key,
        "name": row.name,
        "farm": row.farm,
        "area_ha": row.area,
        "station": GROWERS[row.farm]["station"],
        "soil": row.soil,
        "system": row.system,
    }
    if row.key in SOURCES:
        field["sources"] = SOURCES[row.key]
    if row.key in BLOCKS:
        field |= {"blocks": BLOCKS[row.key], "managed_by": MANAGED_BY[row.key]}
    spans = list(KEEP_OFFS.get(row.key, []))
    for year, crop in (("2025", row.crop_2025), ("2026", row.crop_2026)):
        if crop == "alfalfa":
            spans += [span for span in KEEP_OFFS["alfalfa"] if span[0].startswith(year)]
    if spans:
        names = ("first", "last", "why")
        field["keep_offs"] = [dict(zip(names, span, strict=True)) for span in sorted(spans)]
    return field


def weather_of(
    field: dict[str, Any], days: dict[str, Days], gauges: list[dict[str, Any]], today: date
) -> Days:
    """A field's days from its stations and its own gauge, and dry days like the last ones ahead."""
    stations = dict.fromkeys(("temperature", "energy", "wind", "rain"), field["station"])
    stations |= {s["variable"]: s["station"] for s in field.get("sources", [])}
    own = days[field["station"]]
    if len(set(stations.values())) > 1:
        own = mixed(*(days[station] for station in stations.values()))
    own = replace(own, rain=own.rain.copy(), slope=[], today=[])
    for gauge in gauges:
        if gauge["field"] == field["key"]:
            own.rain[own.at(date.fromisoformat(gauge["day"]))] = gauge["rain_mm"]
    return own.ahead(today)


def days_seen(weather: list[Weather], stuck: dict[str, list[tuple[str, str]]]) -> dict[str, Days]:
    """Every station's days, with 2 m/s where its anemometer was stuck."""
    days = {}
    for record in weather:
        own = station_days(record, MEASURES[record.place.key])
        for first, last in stuck.get(record.place.key, []):
            a, b = (own.at(date.fromisoformat(day[:10])) for day in (first, last))
            own.u2[a : b + 1] = 2.0
        own = replace(own, eto=own.reference_et(), slope=[], today=[])
        days[record.place.key] = own
    return days


def make_book(
    weather: list[Weather], knobs: dict[str, Any], stuck: dict[str, list[tuple[str, str]]]
) -> tuple[dict[str, Any], list[str]]:
    """The whole book, and a line for each field on where it stands today."""
    today = date.fromisoformat(knobs["today"])
    days = days_seen(weather, stuck)
    book: dict[str, Any] = {
        "stations": tables.STATIONS,
        "soils": tables.SOILS,
        "systems": tables.SYSTEMS,
        "farms": tables.FARMS,
        "fields": [],
        "supplies": tables.SUPPLIES,
        "seasons": [],
    }
    irrigations = list(knobs["other_irrigations"])
    report = []
    for row in field_rows():
        field = field_of(row)
        book["fields"].append(field)
        seen = weather_of(field, days, knobs["gauges"], today)
        for year, crop in ((2025, row.crop_2025), (2026, row.crop_2026)):
            season = season_of(row.key, crop, year)
            book["seasons"].append(season)
            running = season["planting"] <= knobs["today"] <= season_end(season).isoformat()
            aim = knobs["aims"].get(row.aim) if running else None
            watered = aimed(Grower(field, season, book, seen, row.entered), today, aim)
            irrigations += watered.events
            if running:
                report.append(
                    f"{row.key:15} {crop:12} aim {row.aim:5} {watered.standing:5} "
                    f"depletion {watered.depletion:5.1f} of {watered.limit:5.1f} mm, passes it on "
                    f"day {watered.left:2}, {len(watered.events)} irrigations, last "
                    f"{watered.events[-1]['day'] if watered.events else 'never'}"
                )
    book["irrigations"] = sorted(irrigations, key=lambda e: (e["day"], e["field"]))
    book["rain"] = knobs["gauges"]
    return book, report
