"""What the station pages show, worded."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from typing import Any

from app import wording
from app.intake import Rows
from app.science.energy.ladder import USUAL
from app.science.quantities import QUANTITIES
from app.storage.pages_station import Span

Row = Mapping[str, Any]


@dataclass(frozen=True)
class RungLine:
    """A rung of the ladder: on how many days it served, and why it did not on the others."""

    rung: int
    name: str
    days: int
    note: str


def rung_lines(days: Sequence[Row]) -> list[RungLine]:
    """Every rung with its days, and the commonest reasons it did not serve."""
    lines = []
    for rung in range(1, 10):
        served = sum(day["rung"] == rung for day in days)
        reasons: dict[str, int] = {}
        for day in days:
            for number, reason in wording.why_codes(day["why_not"]):
                if number == rung:
                    reasons[reason] = reasons.get(reason, 0) + 1
        ordered = sorted(reasons.items(), key=lambda item: -item[1])[:3]
        note = "; ".join(
            f"{reason} ({wording.days(count)})" if served or len(ordered) > 1 else reason
            for reason, count in ordered
        )
        if served or note:
            lines.append(RungLine(rung, wording.rung(rung), served, note))
    return lines


def gaps(days: Sequence[Row], first: date, last: date) -> list[str]:
    """Spans of days without any data, in words, newest first."""
    held = {day["day"] for day in days if 0 < day["rung"] < USUAL}
    found: list[tuple[date, date]] = []
    day = first
    while day <= last:
        if day not in held:
            if found and found[-1][1] == day - timedelta(days=1):
                found[-1] = (found[-1][0], day)
            else:
                found.append((day, day))
        day += timedelta(days=1)
    return [
        wording.full_day(start)
        if start == end
        else f"{wording.plain_day(start)} to {wording.full_day(end)} "
        f"({wording.days((end - start).days + 1)})"
        for start, end in reversed(found)
    ]


def place(details: Mapping[str, Any]) -> str:
    """Where a station stands, in one line."""
    latitude, longitude = details.get("latitude_deg", 0.0), details.get("longitude_deg", 0.0)
    ground = (
        "clipped, watered grass under the sensors"
        if details.get("reference_surface")
        else "ground under the sensors not declared grass"
    )
    return (
        f"{wording.number(abs(latitude), 2)}° {'N' if latitude >= 0 else 'S'}, "
        f"{wording.number(abs(longitude), 2)}° {'E' if longitude >= 0 else 'W'}, "
        f"{wording.number(details.get('elevation_m'))} m · wind at "
        f"{wording.number(details.get('wind_height_m'), 1)} m · {ground}"
    )


def rung_share(counts: Mapping[int, int]) -> str:
    """`measured sky 28 days, model from solar 2 days`."""
    return ", ".join(
        f"{wording.rung(rung)} {wording.days(counts[rung])}" for rung in sorted(counts) if rung
    )


def span_words(span: Span | None) -> str:
    """`12 April 2025 to 13 July 2026, 458 days`."""
    if span is None:
        return "no data yet"
    return (
        f"{wording.full_day(span.first)} to {wording.full_day(span.last)}, "
        f"{wording.days(span.days)}"
    )


def notes_words(notes: str) -> list[str]:
    """What aggregation did to a day's quantities: `downward longwave: missing (12; reason)`."""
    said = []
    for line in notes.splitlines():
        quantity, what, figure, reason = [*line.split(":", 3), "", "", ""][:4]
        named = wording.word(wording.QUANTITIES, quantity)
        done = wording.word(wording.NOTES, what)
        intervals = "" if figure in ("", "0") else f", {figure} intervals"
        told = wording.check_word(reason) if what in ("set_aside", "warned") and reason else reason
        why = f": {told}" if told else ""
        said.append(f"{named} {done}{intervals}{why}")
    return said


@dataclass(frozen=True)
class Readings:
    """The rows of a station's day as they stand: columns and rows, each with its file and line."""

    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    more: int


def readings(
    brought: Sequence[tuple[int, str, Rows]], utc_offset_h: float, most: int = 300
) -> Readings:
    """Rows of a day from the intakes that brought them, in the order in which they fold."""
    names = sorted({name for _, _, rows in brought for name in rows.values})
    lines: list[tuple[float, tuple[str, ...]]] = []
    for intake, file_name, rows in brought:
        columns = [rows.values.get(name) for name in names]
        for place in range(len(rows)):
            instant = int(rows.instant[place])
            local = datetime.fromtimestamp(instant + utc_offset_h * 3600, UTC)
            values = tuple(
                "" if column is None else wording.reading(float(column[place]))
                for column in columns
            )
            said = (f"{local:%H:%M}", str(intake), file_name, str(int(rows.line[place])))
            lines.append((instant, said + values))
    lines.sort(key=lambda line: line[0])
    heads = tuple(
        f"{wording.word(wording.QUANTITIES, name)}, "
        f"{wording.quantity_unit(QUANTITIES[name].unit) if name in QUANTITIES else ''}"
        for name in names
    )
    shown = tuple(line for _, line in lines[:most])
    return Readings(heads, shown, max(len(lines) - most, 0))
