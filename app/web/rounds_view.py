"""What the Rounds show: rows already worded, sifted and put in order."""

import json
from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import date, timedelta
from functools import cache
from typing import Any, NamedTuple
from urllib.parse import urlencode

from app import wording
from app.storage.pages import EventRow, RoundsRow, SourceRow
from app.storage.since_yesterday import Since
from app.web.crops import crop_name, season_words
from app.workflows.managed import ORDER

NOT_STANDING = 9
ROWS_ON_A_PAGE = 250
"""More come in parts: a page stays below 200 kB even where every field needs words."""


class Bar(NamedTuple):
    """The bullet bar, in per cent of TAW: ink, limit, the part past it, the range."""

    ink: int
    limit: int
    past: int
    low: int
    width: int


def bar(depletion: float, limit: float, taw: float, p10: float, p90: float) -> Bar:
    """The bullet bar of a depletion; nothing is drawn beyond TAW."""

    def place(value: float) -> int:
        return round(100 * min(max(value / taw, 0.0), 1.0)) if taw > 0 and value == value else 0

    ink, tick, low = place(min(depletion, limit)), place(limit), place(p10)
    return Bar(ink, tick, max(place(depletion) - tick, 0), low, max(place(p90) - low, 0))


class Row(NamedTuple):
    """One field of the Rounds."""

    key: str
    name: str
    farm: str
    crop: str
    ran: str
    error: str
    typed: str
    sure: bool
    standing: str = "none"
    unsure: str = ""
    others: str = ""
    bar: Bar | None = None
    depletion: str = ""
    span: str = ""
    limit: str = ""
    taw: str = ""
    when: str = ""
    gross: str = ""
    net: str = ""
    hours: str = ""
    why: str = ""
    change: str = ""
    rung: str = ""
    age: str = ""


@dataclass(frozen=True)
class Sieve:
    """What the advisor asked to see."""

    farm: str = ""
    crop: str = ""
    station: str = ""
    standing: str = ""
    find: str = ""
    sort: str = "urgency"
    part: str = ""

    def query(self) -> dict[str, str]:
        """The parts that differ from the plain page."""
        return {name: value for name, value in vars(self).items() if value and value != "urgency"}


@dataclass(frozen=True)
class Facts:
    """What is known beside the rows themselves."""

    today: date
    stations: Mapping[str, str]
    energy: Mapping[int, SourceRow] = field(default_factory=dict)
    events: Mapping[int, Sequence[EventRow]] = field(default_factory=dict)
    since: Mapping[int, Since] = field(default_factory=dict)
    ahead: Mapping[int, Sequence[RoundsRow]] = field(default_factory=dict)
    """For each field its blocks that are more urgent than the one it goes by."""


SORTS: dict[str, tuple[str, Callable[[RoundsRow], Any]]] = {
    "urgency": ("most urgent first", lambda row: urgency(row)),
    "day": ("day to water", lambda row: (row.day or date.max, urgency(row))),
    "field": ("field", lambda row: row.field_name.casefold()),
    "farm": ("farm", lambda row: (row.farm_name.casefold(), urgency(row))),
    "depletion": ("depletion, deepest first", lambda row: -(row.depletion_mm or 0.0)),
    "hours": ("hours, longest first", lambda row: -(row.hours or 0.0)),
}


def urgency(row: RoundsRow) -> tuple[Any, ...]:
    """The place of a row: standing, day to water, nearness to the limit, name."""
    if row.number is None:
        return (NOT_STANDING, date.max, 0.0, row.field_name)
    nearness = row.depletion_mm / row.limit_mm if row.limit_mm > 0 else row.depletion_mm
    return (
        ORDER.get(row.standing or "", NOT_STANDING),
        row.day or row.limit_day or date.max,
        -nearness,
        row.field_name,
    )


