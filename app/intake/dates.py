"""Dates and times of many layouts as seconds, whole columns at a time.

Texts are grouped by shape (digits alike, everything else as it stands); one regular expression a
shape finds where the figures stand, and numpy reads them for all rows of that shape at once.
"""

import re
from collections.abc import Mapping as MappingOf
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from app.intake.model import Floats, Instants, TimeLayout

Texts = NDArray[np.bytes_]
OK, NOT_A_DATE, NO_SUCH_DAY, NO_SUCH_TIME = 0, 1, 2, 3
WHY = {
    NOT_A_DATE: "this is no date in the layout chosen",
    NO_SUCH_DAY: "there is no such day",
    NO_SUCH_TIME: "there is no such time of day",
}
_MOST_SHAPES = 64
_SERIAL_ZERO = -25569  # days from 1970-01-01 to 1899-12-30
_SNAP_S = 5  # a fraction of a day this near a whole minute means the minute
_DAY = 86400

_TIME = (
    r"(?P<H>\d{1,2})(?::(?P<M>\d{1,2})(?::(?P<S>\d{2})(?:[.,]\d*)?)?|h(?P<M2>\d{2})?)?"
    r"\s*(?P<ap>[AaPp]\.?\s?[Mm]\.?)?"
    r"\s*(?P<z>Z|z|UTC|GMT|(?P<zs>[+-])(?P<zh>\d{2}):?(?P<zm>\d{2})?)?"
)
_DATE = (
    r"(?:(?P<a>\d{1,4})\s*[-/. ]\s*(?P<b>\d{1,2}|[A-Za-z]{3,10}\.?)\s*[-/., ]\s*(?P<c>\d{1,4})"
    r"|(?P<mon>[A-Za-z]{3,10})\.?\s+(?P<d>\d{1,2}),?\s+(?P<y>\d{4}))"
)
_PATTERNS = {
    "date": re.compile(rf"\s*(?:{_DATE}|(?P<ymd>\d{{8}}))(?:[T\s]+00?:00(?::00)?(?:\.0*)?)?\s*"),
    "time": re.compile(rf"\s*{_TIME}\s*"),
    "instant": re.compile(
        rf"\s*(?:{_DATE}(?:[T,\s]+{_TIME})?"
        r"|(?P<ymd>\d{8})(?:[T\s-]?(?P<hm>\d{4}|\d{6}))?(?P<z2>Z)?)\s*"
    ),
}
_MONTHS = {
    name[:3]: number
    for number, names in enumerate(
        ("jan ene", "feb", "mar", "apr abr", "may mai", "jun", "jul", "aug ago", "sep set",
         "oct okt", "nov", "dec dic dez"),
        start=1,
    )
    for name in names.split()
}  # fmt: skip


@dataclass(frozen=True)
class Times:
    """Local seconds since 1970-01-01, the offset a text itself states [s, NaN none], and a code."""

    local: Instants
    offset_s: Floats
    why: NDArray[np.int8]


def read_times(layout: TimeLayout, columns: MappingOf[int, Texts | Floats], size: int) -> Times:
    """Local time of each row from its date and time columns (bytes for texts, float64 else)."""
    local = np.zeros(size, np.int64)
    offset = np.full(size, np.nan)
    why = np.zeros(size, np.int8)
    parts: dict[str, Floats] = {}
    for column in layout.columns:
        values = columns[column.position]
        if column.role in ("instant", "date", "time"):
            seconds, stated, code = read_text(
                values.astype("S") if values.dtype.kind != "S" else values,  # type: ignore[arg-type]
                column.role,
                layout.order,
            )
            local += seconds
            offset = np.where(np.isnan(stated), offset, stated)
            why = np.maximum(why, code)
        else:
            parts[column.role] = np.asarray(values, np.float64)
    if parts:
        seconds, code = _from_numbers(parts, size)
        local += seconds
        why = np.maximum(why, code)
        if "epoch" in parts:
            offset = np.zeros(size)
    return Times(local, offset, why)


