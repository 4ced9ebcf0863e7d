"""A table of irrigations, rain, and what was seen on fields; or of soil readings, a line a depth.

Columns are found by name, in English or Spanish; units stand beside a name (`depth, cm`), in a
column `unit`, or in the name itself (`gross_mm`). What cannot be read is a problem by line.
"""

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from dataclasses import field as default
from datetime import date, timedelta
from typing import Any

import numpy as np

from app.intake.cells import MISSING, split_line
from app.intake.dates import read_text
from app.intake.errors import IntakeError
from app.intake.text import encoding_of, refuse_what_is_no_text

MOST_BYTES = 2_000_000
MOST_LINES = 5000
MOST_PROBLEMS = 200
ORDERS = ("dmy", "mdy")

NAMES: dict[str, tuple[str, ...]] = {
    "field": ("field", "field key", "field name", "campo", "parcela", "lote"),
    "block": ("block", "bloque", "sector", "set"),
    "day": ("day", "date", "dia", "día", "fecha"),
    "hour": ("hour", "time", "hora"),
    "kind": ("what", "kind", "event", "type", "que", "qué", "tipo", "evento"),
    "amount": ("amount", "quantity", "value", "reading", "cantidad", "valor", "lectura"),
    "unit": ("unit", "units", "unidad", "unidades"),
    "hours": ("hours", "run time", "horas"),
    "gross": ("gross", "gross depth", "lamina bruta", "lámina bruta"),
    "net": ("net", "net depth", "lamina neta", "lámina neta"),
    "volume": ("volume", "volumen"),
    "rain": ("rain", "rainfall", "lluvia"),
    "stage": ("stage", "etapa"),
    "cover": ("cover", "ground cover", "cobertura"),
    "height": ("height", "crop height", "altura"),
    "last": ("last", "last day", "until", "hasta"),
    "purpose": ("purpose", "proposito", "propósito"),
    "confirmation": ("confirmation", "said to be done", "confirmacion", "confirmación"),
    "area_share": ("area share", "share of area", "part of area", "parte del area"),
    "note": ("note", "notes", "remark", "remarks", "nota", "notas"),
    "method": ("method", "read as", "metodo", "método"),
    "depth": ("depth", "profundidad"),
    "error": ("error", "standard error"),
    "bulk_density": ("bulk density", "densidad aparente"),
    "slope": ("slope", "pendiente"),
    "intercept": ("intercept", "ordenada"),
    "trust": ("trust", "confianza"),
}
_COLUMN = {name: column for column, names in NAMES.items() for name in names}

KINDS = {
    "irrigation": "irrigation", "riego": "irrigation", "water": "irrigation",
    "rain": "rain", "lluvia": "rain",
    "stage": "stage", "etapa": "stage",
    "cover": "cover", "ground cover": "cover", "cobertura": "cover",
    "cutting": "cutting", "cut": "cutting", "corte": "cutting",
    "keep off": "keep_off", "no regar": "keep_off",
    "note": "note", "nota": "note",
}  # fmt: skip
STAGES = {
    "initial": 1, "inicial": 1, "development": 2, "desarrollo": 2,
    "mid": 3, "mid season": 3, "media": 3, "late": 4, "late season": 4, "final": 4,
}  # fmt: skip
_ACRE_INCH_M3, _ACRE_FOOT_M3, _GALLON_M3 = 102.790153, 1233.481838, 0.003785411784
AMOUNTS: dict[str, tuple[str, float]] = {
    "h": ("hours", 1.0), "hour": ("hours", 1.0), "hours": ("hours", 1.0), "horas": ("hours", 1.0),
    "min": ("hours", 1 / 60), "minutes": ("hours", 1 / 60),
    "gross mm": ("gross_mm", 1.0), "mm gross": ("gross_mm", 1.0),
    "gross in": ("gross_mm", 25.4), "in gross": ("gross_mm", 25.4),
    "net mm": ("net_mm", 1.0), "mm net": ("net_mm", 1.0),
    "net in": ("net_mm", 25.4), "in net": ("net_mm", 25.4),
    "rain mm": ("rain_mm", 1.0), "rain in": ("rain_mm", 25.4),
    "m3": ("volume_m3", 1.0), "m³": ("volume_m3", 1.0), "volume m3": ("volume_m3", 1.0),
    "l": ("volume_m3", 0.001), "ml": ("volume_m3", 1000.0), "megalitre": ("volume_m3", 1000.0),
    "acre in": ("volume_m3", _ACRE_INCH_M3), "acre ft": ("volume_m3", _ACRE_FOOT_M3),
    "gal": ("volume_m3", _GALLON_M3),
}  # fmt: skip
"""Units of an irrigation's amount, as our own and a factor (US units by NIST SP 811, app. B.8)."""
LENGTHS = {"m": 1.0, "cm": 0.01, "mm": 0.001, "in": 0.0254, "ft": 0.3048}
DEPTHS = {"mm": 1.0, "cm": 10.0, "in": 25.4}
SHARES = {"%": 0.01, "percent": 0.01, "fraction": 1.0, "": 1.0}
CONTENTS = {
    "": 1.0, "m3/m3": 1.0, "m³/m³": 1.0, "kg/kg": 1.0, "g/g": 1.0, "fraction": 1.0, "ratio": 1.0,
    "%": 0.01, "% vol": 0.01, "vol %": 0.01, "kpa": 1.0, "cbar": 1.0, "cb": 1.0,
}  # fmt: skip
METHODS = ("volumetric", "gravimetric", "neutron", "tension")
_METHOD_OF_UNIT = {
    "m3/m3": "volumetric", "m³/m³": "volumetric", "% vol": "volumetric", "vol %": "volumetric",
    "kg/kg": "gravimetric", "g/g": "gravimetric", "ratio": "neutron",
    "kpa": "tension", "cbar": "tension", "cb": "tension",
}  # fmt: skip


