"""How each invented grower waters a field through a season, and how it stands this morning."""

import zlib
from copy import copy, deepcopy
from dataclasses import dataclass, field
from datetime import date, timedelta
from typing import Any

import make_fields
import numpy as np
from make_tables import WETTING
from make_water import Days, Root, crop_of, soil_of, stretch

FAR = 14  # days looked ahead


def season_end(season: dict[str, Any]) -> date:
    """The last day of a season."""
    return date.fromisoformat(season["planting"]) + timedelta(sum(season["stage_days"]) - 1)


@dataclass
class Run:
    """A season on its way: its blocks, its chance, what its grower has in mind and has done."""

    day: date
    roots: list[Root]
    rng: np.random.Generator
    wait: float
    due: date | None = None
    previous: date = date.min
    events: list[dict[str, Any]] = field(default_factory=list)

    def branch(self) -> "Run":
        """A copy that goes its own way."""
        roots = [copy(root) for root in self.roots]
        events = list(self.events)
        return Run(self.day, roots, deepcopy(self.rng), self.wait, self.due, self.previous, events)


@dataclass
class Watered:
    """One season's irrigations and where its driest block stands this morning."""

    events: list[dict[str, Any]]
    depletion: float
    limit: float
    left: int  # the limit is passed by the close of this day, today being 1; 0: it is passed

    @property
    def standing(self) -> str:
        """A guess at the word for it."""
        if self.left == 0:
            return "late"
        if self.depletion <= 0:
            return "wet"
        return "due" if self.left <= 2 else "soon" if self.left <= 5 else "easy"


