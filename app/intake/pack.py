"""One station day of rows as a small, deterministic blob, and back.

Layout of the blob: `MAGIC`, then zlib of a header (JSON, sorted keys) and the numbers. A column
whose values are all exactly a whole number over 1, 10, ... 10^4 is stored as those whole numbers
(int32, differences along the day); any other as float64 with its bytes transposed.
"""

import datetime as dt
import json
import struct
import zlib

import numpy as np
from numpy.typing import NDArray

from app.intake.errors import IntakeError
from app.intake.model import Clock, DayPack, Floats, Instants, Ints, Rows

MAGIC = b"RBD1"
_LENGTH = struct.Struct("<I")
_DECIMALS = 5  # 0 ... 4 decimals are tried
_AS_FLOAT = _DECIMALS
_ABSENT = np.int32(-(2**31))
_LARGEST = 2.0e9
_LEVEL = 3  # level 6 is twice as slow for 3 % less
SECONDS_A_DAY = 86400


def station_day(instant: Instants, interval_s: Ints, clock: Clock) -> Instants:
    """Station day each row belongs to [days since 1970-01-01]: the one its middle falls in.

    `instant` [UTC s] is the end of the interval; shape (rows,) in and out.
    """
    local_middle = instant - (interval_s + 1) // 2 + round(clock.utc_offset_h * 3600)
    return np.asarray(local_middle // SECONDS_A_DAY, np.int64)


def pack(rows: Rows, clock: Clock) -> list[DayPack]:
    """Split rows by station day and pack each day; a column without a value that day is dropped."""
    if len(rows) == 0:
        return []
    day = station_day(rows.instant, rows.interval_s, clock)
    if np.any(np.diff(day) < 0):
        order = np.argsort(day, kind="stable")
        day = day[order]
        rows = Rows(
            rows.instant[order],
            rows.line[order],
            rows.interval_s[order],
            {name: column[order] for name, column in rows.values.items()},
        )
    starts = np.flatnonzero(np.r_[True, np.diff(day) != 0])
    ends = np.r_[starts[1:], day.size]
    coded = {
        name: _code_column(rows.values[name], starts, ends - starts) for name in sorted(rows.values)
    }
    packs = []
    for place, (begin, end) in enumerate(zip(starts.tolist(), ends.tolist(), strict=True)):
        cut = slice(begin, end)
        columns: list[tuple[str, int, Ints | Floats]] = []
        for name, (whole, kinds) in coded.items():
            kind = int(kinds[place])
            if kind >= 0:
                column = rows.values[name] if kind == _AS_FLOAT else whole
                columns.append((name, kind, column[cut]))
        blob = _blob(rows.instant[cut], rows.line[cut], rows.interval_s[cut], columns)
        date = dt.date(1970, 1, 1) + dt.timedelta(days=int(day[begin]))
        packs.append(DayPack(date, blob, end - begin))
    return packs


def unpack(blob: bytes) -> Rows:
    """Rows of one packed day; IntakeError when the blob is damaged."""
    try:
        return _unpacked(blob)
    except (ValueError, KeyError, zlib.error, struct.error) as error:
        raise IntakeError(
            "A stored day of readings is damaged and cannot be opened; take the file in again."
        ) from error


def _code_column(
    values: Floats, starts: NDArray[np.intp], sizes: NDArray[np.intp]
) -> tuple[Ints, NDArray[np.int8]]:
    """Whole-number form of a column, and per day its decimals.

    The form is -1 where the day has no value at all and `_AS_FLOAT` where none is exact.
    """
    absent = np.isnan(values)
    kinds = np.full(starts.size, _AS_FLOAT, np.int8)
    coded = np.full(values.size, _ABSENT, np.int32)
    codable = (np.abs(values) < _LARGEST) & ~(np.signbit(values) & (values == 0.0))
    candidates = np.where(codable, values, 0.0)
    for decimals in range(_DECIMALS):
        scale = 10.0**decimals
        whole = np.rint(candidates * scale)
        fits = (codable & (whole / scale == values) & (np.abs(whole) < _LARGEST)) | absent
        exact = np.logical_and.reduceat(fits, starts) & (kinds == _AS_FLOAT)
        kinds[exact] = decimals
        rows = np.repeat(exact, sizes) & ~absent
        coded[rows] = whole[rows].astype(np.int32)
        if not (kinds == _AS_FLOAT).any():
            break
    kinds[np.logical_and.reduceat(absent, starts)] = -1
    return coded, kinds


def _blob(
    instant: Instants, line: Ints, interval_s: Ints, columns: list[tuple[str, int, Ints | Floats]]
) -> bytes:
    said = {
        "n": instant.size,
        "names": [name for name, _, _ in columns],
        "kinds": [kind for _, kind, _ in columns],
    }
    header = json.dumps(said, sort_keys=True).encode()
    parts = [_LENGTH.pack(len(header)), header, _steps(instant, "<i8"), _steps(line, "<i4")]
    parts.append(_steps(interval_s, "<i4"))
    for _, kind, column in columns:
        if kind == _AS_FLOAT:
            raw = np.frombuffer(column.astype("<f8").tobytes(), np.uint8)
            parts.append(raw.reshape(-1, 8).T.tobytes())
        else:
            parts.append(_steps(column, "<i4"))
    return MAGIC + zlib.compress(b"".join(parts), _LEVEL)


def _steps(whole: NDArray[np.generic], layout: str) -> bytes:
    """The first value and the differences from one to the next, which wrap around."""
    steps = whole.astype(layout)
    steps[1:] -= steps[:-1].copy()
    return steps.tobytes()


def _unpacked(blob: bytes) -> Rows:
    if blob[: len(MAGIC)] != MAGIC:
        raise ValueError("not a packed day")
    body = zlib.decompress(blob[len(MAGIC) :])
    (length,) = _LENGTH.unpack_from(body)
    at = _LENGTH.size + length
    header = json.loads(body[_LENGTH.size : at])
    n = int(header["n"])
    instant = np.cumsum(np.frombuffer(body, "<i8", n, at), dtype=np.int64)
    at += 8 * n
    line = np.cumsum(np.frombuffer(body, "<i4", n, at), dtype=np.int32)
    at += 4 * n
    interval_s = np.cumsum(np.frombuffer(body, "<i4", n, at), dtype=np.int32)
    at += 4 * n
    values: dict[str, Floats] = {}
    for name, kind in zip(header["names"], header["kinds"], strict=True):
        if kind == _AS_FLOAT:
            raw = np.frombuffer(body, np.uint8, 8 * n, at).reshape(8, n).T
            values[name] = np.frombuffer(raw.tobytes(), "<f8").astype(np.float64)
            at += 8 * n
        else:
            whole = np.cumsum(np.frombuffer(body, "<i4", n, at), dtype=np.int32)
            values[name] = np.where(whole == _ABSENT, np.nan, whole / 10.0**kind)
            at += 4 * n
    return Rows(instant, line, interval_s, values)