@dataclass(frozen=True)
class LineProblem:
    """What is wrong where: line (1-based; 0 is the file), column, value, why and the remedy."""

    line: int
    column: str
    value: str
    why: str
    remedy: str


@dataclass(frozen=True)
class FileEvent:
    """One event as a file says it; `lines` are those it stands on."""

    lines: tuple[int, ...]
    field: str
    block: str | None
    kind: str
    day: date
    amount: float = 0.0
    unit: str = ""
    details: Mapping[str, Any] = default(default_factory=dict)
    purpose: str = "crop"
    confirmation: str = "reported"
    area_share: float = 1.0
    note: str | None = None


class _WrongError(Exception):
    def __init__(self, column: str, value: str, why: str, remedy: str) -> None:
        super().__init__(why)
        self.told = column, value[:80], why, remedy


@dataclass(frozen=True)
class _Table:
    columns: dict[str, int]
    units: dict[str, str]
    rows: list[tuple[int, list[str]]]
    comma: bool
    heads: dict[str, str]


def read_events(data: bytes, order: str | None = None) -> tuple[list[FileEvent], list[LineProblem]]:
    """Every event of a file, and every problem; nothing is to be logged where there is one.

    order: `dmy` or `mdy`, for dates that can be read both ways. Raises IntakeError for what is no
    such table.
    """
    table = _table(data)
    days, problems = _days(table, order)
    found: list[FileEvent] = []
    reading = "depth" in table.columns
    by_time: dict[tuple[Any, ...], list[tuple[int, _Row]]] = {}
    for number, cells in table.rows:
        if number not in days:
            continue
        row = _Row(table, cells)
        try:
            if reading:
                by_time.setdefault(_when(row, days[number]), []).append((number, row))
            else:
                found.append(_event(row, number, days[number], days))
        except _WrongError as wrong:
            problems.append(LineProblem(number, *wrong.told))
    for key, rows in by_time.items():
        try:
            found.append(_reading(key, rows, problems))
        except _WrongError as wrong:
            problems.append(LineProblem(rows[0][0], *wrong.told))
    return found, sorted(problems, key=lambda one: one.line)[:MOST_PROBLEMS]


def _table(data: bytes) -> _Table:
    if len(data) > MOST_BYTES:
        raise IntakeError(
            f"The file has {len(data)} bytes; at most {MOST_BYTES} are taken. Send it in parts."
        )
    refuse_what_is_no_text(data[: 512 * 1024])
    text = data.decode(encoding_of(data), errors="replace").removeprefix("\ufeff")
    lines = [line.replace("\0", "") for line in re.split(r"\r\n|\r|\n", text)]
    filled = [
        (n, line)
        for n, line in enumerate(lines, 1)
        if line.strip(" \t,;|") and not line.startswith(("#", "sep="))
    ]
    if len(filled) < 2:
        raise IntakeError("The file holds no rows below a header. Begin with the example's header.")
    if len(filled) > MOST_LINES:
        raise IntakeError(f"The file has more than {MOST_LINES} rows. Send it in parts.")
    head = filled[0][1]
    delimiter = max(("tab", ";", ",", "|"), key=lambda mark: len(split_line(head, mark)))
    columns: dict[str, int] = {}
    units: dict[str, str] = {}
    heads: dict[str, str] = {}
    for place, said in enumerate(split_line(head, delimiter)):
        name, unit = _name(said)
        if name is None:
            raise IntakeError(
                f"Line {filled[0][0]}: no column is called {said[:40]!r}. "
                f"The columns known are: {', '.join(names[0] for names in NAMES.values())}. "
                "Rename it or leave it out."
            )
        if name in columns:
            raise IntakeError(f"Line {filled[0][0]}: the column {said[:40]!r} stands twice.")
        columns[name], heads[name] = place, said
        units[name] = unit
    for needed in ("field", "day"):
        if needed not in columns:
            raise IntakeError(f"Line {filled[0][0]}: no column is called {needed!r}. Add it.")
    rows = [(n, split_line(line, delimiter)) for n, line in filled[1:]]
    return _Table(columns, units, rows, delimiter != ",", heads)


