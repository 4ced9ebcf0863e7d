"""Reads one handbook table into frozen rows and refuses what it cannot vouch for."""

import csv
import difflib
from collections.abc import Mapping
from dataclasses import Field, fields
from pathlib import Path
from types import MappingProxyType
from typing import Any, TypeVar, get_type_hints

FOLDER = Path(__file__).parent

Row = TypeVar("Row")


class UnknownEntryError(KeyError):
    """An identifier the handbook does not have; the message names near ones."""

    def __str__(self) -> str:
        return str(self.args[0])


class TableError(ValueError):
    """A handbook table that cannot be read; the message names file, line and column."""


def read_rows(file: str, row_type: type[Row]) -> list[Row]:
    """Rows of `file` (in this folder) as `row_type`, a frozen dataclass of str, int, float, bool
    and their optional forms; field metadata: `column` (if not the field's name), `low`, `high`.

    Raises TableError naming file, line and column for a missing column, an unreadable number, a
    number out of its range, or a blank where one is needed.
    """
    path = FOLDER / file
    hints = get_type_hints(row_type)
    columns = [spec for spec in fields(row_type) if spec.init]  # type: ignore[arg-type]
    rows = []
    with path.open(encoding="utf-8", newline="") as lines:
        reader = csv.DictReader(lines)
        for cells in reader:
            values = {}
            for spec in columns:
                name = spec.metadata.get("column", spec.name)
                where = f"{file}, line {reader.line_num}, column {name}"
                if cells.get(name) is None:
                    raise TableError(f"{where}: the column is missing")
                values[spec.name] = _value(cells[name].strip(), hints[spec.name], spec, where)
            rows.append(row_type(**values))
    if not rows:
        raise TableError(f"{file}: the table has no rows")
    return rows


def _value(text: str, wanted: Any, spec: "Field[Any]", where: str) -> Any:
    if wanted is str:
        return text
    if wanted is bool:
        if text not in ("yes", "no"):
            raise TableError(f"{where}: {text!r} is neither yes nor no")
        return text == "yes"
    if not text:
        if wanted in (int, float):
            raise TableError(f"{where}: blank, but a number is needed")
        return None
    whole = wanted in (int, int | None)
    try:
        number = int(text) if whole else float(text)
    except ValueError:
        kind = "whole number" if whole else "number"
        raise TableError(f"{where}: {text!r} is not a {kind}") from None
    low, high = spec.metadata.get("low", -1e9), spec.metadata.get("high", 1e9)
    if not low <= number <= high:
        raise TableError(f"{where}: {number:g} is not within {low:g} to {high:g}")
    return number


def keyed(rows: list[Row], key: str, file: str) -> Mapping[str, Row]:
    """Rows by their `key` field, read-only; TableError for one that appears twice."""
    found: dict[str, Row] = {}
    for row in rows:
        name = getattr(row, key)
        if name in found:
            raise TableError(f"{file}: {key} {name!r} appears twice")
        found[name] = row
    return MappingProxyType(found)


def entry(table: Mapping[str, Row], name: str, kind: str) -> Row:
    """The row of `name`, else UnknownEntryError with near matches."""
    if name in table:
        return table[name]
    known = list(table)
    wanted = name.lower().replace(" ", "_").replace("-", "_")
    near = [k for k in known if wanted and (wanted in k or k in wanted)]
    near += [k for k in difflib.get_close_matches(wanted, known, n=5, cutoff=0.5) if k not in near]
    hint = f"near: {', '.join(near[:5])}" if near else f"known: {', '.join(known[:12])}, ..."
    raise UnknownEntryError(f"no {kind} {name!r} in the handbook; {hint}")
