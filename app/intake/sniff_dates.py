"""Which columns say when, in what layout, and how far apart the rows are."""

import re
from collections import Counter
from dataclasses import dataclass

import numpy as np

from app.intake.cells import kind_of
from app.intake.dates import read_times
from app.intake.errors import IntakeError
from app.intake.model import Floats, Instants, TimeColumn, TimeLayout, TimeRole
from app.intake.names import plain_words
from app.intake.sniff_table import Table

_WORDS: tuple[tuple[TimeRole, str], ...] = (
    ("day_of_year", r"doy|julian|jday|jd|yday|day of year|dia juliano|dia del ano|dayofyear|jul"),
    ("year", r"year|yr|yyyy|ano|anio|jahr|annee"),
    ("month", r"month|mon|mo|mes|monat|mois"),
    ("minute", r"minute|minutes|min|mins|minuto|minutos"),
    ("second", r"second|seconds|sec|segundo"),
    ("hhmm", r"hhmm|hh mm|time|hora|hour minute|hourminute|hrmn"),
    ("hour", r"hour|hr|hrs|hh|hora|stunde|heure|h"),
    ("day", r"day|dd|dia|dom|day of month|tag|jour|d"),
)
_WORD_RULES = tuple((role, re.compile(rf"^(?:{rule})(?: (?:utc|gmt|lst|end|local))?$"))
                    for role, rule in _WORDS)  # fmt: skip
_SAYS_WHEN = re.compile(
    r"\b(?:date|datetime|time|timestamp|stamp|fecha|hora|when|end|start|datum|zeit|tmstamp|ts|dt"
    r"|epoch|unix|serial|day|dia|instant|interval|period)\b"
)
_CLOCK = re.compile(r"\d[T,\s]+\d{1,2}[:h]|\dT\d{4}")
_RUN_ON = re.compile(r"(?:19|20|21)\d\d(?:0[1-9]|1[0-2])(?:[0-3]\d)(?:\d{4}|\d{6})?")
_START = re.compile(r"\b(?:start|begin|beginning|from|inicio|desde|starting)\b")
_UTC = re.compile(r"\b(?:utc|gmt|zulu)\b")
_UNNAMED: tuple[tuple[TimeRole, ...], ...] = (
    ("year", "day_of_year", "month", "day", "hour", "minute"),
    ("year", "month", "day", "hour", "minute"),
    ("year", "month", "day", "hhmm"),
    ("year", "month", "day", "hour"),
    ("year", "month", "day"),
    ("year", "day_of_year", "hhmm"),
    ("year", "day_of_year", "hour"),
    ("year", "day_of_year"),
)
_BOUNDS = {
    "year": (1950, 2100), "month": (1, 12), "day": (1, 31), "day_of_year": (1, 367),
    "hour": (0, 24), "minute": (0, 59), "hhmm": (0, 2400), "second": (0, 59),
}  # fmt: skip
_TEXT_ROLES = ("instant", "date", "time")
_SHAKES_S = 20  # a logger's clock may stamp a row this much early or late
_FEW_ODD = 0.9  # of the cells must be as expected; the rest may be junk
CLOCK_ROLES = ("instant", "time", "hhmm", "hour", "serial", "epoch")


@dataclass(frozen=True)
class When:
    """The columns that say when (order still open), and what the names add."""

    layout: TimeLayout
    starts: bool
    utc: bool
    why: str


def find_when(table: Table) -> When:
    """Date and time columns of a table; IntakeError when no column says when."""
    columns = [[row[i] for row in table.rows[:400] if row[i]] for i in range(table.width)]
    words = [" ".join(plain_words(name)) for name in table.names]
    found = (
        _from_texts(columns, words)
        or _from_named_parts(columns, words)
        or _from_one_number(columns, words)
        or _from_unnamed_parts(table, columns)
    )
    if not found:
        raise IntakeError(
            "No column says when. A column with dates is needed (or year, month and day, or year "
            "and day of year); name it 'date' and send the file again."
        )
    layout, why = found
    taken = [words[c.position] for c in layout.columns]
    said = [*taken, *(table.units[c.position].lower() for c in layout.columns)]
    utc = any(_UTC.search(" ".join(plain_words(text))) for text in said)
    return When(layout, any(_START.search(text) for text in taken), utc, why)