def _plain(text: str) -> str:
    return re.sub(r"[\s_-]+", " ", text.strip().lower())


def _name(said: str) -> tuple[str | None, str]:
    """The column a header means, and the unit it states."""
    whole = _plain(said)
    if whole in _COLUMN:
        return _COLUMN[whole], ""
    match = re.fullmatch(r"(.+?)\s*[\[(,]\s*([^\])]+?)[\])]?", whole)
    if match and match[1] in _COLUMN:
        return _COLUMN[match[1]], match[2]
    for count in (1, 2):
        words = whole.rsplit(" ", count)
        if len(words) > count and words[0] in _COLUMN:
            return _COLUMN[words[0]], " ".join(words[1:])
    return None, ""


class _Row:
    """The cells of one line by column."""

    def __init__(self, table: _Table, cells: list[str]) -> None:
        self.table, self.cells = table, cells

    def text(self, column: str) -> str:
        place = self.table.columns.get(column)
        if place is None or place >= len(self.cells):
            return ""
        said = self.cells[place]
        # a formula's mark that an export put before a text is no part of it
        said = said[1:] if said[:2] in ("'=", "'+", "'-", "'@") else said
        return said

    def head(self, column: str) -> str:
        return self.table.heads.get(column, column)

    def number(self, column: str) -> float | None:
        said = self.text(column)
        if said in MISSING:
            return None
        if re.fullmatch(r"[-+]?\d+,\d{3}", said) and said.lstrip("-+")[0] != "0":
            raise _WrongError(
                self.head(column), said, "this can be read as thousands or as decimals",
                f"Write {said.replace(',', '')} or {said.replace(',', '.')}.",
            )  # fmt: skip
        if not re.fullmatch(r"[-+]?(\d+([.,]\d*)?|[.,]\d+)([eE][-+]?\d{1,2})?", said):
            raise _WrongError(
                self.head(column), said, "this is no number", "Write a number such as 7.5."
            )
        return float(said.replace(",", "."))

    def scaled(
        self, column: str, factors: Mapping[str, float], unit: str | None = None
    ) -> float | None:
        value = self.number(column)
        if value is None:
            return None
        said = (self.table.units[column] if unit is None else unit) or ""
        if said not in factors:
            raise _WrongError(
                self.head(column), said or self.text(column),
                "this unit is not known" if said else "its unit is not stated",
                f"State one of {', '.join(filter(None, factors))} in the column's name.",
            )  # fmt: skip
        return value * factors[said]


def _days(table: _Table, order: str | None) -> tuple[dict[Any, date], list[LineProblem]]:
    """The day of every line, and under (line, "last") the last day it states."""
    cells: dict[Any, tuple[int, str, str]] = {}
    for number, row in table.rows:
        one = _Row(table, row)
        cells[number] = number, one.head("day"), one.text("day")
        if last := one.text("last"):
            cells[number, "last"] = number, one.head("last"), last
    read = {way: _read_days(cells, way) for way in ORDERS}
    whole = [way for way in ORDERS if len(read[way]) == len(cells)]
    if order is None and len(whole) == 2 and read["dmy"] != read["mdy"]:
        key = next(key for key in cells if read["dmy"][key] != read["mdy"][key])
        number, head, said = cells[key]
        return {}, [
            LineProblem(
                number, head, said, "its day and month can be taken for each other",
                "Choose the order of day and month, or write dates as 2026-07-14.",
            )
        ]  # fmt: skip
    days = read[order or (whole or ["dmy"])[0]]
    problems = [
        LineProblem(
            number, head, said[:80], "this is no date" if said else "there is no date",
            "Write the date as 2026-07-14.",
        )
        for key, (number, head, said) in cells.items()
        if key not in days
    ]  # fmt: skip
    bad = {problem.line for problem in problems}
    return {
        key: day
        for key, day in days.items()
        if (key if isinstance(key, int) else key[0]) not in bad
    }, problems


