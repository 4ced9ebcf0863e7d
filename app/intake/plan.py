"""What parsing needs of a mapping, and what it gives back for one block."""

from dataclasses import dataclass

import numpy as np

from app.intake.dates import Texts
from app.intake.missing import missing_for
from app.intake.model import Floats, Ints, Mapping

WIDEST_DATE = 48
_TEXT_ROLES = ("instant", "date", "time")


@dataclass(frozen=True)
class Plan:
    """What `parse` needs to know of a mapping: which columns, which texts mean missing."""

    width: int
    delimiter: str
    decimal: str
    texts: tuple[int, ...]
    numbers: tuple[int, ...]
    names: dict[int, str]
    missing: dict[int, tuple[str, ...]]
    repeated: frozenset[str]
    first_data_line: int


@dataclass(frozen=True)
class Chunk:
    """Columns of the rows of one block: dates as bytes, figures as float64, NaN missing."""

    line: Ints
    columns: dict[int, Texts | Floats]

    @classmethod
    def joined(cls, parts: list["Chunk"]) -> "Chunk":
        """Chunks one after the other."""
        line = np.concatenate([part.line for part in parts])
        columns = {i: np.concatenate([part.columns[i] for part in parts]) for i in parts[0].columns}
        return cls(line, columns)

    @classmethod
    def empty(cls, plan: Plan) -> "Chunk":
        """No rows, all columns."""
        columns: dict[int, Texts | Floats] = {i: np.zeros(0, "S1") for i in plan.texts}
        columns.update({i: np.zeros(0) for i in plan.numbers})
        return cls(np.zeros(0, np.int32), columns)


def plan_of(mapping: Mapping, repeated: frozenset[str]) -> Plan:
    """The plan of a mapping whose questions are answered; `repeated`: the lines above the table."""
    texts = {c.position for c in mapping.time.columns if c.role in _TEXT_ROLES}
    numbers = {c.position for c in mapping.time.columns} - texts
    for column in mapping.columns:
        if column.quantity is not None:
            numbers.add(column.position)
            if column.needs_body and column.body_position is not None:
                numbers.add(column.body_position)
    names = {column.position: column.name for column in mapping.columns}
    width = max([len(mapping.columns), *(p + 1 for p in texts | numbers)])
    return Plan(
        width,
        mapping.delimiter,
        mapping.decimal,
        tuple(sorted(texts)),
        tuple(sorted(numbers - texts)),
        {i: names.get(i, f"column {i + 1}") for i in range(width)},
        {position: missing_for(mapping, position) for position in numbers},
        repeated,
        mapping.first_data_line,
    )
