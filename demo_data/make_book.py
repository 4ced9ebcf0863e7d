"""The book of the demo basin: parts, seasons, and the water the invented growers put on."""

import zlib
from copy import deepcopy
from dataclasses import dataclass, replace
from datetime import date, timedelta
from typing import Any

import make_tables as tables
import numpy as np
from make_water import Days, Root, crop_of, mixed, soil_of, stretch, table
from make_weather import Weather

MEASURES = {"tarrow-north": "four components", "ferrin-bench": "solar", "sand-lane": "temperature"}


@dataclass
class Watered:
    """One season's irrigations and where its blocks stood each morning."""

    events: list[dict[str, Any]]
    depletion: float
    limit: float
    left: int  # the limit is passed by the close of this day, today being 1; 0: it is passed

    @property
    def standing(self) -> str:
        """A guess at where the field stands: systems that cover a field in more than a day start earlier."""
        if self.left == 0:
            return "late"
        if self.depletion <= 0:
            return "wet"
        return "due" if self.left <= 2 else "soon" if self.left <= 5 else "easy"


def seasons_of(field: str, name: str, year: int) -> dict[str, Any]:
    """The season of a crop of the tables on a field in a year."""
    season = deepcopy(tables.CROPS[name])
    when = season["planting"]
    planting = date.fromisoformat(
        f"{year - 1}-{when[6:]}" if when.startswith("since-") else f"{year}-{when}"
    )
    rng = np.random.default_rng(zlib.crc32(f"{field} {name} {year}".encode()))
    planting += timedelta(int(rng.integers(-4, 6)))
    season["planting"] = planting.isoformat()
    season = {"field": field, **season}
    if planting < date(2025, 3, 1):
        season["ledger_start"] = "2025-03-20"
        season["initial_depletion_fraction"] = 0.25
    elif name in {"wheat", "bean", "silage"}:
        season["initial_depletion_fraction"] = round(float(rng.uniform(0.1, 0.35)), 2)
    return season


def part_of_book(knobs: dict[str, Any]) -> dict[str, Any]:
    """The book without its irrigations."""
    fields, seasons = [], []
    for farm, grower in tables.GROWERS.items():
        for key, name, area, soil, system, _, before, now, _ in grower["fields"]:
            part: dict[str, Any] = {
                "key": key,
                "name": name,
                "farm": farm,
                "area_ha": area,
                "station": grower["station"],
                "soil": soil,
                "system": system,
            }
            if key in tables.SOURCES:
                part["sources"] = tables.SOURCES[key]
            if key in tables.BLOCKS:
                part["blocks"] = tables.BLOCKS[key]
                part["managed_by"] = tables.MANAGED_BY[key]
            spans = tables.KEEP_OFFS.get(key, [])
            for year, crop in (("2025", before), ("2026", now)):
                if crop == "alfalfa":
                    spans = spans + [s for s in tables.KEEP_OFFS["alfalfa"] if s[0][:4] == year]
            if spans:
                part["keep_offs"] = [
                    {"first": a, "last": b, "why": why} for a, b, why in sorted(spans)
                ]
            fields.append(part)
            seasons += [seasons_of(key, before, 2025), seasons_of(key, now, 2026)]
    return {
        "stations": tables.STATIONS,
        "soils": tables.SOILS,
        "systems": tables.SYSTEMS,
        "farms": tables.FARMS,
        "fields": fields,
        "seasons": seasons,
    }


def season_end(season: dict[str, Any]) -> date:
    """The last day of a season."""
    return date.fromisoformat(season["planting"]) + timedelta(sum(season["stage_days"]) - 1)


