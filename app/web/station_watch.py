"""The watch over a station's sensors: what the checks found, what is missing, what it costs."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import date, timedelta
from typing import Any

from app import wording
from app.science.energy.ladder import USUAL

Row = Mapping[str, Any]
QUANTITIES = (
    "tmax",
    "rh_max",
    "wind_2m",
    "rain",
    "shortwave_down",
    "shortwave_up",
    "longwave_down",
    "longwave_up",
)
NAMES = {"tmax": "temperature", "rh_max": "relative humidity", "wind_2m": "wind speed"}
SPANS_SHOWN = 3


@dataclass(frozen=True)
class Finding:
    """A check or a gap: in words, on how many days, when, and its last figure."""

    name: str
    days: int
    when: str
    figure: str


@dataclass(frozen=True)
class Served:
    """A rung that served: days, and the mean range it left on net radiation [MJ m-2] and ETo."""

    name: str
    days: int
    rn_range: float | None
    eto_range: float | None


@dataclass(frozen=True)
class Watch:
    """The panel: findings with most days first, what is missing since when, rungs and range."""

    findings: tuple[Finding, ...]
    missing: tuple[str, ...]
    served: tuple[Served, ...]


@dataclass
class _Seen:
    days: list[date] = field(default_factory=list)
    figure: str = ""


def watch(days: Sequence[Row], today: date) -> Watch:
    """The panel of the station days given, oldest first."""
    held = [day for day in days if 0 < day["rung"] < USUAL]
    return Watch(findings(days), tuple(missing(held, today)), served(days))


def findings(days: Sequence[Row]) -> tuple[Finding, ...]:
    """Flags and notes of days, each once, in words."""
    found: dict[str, _Seen] = {}
    for day in days:
        for name, figure in _said(day):
            seen = found.setdefault(name, _Seen())
            if not seen.days or seen.days[-1] != day["day"]:
                seen.days.append(day["day"])
            seen.figure = figure
    ordered = sorted(found.items(), key=lambda item: -len(item[1].days))
    return tuple(
        Finding(name, len(seen.days), dates(seen.days), seen.figure) for name, seen in ordered
    )


def _said(day: Row) -> list[tuple[str, str]]:
    said = []
    for flag in day["flags"].split():
        name, _, figure = flag.partition("=")
        said.append((wording.check_word(name), figure.replace("-", wording.MINUS)))
    for line in day["notes"].splitlines():
        quantity, what, figure, reason = [*line.split(":", 3), "", "", ""][:4]
        named = wording.word(wording.QUANTITIES, quantity)
        told = wording.check_word(reason) if what in ("set_aside", "warned") and reason else ""
        done = f"{named} {wording.word(wording.NOTES, what)}" + (f": {told}" if told else "")
        count = ""
        if figure not in ("", "0", "0.0"):
            count = wording.counted(round(float(figure)), "interval", "intervals")
        said.append((done, count))
    return said


def dates(days: Sequence[date]) -> str:
    """`3 July, 9 July to 12 July`; of many spans the last, and how many before."""
    spans: list[tuple[date, date]] = []
    for day in days:
        if spans and spans[-1][1] == day - timedelta(days=1):
            spans[-1] = (spans[-1][0], day)
        else:
            spans.append((day, day))
    told = [
        wording.plain_day(first)
        if first == last
        else f"{wording.plain_day(first)} to {wording.plain_day(last)}"
        for first, last in spans[-SPANS_SHOWN:]
    ]
    before = len(spans) - len(told)
    lead = f"{wording.counted(before, 'span', 'spans')} before, " if before else ""
    return lead + ", ".join(told)


def missing(held: Sequence[Row], today: date) -> list[str]:
    """What no longer comes, since when: the station itself, or a quantity it had in these days."""
    if not held:
        return []
    last = held[-1]["day"]
    if (today - last).days > 1:
        return [f"Everything since {wording.plain_day(last + timedelta(days=1))}."]
    told = []
    for name in QUANTITIES:
        given = [day["day"] for day in held if day[name] is not None]
        if given and given[-1] != last:
            named = NAMES.get(name) or wording.word(wording.QUANTITIES, name)
            since = wording.plain_day(given[-1] + timedelta(days=1))
            told.append(f"{named[:1].upper()}{named[1:]} since {since}.")
    return told


def served(days: Sequence[Row]) -> tuple[Served, ...]:
    """The rungs that served, best first, with the mean range each left."""
    lines = []
    for rung in sorted({day["rung"] for day in days if day["rung"] > 0}):
        own = [day for day in days if day["rung"] == rung]
        lines.append(
            Served(
                wording.rung(rung),
                len(own),
                _mean([day["rn_uncertainty"] for day in own]),
                _mean([day["eto_uncertainty"] for day in own]),
            )
        )
    return tuple(lines)


def _mean(values: Sequence[float | None]) -> float | None:
    known = [value for value in values if value is not None]
    return sum(known) / len(known) if known else None