class Grower:
    """Waters one field through one season the way its grower does."""

    def __init__(
        self,
        part: dict[str, Any],
        season: dict[str, Any],
        book: dict[str, Any],
        days: Days,
        entered: str,
    ) -> None:
        self.part, self.season, self.days, self.entered = part, season, days, entered
        self.habits = make_fields.GROWERS[part["farm"]]
        self.system = next(s for s in book["systems"] if s["key"] == part["system"])
        self.efficiency = self.system["efficiency"]
        self.fw = self.system.get(
            "wetted_fraction", WETTING[self.system.get("wetting", "sprinkler")]
        )
        self.soils = {s["key"]: s for s in book["soils"]}
        self.planting = date.fromisoformat(season["planting"])
        self.end = season_end(season)
        self.last_water = self.end - timedelta(max(season["stage_days"][3] // 2, 8))
        self.shut: set[date] = set()
        for span in part.get("keep_offs", []):
            self.shut |= stretch(span["first"], span["last"])
        for first, last, _ in make_fields.BROKEN.get(part["key"], []):
            self.shut |= stretch(first, last)

    def start(self) -> Run:
        """The season on its first morning."""
        blocks = self.part.get("blocks") or [{}]
        blocks = [b for b in blocks if b and b["key"] == self.part["managed_by"]] or blocks
        share = self.system.get("root_wetted_fraction", 1.0)
        crop = crop_of(self.season)
        roots = [
            Root(crop, soil_of(self.soils[b.get("soil", self.part["soil"])]), share) for b in blocks
        ]
        for root in roots:
            root.start(self.season.get("initial_depletion_fraction", 0.0))
        seed = zlib.crc32(f"{self.part['key']} {self.season['planting']}".encode())
        rng = np.random.default_rng(seed)
        first = date.fromisoformat(self.season.get("ledger_start", self.season["planting"]))
        return Run(first, roots, rng, self._mood(rng))

    def go(self, run: Run, until: date, aim: tuple[float, float] | None = None) -> Run:
        """Carry a run up to the morning of `until`; `aim` = (part of the limit, part refilled)."""
        system = self.system
        until = min(until, self.end + timedelta(1))
        while run.day < until:
            day = run.day
            worst = max(run.roots, key=lambda r: r.depletion / r.limit)
            part, fill = aim or (run.wait, self.habits["refill"])
            wanted = worst.depletion * fill
            near = worst.depletion + 0.6 * worst.etc >= part * worst.limit
            if run.due is None and near and wanted >= system["least_mm"] * self.efficiency * 0.8:
                lost = self.habits["delay"] if not aim else 0
                run.due = day + timedelta(int(run.rng.integers(0, lost + 1)))
            net = 0.0
            ready = (day - run.previous).days >= system.get("interval_days", 1)
            open_ = day not in self.shut and day <= self.last_water
            if run.due is not None and day >= run.due and ready and open_:
                event, net = self._event(day, wanted, run.rng)
                run.events.append(event)
                run.previous, run.due, run.wait = day, None, self._mood(run.rng)
            for root in run.roots:
                self._pass(root, day, net)
            run.day += timedelta(1)
        return run

    def standing(self, run: Run) -> Watered:
        """Where a run stands, looking ahead without water."""
        worst = copy(max(run.roots, key=lambda r: r.depletion / r.limit))
        depletion, limit, left, day = worst.depletion, worst.limit, 0, run.day
        while worst.depletion <= worst.limit and left < FAR:
            self._pass(worst, day, 0.0)
            day, left = day + timedelta(1), left + 1
        return Watered(run.events, depletion, limit, left)

    def _pass(self, root: Root, day: date, net: float) -> None:
        under = self.system.get("under_canopy", False)
        number = (day - self.planting).days + 1
        root.day(number, self.days.at(day), self.days, net, self.fw, under)

    def _mood(self, rng: np.random.Generator) -> float:
        return float(self.habits["wait"] * (1 + 0.10 * rng.standard_normal()))

    def _event(
        self, day: date, wanted: float, rng: np.random.Generator
    ) -> tuple[dict[str, Any], float]:
        """The irrigation as the grower enters it, and its net depth [mm]."""
        system = self.system
        gross = float(np.clip(wanted / self.efficiency, system["least_mm"], system["most_mm"]))
        event: dict[str, Any] = {"field": self.part["key"], "day": day.isoformat()}
        if self.entered == "hours":
            step = 0.5 if gross / system["rate_mm_h"] < 30 else 1.0
            event["hours"] = max(round(gross / system["rate_mm_h"] / step) * step, 0.5)
            gross = event["hours"] * system["rate_mm_h"]
        elif self.entered == "volume":
            area = self.part["area_ha"]
            metered = round(gross * area * 10 * float(rng.normal(1, 0.02)), -1)
            event |= {"volume_m3": max(metered, 10.0), "confirmation": "metered"}
            gross = event["volume_m3"] / area / 10
        elif self.entered == "net":
            event["net_mm"] = max(round(gross * self.efficiency), 1)
            gross = event["net_mm"] / self.efficiency
        else:
            gross = float(round(gross))
            event["gross_mm"] = gross
        return event, gross * self.efficiency


def aimed(grower: Grower, today: date, aim: tuple[int, int, int] | None) -> Watered:
    """The season whose last weeks were watered so that the field stands today as `aim` says.

    aim = from which to which day ahead the limit is passed, and the best of them.
    """
    run = grower.start()
    if aim is None:
        return grower.standing(grower.go(run, today))
    low, high, target = aim
    best, distance = grower.standing(grower.go(run.branch(), today)), np.inf
    for back in range(20, 4, -3):
        run = grower.go(run, today - timedelta(back))
        for part in (0.35, 0.5, 0.65, 0.8, 0.9, 1.0, 1.15):
            for fill in (0.5, 0.75, 0.9, 1.0, 1.2):
                made = grower.standing(grower.go(run.branch(), today, (part, fill)))
                left = 99 if made.depletion <= 0 else made.left
                off = max(low - left, left - high, 0) + 0.1 * min(abs(left - target), 5)
                off += 0.2 * (0 < made.depletion < 5)
                if left == 0:
                    off += 2 * abs(made.depletion / made.limit - 1.1)
                off += 0.05 * abs(part - 0.85) + 0.05 * abs(fill - 1.0) + 0.002 * back
                if off < distance:
                    best, distance = made, off
    return best
