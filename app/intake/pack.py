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
_LEVEL = 6
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
    order = np.argsort(day, kind="stable")
    starts = np.flatnonzero(np.r_[True, np.diff(day[order]) != 0])
    names = sorted(rows.values)
    coded, kinds = _code_columns(rows, names, order, starts)
    instants = rows.instant[order]
    lines, intervals = rows.line[order], rows.interval_s[order]
    packs = []
    for place, (begin, end) in enumerate(zip(starts, np.r_[starts[1:], order.size], strict=True)):
        cut = slice(int(begin), int(end))
        kept = [i for i in range(len(names)) if kinds[i, place] >= 0]
        blob = _blob(
            instants[cut],
            lines[cut],
            intervals[cut],
            [names[i] for i in kept],
            [int(kinds[i, place]) for i in kept],
            [
                rows.values[names[i]][order[cut]]
                if kinds[i, place] == _AS_FLOAT
                else coded[kinds[i, place]][i][cut]
                for i in kept
            ],
        )
        date = dt.date(1970, 1, 1) + dt.timedelta(days=int(day[order[begin]]))
        packs.append(DayPack(date, blob, int(end - begin)))
    return packs


def unpack(blob: bytes) -> Rows:
    """Rows of one packed day; IntakeError when the blob is damaged."""
    try:
        return _unpacked(blob)
    except (ValueError, KeyError, zlib.error, struct.error) as error:
        raise IntakeError(
            "A stored day of readings is damaged and cannot be opened; take the file in again."
        ) from error


def _code_columns(
    rows: Rows, names: list[str], order: NDArray[np.intp], starts: NDArray[np.intp]
) -> tuple[list[list[Ints]], NDArray[np.int8]]:
    """Whole-number forms by decimals and column, and per column and day which form is exact.

    The form is -1 where the day has no value at all and `_AS_FLOAT` where none is exact.
    """
    coded: list[list[Ints]] = [[] for _ in range(_DECIMALS)]
    kinds = np.full((len(names), starts.size), _AS_FLOAT, np.int8)
    for i, name in enumerate(names):
        values = rows.values[name][order]
        absent = np.isnan(values)
        for decimals in reversed(range(_DECIMALS)):
            whole = np.rint(values * 10.0**decimals)
            fits = (whole / 10.0**decimals == values) & (np.abs(whole) < _LARGEST) | absent
            fits &= ~(np.signbit(values) & (values == 0.0))
            exact = np.logical_and.reduceat(fits, starts)
            kinds[i, exact] = decimals
            whole[absent | ~fits] = _ABSENT
            coded[decimals].append(whole.astype(np.int32))
        kinds[i, np.logical_and.reduceat(absent, starts)] = -1
    return coded, kinds


def _blob(
    instant: Instants,
    line: Ints,
    interval_s: Ints,
    names: list[str],
    kinds: list[int],
    columns: list[NDArray[np.int32] | Floats],
) -> bytes:
    header = json.dumps({"n": instant.size, "names": names, "kinds": kinds}, sort_keys=True)
    parts = [_LENGTH.pack(len(header)), header.encode()]
    parts.append(np.diff(instant, prepend=0).astype("<i8").tobytes())
    parts.append(np.diff(line, prepend=np.int32(0)).astype("<i4").tobytes())
    parts.append(np.diff(interval_s, prepend=np.int32(0)).astype("<i4").tobytes())
    for kind, column in zip(kinds, columns, strict=True):
        if kind == _AS_FLOAT:
            raw = np.frombuffer(column.astype("<f8").tobytes(), np.uint8)
            parts.append(raw.reshape(-1, 8).T.tobytes())
        else:
            parts.append(np.diff(column, prepend=column.dtype.type(0)).astype("<i4").tobytes())
    return MAGIC + zlib.compress(b"".join(parts), _LEVEL)


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