def sift(rows: Sequence[RoundsRow], sieve: Sieve, facts: Facts) -> list[RoundsRow]:
    """The rows the sieve lets through, in its order."""
    needle = sieve.find.strip().casefold()

    def passes(row: RoundsRow) -> bool:
        energy = facts.energy.get(row.field_id)
        return (
            (not sieve.farm or row.farm_key == sieve.farm)
            and (not sieve.crop or row.crop == sieve.crop)
            and (not sieve.station or (energy is not None and energy.station_key == sieve.station))
            and (not sieve.standing or in_standing(row, sieve.standing))
            and (not needle or needle in f"{row.field_name} {row.farm_name}".casefold())
        )

    return sorted(filter(passes, rows), key=SORTS.get(sieve.sort, SORTS["urgency"])[1])


def first_row(part: str, found: int) -> int:
    """Where a part of a long list begins; the first where `part` names none."""
    number = int(part) if part.isdigit() and len(part) < 6 else 1
    first = (number - 1) * ROWS_ON_A_PAGE
    return first if 0 <= first < found else 0


def parts(sieve: Sieve, found: int) -> list[tuple[str, str, bool]]:
    """Label, query and whether it is shown, of each part of a list too long for one page."""
    here = first_row(sieve.part, found)
    starts = range(0, found, ROWS_ON_A_PAGE)
    if len(starts) < 2:
        return []
    return [
        (
            f"{start + 1} to {min(start + ROWS_ON_A_PAGE, found)}",
            urlencode(sieve.query() | {"part": str(number)}),
            start == here,
        )
        for number, start in enumerate(starts, 1)
    ]


def in_standing(row: RoundsRow, standing: str) -> bool:
    """Whether a row is counted under a standing; `unsure` is the mark, `none` no advice."""
    if standing == "unsure":
        return bool(row.unsure)
    return (row.standing or "none") == standing


def word_row(
    row: RoundsRow, facts: Facts, error: str = "", typed: str = "", sure: bool = False
) -> Row:
    """A row in words; `sure`: the hours typed only want saying a second time."""
    last = facts.events.get(row.block_id, ())[:2]
    ran = "; ".join(event_words(event, facts.today) for event in last)
    plain = Row(
        row.field_key,
        row.field_name,
        row.farm_name,
        season_words(row.crop, row.planting, stage_days_of(row.stage_days), facts.today),
        ran,
        error,
        typed,
        sure,
    )
    if row.number is None:
        return plain
    watering = row.day is not None and row.gross_mm > 0
    return plain._replace(
        standing=row.standing or "none",
        unsure=" ".join(wording.unsure(row.unsure, facts.stations, row.issued_on or facts.today)),
        others=" ".join(
            f"{other.block_name} is {other.standing}."
            for other in facts.ahead.get(row.field_id, ())
        ),
        bar=bar(
            row.depletion_mm, row.limit_mm, row.taw_mm, row.depletion_p10_mm, row.depletion_p90_mm
        ),
        depletion=wording.depth(row.depletion_mm),
        span=span(row.depletion_p10_mm, row.depletion_p90_mm),
        limit=wording.depth(row.limit_mm),
        taw=wording.depth(row.taw_mm),
        when=when(row.day, facts.today) if watering else "no water",
        gross=wording.depth(row.gross_mm) if watering else "",
        net=wording.depth(row.net_mm) if watering else "",
        hours=wording.number(row.hours, 1) if watering else "",
        why=decision_words(row, facts.today)
        + wording.reason(row.reason, json.loads(row.figures), row.day, facts.today),
        change=change_words(row, facts),
        rung=wording.rung(row.rung),
        age="" if row.unsure.startswith("stale") else age(row.data_until, facts.today),
    )


REVISED_MM = 0.5
"""A depletion of the morning before that moved by less is not said to have been revised."""


def change_words(row: RoundsRow, facts: Facts) -> str:
    """What changed since the morning before, and why: yesterday's terms; what was thought of the
    days before and is now known otherwise; a day to water that has moved."""
    if row.change_mm is None:
        return ""
    said = f"{wording.signed(row.change_mm)} mm"
    since = facts.since.get(row.block_id)
    if since is None:
        return f"{said}; "
    terms = (
        ("ET", since.et_mm),
        ("rain", since.rain_mm),
        ("watered", since.irrigation_mm),
        ("reading", since.correction_mm),
    )
    told = [(name, mm) for name, mm in terms if abs(mm) >= 0.05]
    if len(told) == 1:
        said += f", {told[0][0]}"
    elif told:
        said += ": " + ", ".join(f"{name} {wording.depth(mm)}" for name, mm in told)
    said += "; " if since.thought_mm is None else ". "
    if since.thought_mm is not None:
        revised = since.before_mm - since.thought_mm
        if abs(revised) >= REVISED_MM:
            why = "entries since" if since.told else "new data or a changed book"
            more = "drier" if revised > 0 else "wetter"
            said += f"Was {wording.depth(abs(revised))} mm {more} than thought: {why}. "
    day = (row.issued or row).day
    if (
        since.was_day is not None
        and day not in (None, since.was_day)
        and max(since.was_day, day or since.was_day) > facts.today
    ):
        said += f"Day moved from {wording.short_day(since.was_day)}. "
    return said