def _layout(*columns: tuple[int, TimeRole]) -> TimeLayout:
    return TimeLayout(columns=[TimeColumn(position=i, role=role) for i, role in columns])


def _from_texts(columns: list[list[str]], words: list[str]) -> tuple[TimeLayout, str] | None:
    dates = [i for i, cells in enumerate(columns) if _mostly(cells, "date")]
    times = [i for i, cells in enumerate(columns) if _mostly(cells, "time")]
    if not dates:
        return None
    dates.sort(key=lambda i: (not _SAYS_WHEN.search(words[i]), i))
    date = dates[0]
    if _has_clock(columns[date]):
        return _layout((date, "instant")), "the column holds dates with a clock time"
    if times:
        return _layout(
            (date, "date"), (times[0], "time")
        ), "one column holds dates, one clock times"
    for i, name in enumerate(words):
        role = _named_role(name, columns[i])
        if i != date and role in ("hhmm", "hour"):
            minute = [
                (j, "minute")
                for j, other in enumerate(words)
                if role == "hour" and _named_role(other, columns[j]) == "minute"
            ]
            return (
                _layout((date, "date"), (i, role), *minute[:1]),  # type: ignore[arg-type]
                "one column holds dates, another by its name clock times",
            )
    return _layout((date, "date")), "the column holds dates without a clock time"


def _mostly(cells: list[str], kind: str) -> bool:
    told = [kind_of(cell) for cell in cells[:200]]
    told = [found for found in told if found != "missing"]
    return len(told) > 0 and told.count(kind) >= 0.7 * len(told)


def _has_clock(cells: list[str]) -> bool:
    return sum(
        bool(re.search(r"\d[T,\s]+\d{1,2}[:h]|\dT\d{4}", cell)) for cell in cells
    ) > 0.5 * len(cells)


def _named_role(name: str, cells: list[str]) -> TimeRole | None:
    if not cells:
        return None
    numbers = _numbers(cells)
    if numbers is None:
        return None
    for role, rule in _WORD_RULES:
        if not rule.match(name):
            continue
        low, high = _BOUNDS[role]
        if np.mean((numbers >= low) & (numbers <= high)) < _FEW_ODD:
            continue
        if role == "hhmm" and np.mean(numbers <= 24) >= _FEW_ODD:
            role = "hour"
        return role
    return None


def _numbers(cells: list[str]) -> Floats | None:
    """Figures of a column; None when more than a few cells are none."""
    given = [cell for cell in cells if kind_of(cell) != "missing"]
    values = np.array([_number(cell) for cell in given if kind_of(cell) == "number"])
    values = values[np.isfinite(values)]
    return values if values.size and values.size >= _FEW_ODD * len(given) else None


def _from_named_parts(columns: list[list[str]], words: list[str]) -> tuple[TimeLayout, str] | None:
    roles: dict[TimeRole, int] = {}
    for i, name in enumerate(words):
        role = _named_role(name, columns[i])
        if role and role not in roles:
            roles[role] = i
    if "year" not in roles:
        return None
    if "day" in roles and "month" not in roles and "day_of_year" not in roles:
        roles["day_of_year"] = roles.pop("day")
    if "month" in roles and "day" in roles:
        kept: list[TimeRole] = ["year", "month", "day"]
    elif "day_of_year" in roles:
        kept = ["year", "day_of_year"]
    else:
        return None
    if "hhmm" in roles and "hour" not in roles:
        kept.append("hhmm")
    else:
        kept += [role for role in ("hour", "minute", "second") if role in roles]
    why = "the names say " + ", ".join(role.replace("_", " ") for role in kept)
    return _layout(*((roles[role], role) for role in kept)), why


