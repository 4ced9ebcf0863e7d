"""Exports as CSV, streamed: the caution and the units in the header, SI throughout.

A text cell that a spreadsheet would take for a formula is led by an apostrophe.
"""

import csv
import io
from collections.abc import Iterable, Iterator
from datetime import date
from difflib import get_close_matches
from typing import Any

from sqlalchemy import select

from app.errors import InputError
from app.storage import book, exports
from app.storage.database import Database
from app.storage.scope import Farms
from app.storage.tables import WHOLE, Field, Station
from app.wording import CAUTION

FORMULA = ("=", "+", "-", "@", "\t", "\r", "\n")


class ExportError(InputError):
    """There is nothing of that name to export."""


def ledger_csv(db: Database, field_key: str, block_key: str | None = None) -> Iterator[str]:
    """Every ledger column of a field's blocks, or of one; raises ExportError."""
    with db.read() as session:
        blocks = exports.blocks_of(session, field_key)
        fields = [] if blocks else sorted(book.keys_of(session, Field))
    chosen = [number for number, key in blocks if block_key in (None, key)]
    lead = 0 if len(blocks) > 1 else 1  # a field that is one whole does not speak of blocks
    if not blocks:
        raise ExportError(f"There is no field {field_key!r}{_near(field_key, fields)}.")
    if not chosen:
        there = ", ".join(key for _, key in blocks if key != WHOLE) or "none, it is one whole"
        raise ExportError(
            f"There is no field {field_key!r} with a block {block_key!r}; its blocks are: {there}."
        )

    def rows() -> Iterator[str]:
        with db.read() as session:
            yield from _csv(
                f"Ledger of {field_key}; mm of water, MJ m-2 a day, m of root depth",
                ("block", "date", *exports.LEDGER_COLUMNS)[lead:],
                (row[lead:] for row in exports.ledger_rows(session, chosen)),
            )

    return rows()


def station_days_csv(db: Database, station_key: str) -> Iterator[str]:
    """Every column of a station's days; raises ExportError."""
    with db.read() as session:
        if session.scalar(select(Station.id).where(Station.key == station_key)) is None:
            near = _near(station_key, sorted(book.keys_of(session, Station)))
            raise ExportError(f"There is no station {station_key!r}{near}.")

    def rows() -> Iterator[str]:
        with db.read() as session:
            yield from _csv(
                f"Days of {station_key}; degC, %, kPa, m s-1 at 2 m, mm, MJ m-2 a day",
                ("date", *exports.STATION_COLUMNS),
                exports.station_rows(session, station_key),
            )

    return rows()


def advice_csv(db: Database, on: date, farms: Farms = None) -> Iterator[str]:
    """The advice that stands for a morning, of some farms if given."""
    with db.read() as session:
        yield from _csv(
            f"Advice of {on}; mm, hours, m3",
            ("farm", "field", "field_key", "block", *exports.ADVICE_COLUMNS),
            exports.advice_rows(session, on, farms),
        )


def _near(key: str, there: list[str]) -> str:
    """A word on the keys there are: near ones, else the first few."""
    near = get_close_matches(key, there, n=5) or [name for name in there if key in name][:5]
    if near:
        return f"; near: {', '.join(near)}"
    more = ", ..." if len(there) > 12 else ""
    return f"; there are: {', '.join(there[:12]) or 'none yet'}{more}"


def _csv(title: str, names: Iterable[str], rows: Iterable[tuple[Any, ...]]) -> Iterator[str]:
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    buffer.write(f"# {title}\n# {CAUTION}\n")
    writer.writerow(list(names))
    for number, row in enumerate(rows, 1):
        writer.writerow([_cell(value) for value in row])
        if number % 200 == 0:
            yield _drained(buffer)
    yield _drained(buffer)


def _drained(buffer: io.StringIO) -> str:
    text = buffer.getvalue()
    buffer.seek(0)
    buffer.truncate()
    return text


def _cell(value: Any) -> Any:
    if isinstance(value, float):
        return f"{value:.6g}"
    if isinstance(value, str) and value.startswith(FORMULA):
        return f"'{value}"
    return "" if value is None else value
