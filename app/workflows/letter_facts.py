"""What there is to say to each farm: its advice, the days after it, the week behind, the doubts."""

from collections import Counter, defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from datetime import date, timedelta
from itertools import groupby
from typing import Any

import numpy as np
from sqlalchemy.orm import Session

from app.letters.content import Content, Doubt, Dryness, Energy, Item, Past, Trouble, Withheld
from app.science.advice.decide import Outlook
from app.science.advice.following import following
from app.science.advice.stage_plan import StagePlan
from app.storage import letter_facts as store
from app.storage import pages
from app.storage.pages import RoundsRow
from app.storage.scope import Farms
from app.workflows import agronomy
from app.workflows.managed import managed

AHEAD_DAYS = 14
WEEK = timedelta(days=7)
TROUBLES = ("no_chance", "no_chance_in_time", "falling_behind")


@dataclass(frozen=True)
class Water:
    """One application: the day, running time [h], gross depth [mm]."""

    day: date
    hours: float
    gross_mm: float


@dataclass(frozen=True)
class FieldFacts:
    """A field by its managed block: the advice that stands, all applications ahead, its week."""

    row: RoundsRow
    water: tuple[Water, ...]
    past: Past


@dataclass(frozen=True)
class FarmFacts:
    """What there is to say to a farm this morning; `morning` None where there is no advice."""

    key: str
    name: str
    today: date
    morning: date | None
    fields: tuple[FieldFacts, ...]
    energy: tuple[Energy, ...]
    stations: dict[str, str] = field(default_factory=dict)

    @property
    def blocks(self) -> list[int]:
        """The blocks its fields are managed by."""
        return [one.row.block_id for one in self.fields]


def farm_facts(session: Session, today: date, farms: Farms = None) -> dict[str, FarmFacts]:
    """The facts of every farm (or of some) on a day, by key."""
    morning = pages.last_morning(session, today)
    rows = [
        managed(list(group))
        for _, group in groupby(
            pages.rounds_rows(session, morning, farms), lambda row: row.field_id
        )
    ]
    growing = [row for row in rows if row.number is not None]
    water = _water(session, growing)
    past = _past(session, growing, today)
    energy = _energy(session, growing, today)
    stations = {row.key: row.name for row in pages.stations(session)}
    found: dict[str, list[FieldFacts]] = defaultdict(list)
    for row in growing:
        found[row.farm_key].append(FieldFacts(row, water.get(row.block_id, ()), past[row.block_id]))
    return {
        key: FarmFacts(
            key, name, today, morning, tuple(found[key]), tuple(energy.get(key, ())), stations
        )
        for key, name in pages.farms(session, farms)
    }


def _water(session: Session, rows: Sequence[RoundsRow]) -> dict[int, tuple[Water, ...]]:
    """The applications ahead of each block: the advice, and what follows it."""
    advised = [row for row in rows if row.day is not None and row.gross_mm > 0]
    numbers = [row.number for row in advised if row.number is not None]
    workings = store.workings(session, numbers)
    found = {}
    for row in advised:
        assert row.day is not None
        first = Water(row.day, row.hours, row.gross_mm)
        found[row.block_id] = (first, *_after(row, workings[row.number or 0]))
    return found


def _after(row: RoundsRow, working: store.Working) -> Iterable[Water]:
    assert row.day is not None
    outlook = _outlook(working)
    for advice in following(
        outlook,
        working.depletion_mm,
        np.datetime64(row.day, "D"),
        row.net_mm,
        outlook.date[min(AHEAD_DAYS, outlook.date.size) - 1],
        agronomy.application_system(working.system),
        working.area_ha,
        working.season["refill_to_mm"],
        working.season["rain_room_mm"],
    ):
        assert advice.day is not None
        yield Water(agronomy.as_date(advice.day), advice.hours, advice.gross_mm)


def _outlook(working: store.Working) -> Outlook:
    """The days ahead an advice was decided on, as it keeps them."""
    days = np.array(working.outlook["date"], dtype="datetime64[D]")

    def column(name: str) -> Any:
        values = working.outlook[name]
        return np.array([np.nan if value is None else value for value in values], np.float64)

    return Outlook(
        date=days,
        depletion=column("depletion"),
        limit=column("limit"),
        taw=column("taw"),
        etc=column("etc"),
        allowed=agronomy.keep_off_mask(working.field, days),
        plan=None
        if "refill" not in working.outlook
        else StagePlan(
            refill=column("refill"),
            target=column("target"),
            floor=np.nan_to_num(column("floor"), nan=np.inf),
        ),
    )


def _past(session: Session, rows: Sequence[RoundsRow], today: date) -> dict[int, Past]:
    sums = store.sums(
        session, [row.block_id for row in rows], today - WEEK, today - timedelta(days=1)
    )
    nothing = store.Sums(0.0, 0.0, 0.0)
    return {
        row.block_id: Past(
            field=row.field_name,
            area_ha=row.area_ha,
            **sums.get(row.block_id, nothing)._asdict(),
        )
        for row in rows
    }