def read_text(
    values: Texts, role: str, order: str | None
) -> tuple[Instants, Floats, NDArray[np.int8]]:
    """Seconds, stated offset [s] and code of each text; order decides 01/02/03, names need none."""
    size, width = values.size, max(values.dtype.itemsize, 1)
    seconds, offset = np.zeros(size, np.int64), np.full(size, np.nan)
    why = np.full(size, NOT_A_DATE, np.int8)
    raw = np.ascontiguousarray(values).view(np.uint8).reshape(size, width)
    digit = (raw >= 48) & (raw <= 57)
    shapes = np.where(digit, np.uint8(48), raw).view(f"S{width}").ravel()
    left = np.arange(size)
    for _ in range(_MOST_SHAPES):
        if left.size == 0:
            break
        shape = shapes[left[0]]
        same = shapes[left] == shape
        rows = left[same]
        left = left[~same]
        found = _places(bytes(shape).decode("latin-1"), role, order)
        if found is not None:
            seconds[rows], offset[rows], why[rows] = _read_shape(raw[rows], found)
    return seconds, offset, why


@lru_cache(maxsize=1024)
def _places(shape: str, role: str, order: str | None) -> dict[str, tuple[int, int] | int] | None:
    """Where the figures stand in a shape; plain numbers for what is the same in all its rows."""
    match = _PATTERNS[role].fullmatch(shape)
    if not match:
        return None
    groups = {key: match.span(key) for key, text in match.groupdict().items() if text is not None}
    found: dict[str, tuple[int, int] | int] = {}
    if role != "time":
        date = _date_places(groups, shape, order)
        if date is None:
            return None
        found.update(date)
    if "hm" in groups:
        i, j = groups["hm"]
        found.update(H=(i, i + 2), M=(i + 2, i + 4))
        if j - i == 6:
            found["S"] = (i + 4, j)
    for key, group in (("H", "H"), ("M", "M"), ("M", "M2"), ("S", "S")):
        if group in groups:
            found[key] = groups[group]
    if role == "time" and not {"M", "ap"} & {*found, *groups}:
        return None
    if "ap" in groups:
        found["half"] = 12 if shape[groups["ap"][0]] in "pP" else 0
    if "zs" in groups:
        found["sign"] = -1 if shape[groups["zs"][0]] == "-" else 1
        found["zh"] = groups["zh"]
        if "zm" in groups:
            found["zm"] = groups["zm"]
    elif "z" in groups or "z2" in groups:
        found["sign"] = 0
    return found


def _date_places(
    groups: dict[str, tuple[int, int]], shape: str, order: str | None
) -> dict[str, tuple[int, int] | int] | None:
    if "ymd" in groups:
        i = groups["ymd"][0]
        return {"y": (i, i + 4), "m": (i + 4, i + 6), "d": (i + 6, i + 8)}
    if "mon" in groups:
        month = _MONTHS.get(shape[slice(*groups["mon"])][:3].lower())
        return {"y": groups["y"], "m": month, "d": groups["d"]} if month else None
    a, b, c = groups["a"], groups["b"], groups["c"]
    long = [span for span in (a, c) if span[1] - span[0] > 2]
    if len(long) == 2 or any(span[1] - span[0] == 3 for span in (a, c)):
        return None
    if shape[b[0]].isalpha():
        month = _MONTHS.get(shape[slice(*b)][:3].lower())
        if month is None:
            return None
        return {"y": a, "m": month, "d": c} if a in long else {"y": c, "m": month, "d": a}
    if a in long or (not long and order == "ymd"):
        return {"y": a, "m": b, "d": c}
    if order == "mdy":
        return {"y": c, "m": a, "d": b}
    if order == "dmy":
        return {"y": c, "m": b, "d": a}
    return None


def _read_shape(
    raw: NDArray[np.uint8], found: dict[str, tuple[int, int] | int]
) -> tuple[Instants, Floats, NDArray[np.int8]]:
    figures = {key: _figure(raw, place) for key, place in found.items()}
    size = raw.shape[0]
    seconds, why = np.zeros(size, np.int64), np.zeros(size, np.int8)
    if "y" in figures:
        year = figures["y"]
        place = found["y"]
        if isinstance(place, tuple) and place[1] - place[0] <= 2:
            year = year + np.where(year < 70, 2000, 1900)
        days, good = days_of(year, figures["m"], figures["d"])
        seconds = days * _DAY
        why[~good] = NO_SUCH_DAY
    if "H" in figures:
        zero = np.zeros(size, np.int64)
        hour, minute = figures["H"], figures.get("M", zero)
        second = figures.get("S", zero)
        good = (minute < 60) & (second < 60)
        if "half" in figures:
            good &= (hour >= 1) & (hour <= 12)
            hour = hour % 12 + figures["half"]
        good &= (hour < 24) | ((hour == 24) & (minute == 0) & (second == 0))
        seconds = seconds + hour * 3600 + minute * 60 + second
        why[(why == OK) & ~good] = NO_SUCH_TIME
    offset = np.full(size, np.nan)
    if "sign" in figures:
        hours = figures.get("zh", np.zeros(size, np.int64)) * 3600
        offset = figures["sign"] * (hours + figures.get("zm", 0 * hours) * 60.0)
    return seconds, offset, why


