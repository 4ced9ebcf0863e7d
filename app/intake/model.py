"""What passes between the steps of an intake: mapping, questions, rows, problems, days."""

import datetime as dt
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict, Field

Floats = NDArray[np.float64]
Instants = NDArray[np.int64]
Ints = NDArray[np.int32]
Progress = Callable[[int, int], None]
"""Called with (bytes done, bytes in all)."""

TimeRole = Literal[
    "instant",  # date and clock time in one text
    "date",  # date alone
    "time",  # clock time alone, as text with colons
    "hhmm",  # clock time alone, as a number: 1430, 2400
    "year",
    "month",
    "day",
    "day_of_year",  # 1-366, a fraction counts as clock time
    "hour",  # 0-24, a fraction counts
    "minute",
    "second",
    "serial",  # days since 1899-12-30 with fraction, as spreadsheets store dates
    "epoch",  # seconds (or thousandths of a second) since 1970-01-01 UTC
]
DateOrder = Literal["ymd", "dmy", "mdy"]
RowTime = Literal["end", "start"]


@dataclass(frozen=True)
class Clock:
    """The station's clock: fixed standard offset [h] and, where known, its civil time zone."""

    utc_offset_h: float
    time_zone: str | None = None


MOST_COLUMNS = 20_000


class _Strict(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)


class TimeColumn(_Strict):
    """One column that says when."""

    position: int = Field(ge=0, lt=MOST_COLUMNS, description="0-based place in the row")
    role: TimeRole


class TimeLayout(_Strict):
    """How the columns of a row say when. `order` is None while day and month are undecided."""

    columns: list[TimeColumn]
    order: DateOrder | None = None


class ColumnMap(_Strict):
    """What one column of the file means. `quantity` None: leave out."""

    position: int = Field(ge=0, lt=MOST_COLUMNS, description="0-based place in the row")
    name: str
    quantity: str | None = Field(default=None, description="canonical name, see science/quantities")
    unit: str | None = Field(default=None, description="unit in the file, a name of app.units")
    factor: float = Field(default=1.0, description="multiplies the value in the file's unit")
    offset: float = Field(default=0.0, description="then added, in the file's unit")
    height_m: float | None = Field(default=None, description="height read from the name")
    needs_body: bool = Field(
        default=False, description="longwave to which sigma T^4 of its body must be added"
    )
    body_position: int | None = Field(
        default=None,
        ge=0,
        lt=MOST_COLUMNS,
        description="the column of that body temperature, None while undecided",
    )


class Mapping(_Strict):
    """Everything needed to read a file the same way again; JSON-able, remembered per station."""

    encoding: str
    delimiter: str = Field(description="',' ';' '|' 'tab' or 'blanks'")
    decimal: Literal[".", ","]
    header_line: int | None = Field(description="1-based line of the names, None without")
    first_data_line: int = Field(ge=1)
    time: TimeLayout
    row_time: RowTime | None = Field(description="None while undecided")
    time_zone: str = Field(default="station", description="'station', 'UTC' or an IANA name")
    interval_s: int | None = Field(
        ge=1, le=86400, description="step between rows [s], None while undecided"
    )
    missing: list[str]
    columns: list[ColumnMap]
    signature: str = Field(max_length=500, description="fingerprint of the header")

    def column(self, position: int) -> ColumnMap | None:
        """The column at `position`, None where the mapping has none."""
        return next((c for c in self.columns if c.position == position), None)


@dataclass(frozen=True)
class Choice:
    """One possible answer: what to store, and how to say it."""

    value: str
    label: str


@dataclass(frozen=True)
class Question:
    """Something only a person can settle; `field` is what `answer` takes, blocking stops `read`."""

    field: str
    asks: str
    choices: tuple[Choice, ...]
    why: str
    suggested: str | None = None
    blocking: bool = True


@dataclass(frozen=True)
class Sniffed:
    """What a first look found; examples and why are one entry per column, in file order."""

    mapping: Mapping
    questions: tuple[Question, ...]
    examples: tuple[tuple[str, ...], ...]
    why: tuple[str, ...]
    notes: tuple[str, ...] = ()
    remembered: bool = False


@dataclass(frozen=True)
class Rows:
    """Readings: `instant` [UTC s] is the END of the interval, sorted, unique with `interval_s`.

    All arrays have shape (rows,); `values` holds canonical quantities in canonical units, NaN
    where nothing was read. `line` is the 1-based line of the file the row came from.
    """

    instant: Instants
    line: Ints
    interval_s: Ints
    values: dict[str, Floats]

    def __len__(self) -> int:
        return int(self.instant.size)

    @classmethod
    def none(cls) -> "Rows":
        """No rows at all."""
        empty = np.zeros(0, np.int32)
        return cls(np.zeros(0, np.int64), empty, empty, {})


@dataclass(frozen=True)
class Problem:
    """What was not taken as it stands, and why. A run of lines has `count` and `last_line`."""

    line: int
    column: str
    value: str
    why: str
    remedy: str
    severity: Literal["refused", "warning", "asked"]
    count: int = 1
    last_line: int | None = None


@dataclass
class Counts:
    """How the lines of the file fell out."""

    lines: int = 0
    rows: int = 0
    rows_refused: int = 0
    cells_refused: int = 0
    missing: dict[str, int] = field(default_factory=dict)
    duplicates_same: int = 0
    duplicates_differing: int = 0
    out_of_order: int = 0
    repeated_headers: int = 0
    blank_lines: int = 0
    problems_not_listed: int = 0


@dataclass(frozen=True)
class Reading:
    """A file read: its rows, what was not taken, and the tally."""

    rows: Rows
    problems: tuple[Problem, ...]
    counts: Counts


@dataclass(frozen=True)
class DayPack:
    """One station day's rows, packed."""

    day: dt.date
    blob: bytes
    rows: int


@dataclass(frozen=True)
class DayNote:
    """What aggregation did to one quantity on one day.

    `what`: "missing" (reason says why), "filled", "set_aside", "offset", "clipped", "warned"
    (figure: how many intervals; for set_aside and warned `reason` is the name of the check).
    """

    day: dt.date
    quantity: str
    what: Literal["missing", "filled", "set_aside", "offset", "clipped", "warned"]
    figure: float
    reason: str