def _energy(session: Session, rows: Sequence[RoundsRow], today: date) -> dict[str, list[Energy]]:
    """By farm, how each station that feeds it obtained the energy of the last seven days."""
    last = today - timedelta(days=1)
    sources = pages.current(pages.sources(session, last, variable="energy"))
    rungs = store.rungs(session, [row.block_id for row in rows], today - WEEK, last)
    of_block: dict[int, dict[date, int]] = defaultdict(dict)
    for (block, day), rung in rungs.items():
        of_block[block][day] = rung
    seen: dict[str, dict[str, dict[date, int]]] = defaultdict(lambda: defaultdict(dict))
    for row in rows:
        source = sources.get((row.field_id, "energy"))
        if source is not None:
            seen[row.farm_key][source.station_name].update(of_block[row.block_id])
    return {
        farm: [
            Energy(station=station, rungs=dict(Counter(days.values())))
            for station, days in sorted(stations.items())
            if days
        ]
        for farm, stations in seen.items()
    }


# A letter's content


def letter_content(
    facts: FarmFacts, week: date, first_day: date, domain: str, **more: Any
) -> Content | None:
    """What a letter says of the week from `first_day` on; None where there is no advice at all.

    Water due the day before `first_day`, when the letter goes, is said too. `more`: note, signed,
    signed_for, revision.
    """
    if facts.morning is None or not facts.fields:
        return None
    last_day = first_day + timedelta(days=6)
    items = _items(facts, week, (first_day - timedelta(days=1), last_day), domain)
    watered = {item.field_key for item in items}
    return Content(
        farm_key=facts.key,
        farm=facts.name,
        morning=facts.morning,
        first_day=first_day,
        last_day=last_day,
        items=items,
        doubts=_doubts(facts),
        troubles=[
            Trouble(field=one.row.field_name, reason=one.row.reason)  # type: ignore[arg-type]
            for one in facts.fields
            if one.row.decision is None
            and one.row.reason in TROUBLES
            and (one.row.limit_day or last_day) <= last_day
        ],
        rest=[
            one.row.field_name
            for one in facts.fields
            if one.row.field_key not in watered
            and not withheld(one.row)
            and (one.row.reason not in TROUBLES or one.row.decision is not None)
        ],
        withheld=[
            Withheld(
                field=one.row.field_name,
                until=one.row.decision.until,
                note=one.row.decision.note,
            )
            for one in facts.fields
            if one.row.decision is not None and withheld(one.row)
        ],
        past_first=facts.today - WEEK,
        past_last=facts.today - timedelta(days=1),
        past=[one.past for one in facts.fields],
        energy=list(facts.energy),
        dryness=[_dryness(one.row) for one in facts.fields],
        **more,
    )


def _items(facts: FarmFacts, week: date, span: tuple[date, date], domain: str) -> list[Item]:
    """Every application within a span of days, by day; what was due before today is due today."""
    found = []
    for one in facts.fields:
        row = one.row
        for nth, water in enumerate(one.water, 1):
            day = max(water.day, facts.today)
            if span[0] <= day <= span[1]:
                uid = f"{week}.{row.field_key}.{nth}@{domain}"
                found.append((day, row, water, uid, nth > 1))
    found.sort(key=lambda item: (item[0], item[1].field_name.casefold()))
    return [
        Item(
            number=number,
            uid=uid,
            field_key=row.field_key,
            field=row.field_name,
            day=day,
            hours=round(water.hours, 2),
            gross_mm=round(water.gross_mm, 2),
            expected=expected,
            decided=not expected and row.decision is not None and row.decision.verdict == "change",
        )
        for number, (day, row, water, uid, expected) in enumerate(found, 1)
    ]


def withheld(row: RoundsRow) -> bool:
    """Whether the advisor withholds the field's water."""
    return row.decision is not None and row.decision.verdict == "withhold"


def _doubts(facts: FarmFacts) -> list[Doubt]:
    """What is unsure, each reason once with the fields it holds for."""
    found: dict[tuple[str, str, date | None, int], list[str]] = defaultdict(list)
    for one in facts.fields:
        for code in one.row.unsure.split():
            found[_reason(code, facts)].append(one.row.field_name)
    said = [
        Doubt(kind=kind, fields=fields, station=station, day=day, days=days)  # type: ignore[arg-type]
        for (kind, station, day, days), fields in found.items()
    ]
    if facts.morning is not None and facts.morning < facts.today:
        said.insert(0, Doubt(kind="morning", day=facts.morning))
    return said


def _reason(code: str, facts: FarmFacts) -> tuple[str, str, date | None, int]:
    """A code of `advice.unsure` (see app/wording/codes.py:unsure) taken apart."""
    kind, _, rest = code.partition(":")
    if kind == "stale":
        key, _, age = rest.partition(":")
        days = int(float(age))
        assert facts.morning is not None
        since = facts.morning - timedelta(days=days) if days < 9999 else None
        return "stale", facts.stations.get(key, key), since, 0
    if kind == "range":
        return "range", "", None, int(float(rest))
    return "other", "", None, 0


def _dryness(row: RoundsRow) -> Dryness:
    return Dryness(
        field=row.field_name,
        depletion_mm=row.depletion_mm,
        p10_mm=row.depletion_p10_mm,
        p90_mm=row.depletion_p90_mm,
        limit_mm=row.limit_mm,
        taw_mm=row.taw_mm,
    )