class Grower:
    """Waters one field through one season the way its grower does."""

    def __init__(
        self,
        field: dict[str, Any],
        season: dict[str, Any],
        book: dict[str, Any],
        days: Days,
        how: str,
        habits: dict[str, Any],
    ) -> None:
        self.field, self.season, self.how, self.habits = field, season, how, habits
        self.days = days
        crops, soils = table("crops.csv", "crop_id"), table("soils.csv", "texture_id")
        wetting = table("wetting.csv", "method_id")
        self.system = next(s for s in book["systems"] if s["key"] == field["system"])
        by_key = {s["key"]: s for s in book["soils"]}
        share = self.system.get("root_wetted_fraction", 1.0)
        blocks = field.get("blocks") or [{}]
        blocks = [b for b in blocks if b and b["key"] == field["managed_by"]] or blocks
        self.roots = [
            Root(
                crop_of(season, crops), soil_of(by_key[b.get("soil", field["soil"])], soils), share
            )
            for b in blocks
        ]
        self.fw = self.system.get("wetted_fraction") or float(
            wetting[self.system.get("wetting", "sprinkler")]["fw_mid"]
        )
        self.shut: set[date] = set()
        for span in field.get("keep_offs", []):
            self.shut |= stretch(span["first"], span["last"])
        for first, last, _ in tables.BROKEN.get(field["key"], []):
            self.shut |= stretch(first, last)

    def water(self, today: date, aim: tuple[date, float, float] | None = None) -> Watered:
        """The season up to today's morning; `aim` = (from when, part of the limit, part refilled)."""
        key = f"{self.field['key']} {self.season['planting']}"
        rng = np.random.default_rng(zlib.crc32(key.encode()))
        planting = date.fromisoformat(self.season["planting"])
        first = date.fromisoformat(self.season.get("ledger_start", self.season["planting"]))
        end = min(season_end(self.season), today - timedelta(1))
        last_water = season_end(self.season) - timedelta(max(self.season["stage_days"][3] // 2, 8))
        for root in self.roots:
            root.__init__(root.crop, root.soil, root.share)  # type: ignore[misc]
            root.start(self.season.get("initial_depletion_fraction", 0.0))
        events: list[dict[str, Any]] = []
        s, efficiency = self.system, self.system["efficiency"]
        wait, refill, previous, due = self._mood(rng), self.habits["refill"], date.min, None
        for k in range((end - first).days + 1):
            day = first + timedelta(k)
            i = self.days.at(day)
            worst = max(self.roots, key=lambda r: r.depletion / r.limit)
            part, fill = wait, refill
            if aim and day >= aim[0]:
                part, fill = aim[1], aim[2]
            near = worst.depletion + 0.6 * worst.etc >= part * worst.limit
            if due is None and near and worst.depletion * fill >= s["least_mm"] * efficiency * 0.8:
                late = int(rng.integers(0, self.habits["delay"] + 1)) if self.habits["delay"] else 0
                due = day + timedelta(late)
            net = 0.0
            ready = (day - previous).days >= s.get("interval_days", 1) and day not in self.shut
            if due is not None and day >= due and ready and day <= last_water:
                event, net = self._event(day, worst.depletion * fill, rng)
                events.append(event)
                previous, due, wait = day, None, self._mood(rng)
            for root in self.roots:
                root.day(
                    (day - planting).days + 1,
                    i,
                    self.days,
                    net,
                    self.fw,
                    s.get("under_canopy", False),
                )
        worst = max(self.roots, key=lambda r: r.depletion / r.limit)
        depletion, limit, left = worst.depletion, worst.limit, 0
        while worst.depletion <= worst.limit and left < 14:
            day, left = today + timedelta(left), left + 1
            worst.day(
                (day - planting).days + 1,
                self.days.at(day),
                self.days,
                0.0,
                self.fw,
                s.get("under_canopy", False),
            )
        return Watered(events, depletion, limit, left)

    def _mood(self, rng: np.random.Generator) -> float:
        return float(self.habits["wait"] * (1 + 0.10 * rng.standard_normal()))

    def _event(
        self, day: date, wanted: float, rng: np.random.Generator
    ) -> tuple[dict[str, Any], float]:
        """The irrigation as the grower enters it, and its net depth [mm]."""
        s = self.system
        gross = float(np.clip(wanted / s["efficiency"], s["least_mm"], s["most_mm"]))
        event: dict[str, Any] = {"field": self.field["key"], "day": day.isoformat()}
        area = self.field["area_ha"]
        if self.how == "hours":
            step = 0.5 if gross / s["rate_mm_h"] < 30 else 1.0
            hours = max(round(gross / s["rate_mm_h"] / step) * step, 0.5)
            gross = hours * s["rate_mm_h"]
            event["hours"] = hours
        elif self.how == "volume":
            volume = max(round(gross * area * 10 * float(rng.normal(1, 0.02)), -1), 10.0)
            gross = volume / area / 10
            event |= {"volume_m3": volume, "confirmation": "metered"}
        elif self.how == "net":
            net = max(round(gross * s["efficiency"]), 1)
            gross = net / s["efficiency"]
            event["net_mm"] = net
        else:
            gross = float(round(gross))
            event["gross_mm"] = gross
        return event, gross * s["efficiency"]


def aimed(grower: Grower, today: date, aim: str, knobs: dict[str, Any]) -> Watered:
    """The season whose last weeks were watered so that the field stands today as `aim` says."""
    usual = grower.water(today)
    if aim not in knobs["aims"]:
        return usual
    low, high, target = knobs["aims"][aim]
    best, distance = usual, np.inf
    for back in range(6, 24, 2):
        for part in (0.35, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0, 1.1, 1.2):
            for fill in (0.7, 0.85, 1.0, 1.15):
                made = grower.water(today, (today - timedelta(back), part, fill))
                left = 99.0 if made.depletion <= 0 else made.left
                off = max(low - left, left - high, 0.0) + 0.1 * (left != target)
                off += 0.05 * abs(part - 0.85) + 0.002 * back
                if off < distance:
                    best, distance = made, off
        if distance < 0.08:
            break
    return best


def make_book(days: dict[str, Days], knobs: dict[str, Any]) -> tuple[dict[str, Any], list[str]]:
    """The whole book, and a line for each field on where it stands today."""
    book = part_of_book(knobs)
    today = date.fromisoformat(knobs["today"])
    fields = {f["key"]: f for f in book["fields"]}
    rows = {f[0]: (farm, f) for farm, g in tables.GROWERS.items() for f in g["fields"]}
    irrigations, report = [], []
    for season in book["seasons"]:
        key = season["field"]
        farm, row = rows[key]
        part = fields[key]
        stations = {v: part["station"] for v in ("energy", "temperature", "wind", "rain")}
        stations |= {s["variable"]: s["station"] for s in part.get("sources", [])}
        weather = days[part["station"]]
        if len(set(stations.values())) > 1:
            weather = mixed(*(days[stations[v]] for v in ("temperature", "energy", "wind", "rain")))
        weather = replace(weather, rain=weather.rain.copy(), slope=[])
        for gauge in knobs["gauges"]:
            if gauge["field"] == key:
                weather.rain[weather.at(date.fromisoformat(gauge["day"]))] = gauge["rain_mm"]
        grower = Grower(part, season, book, weather.ahead(today), row[5], tables.GROWERS[farm])
        running = date.fromisoformat(season["planting"]) <= today <= season_end(season)
        watered = aimed(grower, today, row[8] if running else "", knobs)
        irrigations += watered.events
        if running:
            report.append(
                f"{key:15} {season['crop'][:22]:22} aim {row[8]:5} depletion {watered.depletion:5.1f} "
                f"limit {watered.limit:5.1f} left {watered.left:2} {watered.standing} "
                f"{len(watered.events)} irrigations"
            )
    irrigations += knobs["other_irrigations"]
    book["irrigations"] = sorted(irrigations, key=lambda e: (e["day"], e["field"]))
    book["rain"] = knobs["gauges"]
    return book, report


def station_table(weather: list[Weather], station_days: Any) -> dict[str, Days]:
    """The days of every station as the program will see them."""
    return {w.place.key: station_days(w, MEASURES[w.place.key]) for w in weather}