def _read_days(cells: Mapping[Any, tuple[int, str, str]], order: str) -> dict[Any, date]:
    texts = np.array([text[:40].encode("ascii", "replace") for _, _, text in cells.values()])
    seconds, _, why = read_text(texts, "date", order)
    first = date(1970, 1, 1)
    found = {}
    for key, at, code in zip(cells, seconds, why, strict=True):
        if code == 0 and -30000 < at // 86400 < 80000:
            found[key] = first + timedelta(days=int(at // 86400))
    return found


def _choice(row: _Row, column: str, choices: Iterable[str], default: str) -> str:
    said = _plain(row.text(column)).replace(" ", "-" if column == "purpose" else "_")
    if not said:
        return default
    if said not in choices:
        raise _WrongError(
            row.head(column), row.text(column), "this is not known",
            f"Write one of {', '.join(sorted(choices))}.",
        )  # fmt: skip
    return said


PURPOSES = ("crop", "pre-plant", "germination", "leaching", "frost", "cooling", "injection")
CONFIRMATIONS = ("presumed", "reported", "metered", "measured")


def _place(row: _Row) -> tuple[str, str | None]:
    said = row.text("field")
    if not said:
        raise _WrongError(
            row.head("field"), "", "no field is named", "Write the field's key or name."
        )
    return said, row.text("block") or None


def _event(row: _Row, number: int, day: date, days: Mapping[Any, date]) -> FileEvent:
    place, block = _place(row)
    kind = _kind(row)
    note = row.text("note")[:400] or None
    if kind in ("irrigation", "rain"):
        amount, unit = _amount(row, kind)
        share = row.scaled("area_share", SHARES)
        if share is not None and not 0 < share <= 1:
            raise _WrongError(
                row.head("area_share"), row.text("area_share"), "this is no part of an area",
                "Write a fraction above 0 to 1, or per cent with % in the column's name.",
            )  # fmt: skip
        return FileEvent(
            (number,), place, block, kind, day, amount, unit,
            purpose=_choice(row, "purpose", PURPOSES, "crop"),
            confirmation=_choice(row, "confirmation", CONFIRMATIONS, "reported"),
            area_share=1.0 if share is None else share,
            note=note,
        )  # fmt: skip
    amount = 0.0
    details: dict[str, Any] = {}
    if kind == "stage":
        said = row.text("stage") or row.text("amount")
        amount = float(STAGES.get(_plain(said), said if said in ("1", "2", "3", "4") else 0))
        if not amount:
            raise _WrongError(
                row.head("stage" if row.text("stage") else "amount"), said, "this is no stage",
                "Write initial, development, mid or late, or 1 to 4.",
            )  # fmt: skip
    elif kind == "cover":
        amount = _cover(row)
        height = row.scaled("height", LENGTHS)
        if height is None:
            raise _WrongError(
                row.head("height"), "", "a cover needs the crop's height", "Write it in."
            )
        details = {"height_m": height}
    elif kind == "keep_off":
        details = {"last": days.get((number, "last"), day)}
    return FileEvent((number,), place, block, kind, day, amount, "", details, note=note)


def _cover(row: _Row) -> float:
    column = "cover" if row.text("cover") else "amount"
    unit = _plain(row.text("unit")) if column == "amount" else None
    value = row.scaled(column, SHARES, unit)
    if value is None:
        raise _WrongError(row.head(column), "", "there is no cover", "Write the ground cover.")
    if not 0 <= value <= 1:
        raise _WrongError(
            row.head(column), row.text(column), "a cover is a fraction of the ground, 0 to 1",
            "Put % into the column’s name if it is per cent.",
        )  # fmt: skip
    return value


def _kind(row: _Row) -> str:
    said = row.text("kind")
    if said:
        kind = KINDS.get(_plain(said))
        if kind is None:
            raise _WrongError(
                row.head("kind"), said, "this is not known",
                "Write irrigation, rain, stage, cover, cutting, keep off or note.",
            )  # fmt: skip
        return kind
    filled = {
        name: kind
        for name, kind in (
            ("rain", "rain"), ("stage", "stage"), ("cover", "cover"), ("last", "keep_off"),
            ("hours", "irrigation"), ("gross", "irrigation"), ("net", "irrigation"),
            ("volume", "irrigation"), ("amount", "irrigation"),
        )
        if row.text(name)
    }  # fmt: skip
    told = set(filled.values())
    if len(told) == 1:
        return told.pop()
    if not told and row.text("note"):
        return "note"
    raise _WrongError(
        row.head("kind"), "", "it is not said what happened", "Fill in a column called 'what'."
    )


def _amount(row: _Row, kind: str) -> tuple[float, str]:
    """An irrigation's or rain's amount in one of our units."""
    given = []
    for column, unit, factors in (
        ("hours", "hours", {"": 1.0, "h": 1.0, "min": 1 / 60}),
        ("gross", "gross_mm", DEPTHS),
        ("net", "net_mm", DEPTHS),
        ("volume", "volume_m3", {k: f for k, (u, f) in AMOUNTS.items() if u == "volume_m3"}),
        ("rain", "rain_mm", DEPTHS),
    ):
        value = row.scaled(column, factors)
        if value is not None:
            given.append((value, unit, column))
    value = row.number("amount")
    if value is not None:
        said = _plain(row.text("unit")) or row.table.units["amount"]
        if kind == "rain" and said in DEPTHS:
            value, said = value * DEPTHS[said], "rain mm"
        if said not in AMOUNTS:
            raise _WrongError(
                row.head("unit"), said,
                "it is not said whether this depth is gross or net" if said in DEPTHS
                else "this unit is not known" if said else "its unit is not stated",
                "Write gross mm or net mm." if said in DEPTHS
                else "Write hours, gross mm, net mm, m3, gross in, acre-in or gal; mm for rain.",
            )  # fmt: skip
        unit, factor = AMOUNTS[said]
        given.append((value * factor, unit, "amount"))
    if len(given) != 1:
        raise _WrongError(
            ", ".join(row.head(column) for _, _, column in given) or row.head("amount"), "",
            "more than one amount is given" if given else "there is no amount",
            "Give exactly one amount a line.",
        )  # fmt: skip
    amount, unit, column = given[0]
    if (unit == "rain_mm") != (kind == "rain"):
        raise _WrongError(
            row.head(column), row.text(column), f"{unit} is no amount of {kind}",
            "Write irrigation in hours, gross or net depth or volume, and rain in mm or in.",
        )  # fmt: skip
    return amount, unit


def _when(row: _Row, day: date) -> tuple[Any, ...]:
    place, block = _place(row)
    said = row.text("hour")
    if match := re.fullmatch(r"(\d{1,2}):(\d{2})(?::\d{2})?", said):
        hour = int(match[1]) + int(match[2]) / 60
    else:
        stated = row.number("hour")
        hour = 6.0 if stated is None else stated
    if not 0 <= hour <= 24:
        raise _WrongError(
            row.head("hour"), said, "there is no such hour", "Write 0 to 24, or 06:30."
        )
    unit = _value_unit(row)
    method = _choice(row, "method", METHODS, _METHOD_OF_UNIT.get(unit, ""))
    if not method:
        raise _WrongError(
            row.head("method"), "", "it is not said how this was read",
            f"Add a column 'method' with one of {', '.join(METHODS)}, or a unit such as kPa.",
        )  # fmt: skip
    return place, block, day, hour, method


def _value_unit(row: _Row) -> str:
    return _plain(row.text("unit")) or row.table.units.get("amount", "")


def _reading(
    key: tuple[Any, ...], rows: list[tuple[int, _Row]], problems: list[LineProblem]
) -> FileEvent:
    """The lines of one place, time and method as one reading."""
    place, block, day, hour, method = key
    depths, told = [], {}
    notes: list[str] = []
    trust = "weighed"
    for number, row in rows:
        try:
            depth = row.scaled("depth", LENGTHS)
            value = row.scaled("amount", CONTENTS, _value_unit(row))
            if depth is None or value is None:
                column = "depth" if depth is None else "amount"
                raise _WrongError(row.head(column), "", "nothing stands here", "Fill it in.")
            depths.append({"depth_m": depth, "value": value, "error": row.number("error")})
            for name in ("bulk_density", "slope", "intercept"):
                stated = row.number(name)
                if stated is not None:
                    told[name] = stated
            trust = _choice(row, "trust", ("weighed", "full", "none"), trust)
        except _WrongError as wrong:
            problems.append(LineProblem(number, *wrong.told))
        if row.text("note") and row.text("note") not in notes:
            notes.append(row.text("note"))
    details = {"method": method, "hour": hour, "trust": trust, "depths": depths, **told}
    return FileEvent(
        tuple(number for number, _ in rows), place, block, "reading", day, details=details,
        note="; ".join(notes)[:400] or None,
    )  # fmt: skip