def _figure(raw: NDArray[np.uint8], place: tuple[int, int] | int) -> Instants:
    if isinstance(place, int):
        return np.full(raw.shape[0], place, np.int64)
    total = np.zeros(raw.shape[0], np.int64)
    for at in range(*place):
        total = total * 10 + (raw[:, at].astype(np.int64) - 48)
    return total


def days_of(year: Instants, month: Instants, day: Instants) -> tuple[Instants, NDArray[np.bool_]]:
    """Days since 1970-01-01 and whether the date exists between 1900 and 2199."""
    good = (year >= 1900) & (year < 2200) & (month >= 1) & (month <= 12) & (day >= 1)
    months = np.where(good, (year - 1970) * 12 + month - 1, 0)
    first = months.astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
    after = (months + 1).astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
    good &= day <= after - first
    return np.where(good, first + day - 1, 0), good


def _from_numbers(parts: dict[str, Floats], size: int) -> tuple[Instants, NDArray[np.int8]]:
    seconds, why = np.zeros(size, np.int64), np.zeros(size, np.int8)
    absent = np.zeros(size, bool)
    for values in parts.values():
        absent |= ~np.isfinite(values) | (np.abs(values) > 1e14)
    clean = {role: np.where(absent, 1.0, values) for role, values in parts.items()}
    why[absent] = NOT_A_DATE
    if "epoch" in clean:
        epoch = clean["epoch"]
        seconds += np.floor(np.where(np.abs(epoch) > 1e11, epoch / 1000.0, epoch)).astype(np.int64)
    if "serial" in clean:
        seconds += _snapped((clean["serial"] + _SERIAL_ZERO) * _DAY)
    if "year" in clean:
        added, code = _year_and_day(clean)
        seconds += added
        why = np.maximum(why, code)
    clock, code = _clock(clean, size)
    seconds += clock
    return seconds, np.maximum(why, code)


def _year_and_day(clean: dict[str, Floats]) -> tuple[Instants, NDArray[np.int8]]:
    year = clean["year"].astype(np.int64)
    year = year + np.where(year < 70, 2000, np.where(year < 100, 1900, 0))
    whole = clean["year"] % 1 == 0
    if "day_of_year" in clean:
        start, good = days_of(year, np.ones_like(year), np.ones_like(year))
        length = days_of(year + 1, np.ones_like(year), np.ones_like(year))[0] - start
        in_year = clean["day_of_year"] - 1
        # 31 December 24:00 may be written as the day after the last.
        good &= (in_year >= 0) & (in_year < length + 1e-9) & whole
        return start * _DAY + _snapped(in_year * _DAY), np.where(good, OK, NO_SUCH_DAY).astype("i1")
    ones = np.ones(year.size)
    month, day = clean.get("month", ones), clean.get("day", ones)
    days, good = days_of(year, month.astype(np.int64), day.astype(np.int64))
    good &= whole & (month % 1 == 0) & (day % 1 == 0)
    return days * _DAY, np.where(good, OK, NO_SUCH_DAY).astype("i1")


def _clock(clean: dict[str, Floats], size: int) -> tuple[Instants, NDArray[np.int8]]:
    hour, minute = clean.get("hour", np.zeros(size)), clean.get("minute", np.zeros(size))
    second = clean.get("second", np.zeros(size))
    if "hhmm" in clean:
        hour, minute = np.divmod(clean["hhmm"], 100)
    good = (hour >= 0) & (minute >= 0) & (minute < 60) & (second >= 0) & (second < 60)
    good &= hour * 3600 + minute * 60 + second <= _DAY
    total = np.where(good, hour * 3600 + minute * 60 + second, 0)
    return _snapped(total), np.where(good, OK, NO_SUCH_TIME).astype("i1")


def _snapped(seconds: Floats) -> Instants:
    minute = np.rint(seconds / 60) * 60
    near = np.abs(seconds - minute) <= _SNAP_S
    snapped = np.where(near & (seconds % 1 != 0), minute, np.floor(seconds + 1e-6))
    return snapped.astype(np.int64)