def decision_words(row: RoundsRow, today: date) -> str:
    """What the advisor decided, and what had been advised; nothing where nothing was."""
    decision = row.decision
    if decision is None:
        return ""
    note = f" ({decision.note})" if decision.note else ""
    if decision.verdict == "accept":
        return f"Accepted by {decision.who}{note}. "
    was = row.issued or row
    advised = f"{when(was.day, today)}, {wording.number(was.hours, 1)} h" if was.day else "no water"
    if decision.verdict == "withhold":
        until = wording.short_day(decision.until)
        return f"Withheld by {decision.who} through {until}{note}; advised: {advised}. "
    return f"Changed by {decision.who}{note}; advised: {advised}. "


@cache
def stage_days_of(text: str | None) -> tuple[int, ...] | None:
    """The season's own stage lengths from their JSON text; None where it has none."""
    found = json.loads(text) if text else None
    return tuple(found) if found else None


def when(day: date | None, today: date) -> str:
    """The day to water: today, tomorrow, else weekday and date."""
    if day is None:
        return "no water"
    return wording.NEAR.get((day - today).days) or wording.short_day(day)


def span(p10: float, p90: float) -> str:
    """The range, or nothing where there is none."""
    if not (p10 == p10 and p90 == p90):
        return ""
    return f"{wording.depth(p10)} to {wording.depth(p90)}"


def age(until: date | None, today: date) -> str:
    """Until when the data reach, said only where that is before yesterday."""
    if until is None:
        return "no data"
    return "" if until >= today - timedelta(days=1) else f"data to {wording.short_day(until)}"


def event_words(event: EventRow, today: date) -> str:
    """`7.5 h yesterday`, `12 mm of rain on Monday, presumed done`."""
    amount = f"{wording.number(event.amount, 1)} {wording.word(wording.UNITS, event.unit)}"
    kind = " rain" if event.kind == "rain" else ""
    doubt = (
        f", {wording.word(wording.CONFIRMATIONS, event.confirmation)}"
        if event.confirmation in wording.UNCONFIRMED
        else ""
    )
    return f"{amount}{kind} {wording.near_day(event.day, today)}{doubt}"


def crops_of(rows: Sequence[RoundsRow]) -> list[tuple[str, str]]:
    """The crops that stand on the fields, by name."""
    keys = {row.crop for row in rows if row.crop}
    short = Counter(crop_name(key) for key in keys)
    named = [(key, crop_name(key, whole=short[crop_name(key)] > 1)) for key in keys]
    return sorted(named, key=lambda crop: crop[1])


def counts(rows: Sequence[RoundsRow]) -> list[tuple[str, int]]:
    """How many fields there are of each standing, and how many are unsure."""
    found = [(name, sum(row.standing == name for row in rows)) for name in ORDER]
    found.append(("unsure", sum(bool(row.unsure) for row in rows)))
    return [(name, count) for name, count in found if count]


def to_water(rows: Sequence[RoundsRow], today: date) -> list[tuple[str, int]]:
    """How many fields the advice waters today and tomorrow."""
    found = [
        (wording.NEAR[n], sum(row.day == today + timedelta(days=n) for row in rows)) for n in (0, 1)
    ]
    return [(name, count) for name, count in found if count]


def asked_for(rows: Sequence[RoundsRow], today: date) -> float:
    """Volume [m3] asked for today and tomorrow."""
    last = today + timedelta(days=1)
    return sum(row.volume_m3 for row in rows if row.day is not None and row.day <= last)
