"""Rows a logger pushes: written down as a canonical CSV and taken in as any file is.

Each push is an intake with its bytes kept, so that readings name their line and a push can be
undone. The same rows again change nothing, for the fold is by instant, and leave no intake.
"""

import csv
import hashlib
import io
from collections.abc import Mapping as Map
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime

from app.errors import InputError
from app.intake import Mapping, Problem
from app.intake.model import ColumnMap, TimeColumn, TimeLayout
from app.science.quantities import QUANTITIES
from app.storage import book, intakes
from app.storage.database import Database
from app.storage.tables import Station
from app.units import UNITS, fits, units_for
from app.workflows import take_in
from app.workflows.take_in import Applied, TakeInError

MOST_ROWS = 5000
YEARS = (1980, 2200)
HEADER_LINES = 1


@dataclass(frozen=True)
class PushedRow:
    """One row: the instant its interval ends, with offset, and values in the stated units."""

    at: datetime
    values: Map[str, float | None]


class PushError(InputError):
    """A push that cannot be taken: which row and quantity, the value, and the remedy."""

    def __init__(self, says: str, field: str, value: str, remedy: str) -> None:
        super().__init__(f"{says} {remedy}")
        self.says, self.field, self.value, self.remedy = says, field, value, remedy


@dataclass(frozen=True)
class Pushed:
    """What a push did: its intake, and the cells that were refused (row = line - 1).

    Of a push that brings nothing new, the intake is the earlier one with the same bytes, if any.
    """

    intake_id: int | None
    applied: Applied
    problems: tuple[Problem, ...]


def push_readings(
    db: Database,
    station_key: str,
    rows: Sequence[PushedRow],
    units: Map[str, str],
    interval_s: int,
    who: str,
    today: date,
) -> Pushed:
    """Take rows in; ledgers and advice follow in the same transaction. Raises PushError.

    Arguments: `units`, the unit of each quantity that occurs; `interval_s`, what one row covers
    [s], 1 to 86400. A cell outside its quantity's plausible range is left out and reported.
    """
    check(rows, units)
    names = sorted(units)
    name = f"{intakes.PUSHED}{rows[0].at.astimezone(UTC):%Y%m%dT%H%M%SZ}-{len(rows)}.csv"
    content = canonical_csv(rows, units)
    try:
        number = take_in.receive(
            db, station_key, name, io.BytesIO(content), who,
            mapping_of(names, units, interval_s), as_stated=True, today=today,
        )  # fmt: skip
        seen = take_in.preview_of(db, number)
        if seen.rows_ahead:
            take_in.discard(db, number, who)
            late = seen.problems[0]
            raise PushError(
                f"{seen.rows_ahead} rows are dated after now, the first at {late.value}.",
                f"rows.{late.line - HEADER_LINES}.at", late.value,
                "Set the logger's clock, or its offset, and send them again.",
            )  # fmt: skip
        if seen.message or not seen.rows_accepted:
            take_in.discard(db, number, who)
            first = seen.problems[0] if seen.problems else None
            raise PushError(
                "No row of the push could be taken.",
                f"rows.{first.line - HEADER_LINES}.{first.column}" if first else "rows",
                first.value if first else "",
                f"{first.why}; {first.remedy}" if first else seen.message or "Send values.",
            )
        applied = take_in.apply(db, number, who, today, keep_same=False)
    except TakeInError as error:
        raise PushError(str(error), "station", station_key, "Nothing was stored.") from None
    left_out = tuple(item for item in seen.problems if item.severity == "refused")
    intake = _earlier(db, station_key, content) if applied.already_here else number
    return Pushed(intake, applied, left_out)


def _earlier(db: Database, station_key: str, content: bytes) -> int | None:
    with db.read() as session:
        station = book.find(session, Station, station_key)
        assert station is not None
        digest = hashlib.sha256(content).hexdigest()
        return intakes.applied_with_bytes(session, station.id, digest)


def check(rows: Sequence[PushedRow], units: Map[str, str]) -> None:
    """Refuse what no reading of the rows could mend; raises PushError. Rows count from 1."""
    if not 1 <= len(rows) <= MOST_ROWS:
        raise PushError(
            f"The push has {len(rows)} rows.", "rows", str(len(rows)),
            f"Send 1 to {MOST_ROWS} rows at a time.",
        )  # fmt: skip
    for quantity, unit in units.items():
        if quantity not in QUANTITIES:
            raise PushError(
                f"There is no quantity {quantity[:60]!r}.", f"units.{quantity[:60]}", unit[:60],
                f"The quantities are: {', '.join(QUANTITIES)}.",
            )  # fmt: skip
        if unit not in UNITS or not fits(unit, quantity):
            there = ", ".join(item.name for item in units_for(quantity))
            raise PushError(
                f"{unit[:60]!r} is no unit of {quantity}.", f"units.{quantity}", unit[:60],
                f"Its units are: {there}.",
            )  # fmt: skip
    first_of: dict[datetime, int] = {}
    for number, row in enumerate(rows, 1):
        for quantity in row.values:
            if quantity not in units:
                raise PushError(
                    f"Row {number} has {quantity[:60]!r}, whose unit is not stated.",
                    f"rows.{number}.{quantity[:60]}", str(row.values[quantity]),
                    "State the unit of every quantity in `units`.",
                )  # fmt: skip
        _check_instant(number, row.at, first_of)


def _check_instant(number: int, at: datetime, first_of: dict[datetime, int]) -> None:
    remedy = ""
    if at.tzinfo is None:
        remedy = "Give the offset, as in 2026-07-13T10:10:00-07:00."
    elif not YEARS[0] <= at.year <= YEARS[1]:
        remedy = f"Give a year between {YEARS[0]} and {YEARS[1]}."
    elif at.microsecond:
        remedy = "Give whole seconds."
    elif first_of.setdefault(at, number) != number:
        remedy = f"Row {first_of[at]} has the same instant; send each once."
    if remedy:
        raise PushError(
            f"Row {number} is at {at.isoformat()}.", f"rows.{number}.at", at.isoformat(), remedy
        )


def canonical_csv(rows: Sequence[PushedRow], units: Map[str, str]) -> bytes:
    """The rows as they are kept: instant in UTC, then the quantities in order of their names."""
    names = sorted(units)
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(["time", *(f"{name} ({units[name]})" for name in names)])
    for row in rows:
        values = (row.values.get(name) for name in names)
        cells = ("" if value is None else repr(float(value)) for value in values)
        writer.writerow([f"{row.at.astimezone(UTC):%Y-%m-%d %H:%M:%S}", *cells])
    return text.getvalue().encode()


def mapping_of(names: Sequence[str], units: Map[str, str], interval_s: int) -> Mapping:
    """How the canonical CSV is read; nothing in it is left open."""
    return Mapping(
        encoding="utf-8",
        delimiter=",",
        decimal=".",
        header_line=HEADER_LINES,
        first_data_line=HEADER_LINES + 1,
        time=TimeLayout(columns=[TimeColumn(position=0, role="instant")], order="ymd"),
        row_time="end",
        time_zone="UTC",
        interval_s=interval_s,
        missing=[""],
        columns=[
            ColumnMap(position=0, name="time"),
            *(
                ColumnMap(
                    position=place, name=f"{name} ({units[name]})", quantity=name, unit=units[name]
                )
                for place, name in enumerate(names, 1)
            ),
        ],
        signature=f"push:{interval_s}:{','.join(names)}"[:200],
    )