def _from_one_number(columns: list[list[str]], words: list[str]) -> tuple[TimeLayout, str] | None:
    named = [i for i, name in enumerate(words) if _SAYS_WHEN.search(name)]
    for i in [*named, *([0] if 0 not in named else [])]:
        cells = columns[i][:200]
        values = _numbers(cells) if cells else None
        if values is None:
            continue
        low, high = float(values.min()), float(values.max())
        running_on = [cell for cell in cells if _RUN_ON.fullmatch(cell)]
        if len(running_on) >= _FEW_ODD * len(cells):
            role: TimeRole = "date" if len(running_on[0]) == 8 else "instant"
            return _layout((i, role)), "figures run on as year, month, day"
        rising = np.count_nonzero(np.diff(values) > 0) >= 0.8 * max(values.size - 1, 0)
        if not rising or (i not in named and values.size < 5):
            continue
        if (low >= 3.0e8 and high <= 4.0e9) or (low >= 3.0e11 and high <= 4.0e12):
            return _layout((i, "epoch")), "the figures fit seconds since 1970"
        if low >= 20000 and high <= 80000 and high - low < 40000:
            return _layout((i, "serial")), "the figures fit the day numbers of spreadsheets"
    return None


def _from_unnamed_parts(table: Table, columns: list[list[str]]) -> tuple[TimeLayout, str] | None:
    for roles in _UNNAMED:
        if len(roles) >= table.width:
            continue
        fitting = True
        for i, role in enumerate(roles):
            values = _numbers(columns[i]) if columns[i] else None
            low, high = _BOUNDS[role]
            fitting &= values is not None and bool(
                np.mean((values >= low) & (values <= high) & (values % 1 == 0)) >= _FEW_ODD
            )
        if not fitting:
            continue
        layout = _layout(*enumerate(roles))
        times = sample_times(table, layout)
        if times.size > 1 and np.mean(np.diff(times) > 0) >= 0.95:
            return layout, "the first figures fit " + ", ".join(r.replace("_", " ") for r in roles)
    return None


def sample_times(table: Table, layout: TimeLayout, most: int = 2000) -> Instants:
    """Local seconds of the sample rows whose date can be read."""
    rows = table.rows[:most]
    columns = {}
    for column in layout.columns:
        place = column.position  # of a mapping written by hand it may lie beyond the row
        cells = [row[place] if place < len(row) else "" for row in rows]
        if column.role in _TEXT_ROLES:
            columns[column.position] = np.array([cell.encode() for cell in cells], dtype="S")
        else:
            columns[column.position] = np.array([_number(cell) for cell in cells])
    times = read_times(layout, columns, len(rows))
    return np.asarray(times.local[times.why == 0], np.int64)


def _number(cell: str) -> float:
    try:
        return float(cell.replace(",", "."))
    except ValueError:
        return float("nan")


def usual_step(times: Instants) -> tuple[int, float]:
    """Most common step between instants [s] and its share of all; (0, 0) with one instant."""
    steps = np.diff(np.unique(times))
    if steps.size == 0:
        return 0, 0.0
    step, count = Counter(steps.tolist()).most_common(1)[0]
    middle = int(np.median(steps))
    if count < 0.5 * steps.size and middle >= 60:  # a clock that shakes by seconds
        minute = round(middle / 60) * 60
        near = np.abs(steps - minute) <= _SHAKES_S
        if np.mean(near) > 0.5:
            return minute, float(np.mean(near))
    return int(step), count / steps.size


def has_clock(layout: TimeLayout) -> bool:
    """Whether rows state a clock time, not only a date."""
    return any(column.role in CLOCK_ROLES for column in layout.columns)


def order_matters(table: Table, layout: TimeLayout) -> bool:
    """Whether the dates are of the kind whose order the figures alone do not tell."""
    for column in layout.columns:
        if column.role in ("instant", "date"):
            cells = [row[column.position] for row in table.rows[:200] if row[column.position]]
            return any(re.match(r"\s*\d{1,2}\s*[-/. ]\s*\d{1,2}\s*[-/. ]", cell) for cell in cells)
    return False
