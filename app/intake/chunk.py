"""One block of lines to typed columns: typed at once, and only where that fails cell by cell."""

import io
import re
from collections.abc import Hashable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from app.intake.cells import DELIMITERS, split_line
from app.intake.dates import Texts
from app.intake.model import Floats, Ints, Mapping
from app.intake.report import Report
from app.intake.text import Block
from app.science.quantities import QUANTITIES
from app.units import to_si

_WIDEST_DATE = 48
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
        {position: _missing_for(mapping, position) for position in numbers},
        repeated,
        mapping.first_data_line,
    )


def parse(block: Block, plan: Plan, report: Report) -> Chunk:
    """Columns of one block; lines above the first data line are passed over."""
    skip = max(plan.first_data_line - block.first_line, 0)
    if skip >= block.lines:
        return _empty(plan)
    data, first_line, rows = block.data, block.first_line + skip, block.lines - skip
    if skip:
        data = data.split(b"\n", skip)[skip]
    report.counts.lines += rows
    return _typed(data, first_line, rows, plan, report) or _by_cell(data, first_line, plan, report)


def _typed(data: bytes, first_line: int, rows: int, plan: Plan, report: Report) -> Chunk | None:
    """All rows at once; None when any row or cell is not as it should be."""
    blanks = plan.delimiter == "blanks"
    mark = DELIMITERS[plan.delimiter]
    if b"\x00" in data or (not blanks and _occurrences(data, mark) != rows * (plan.width - 1)):
        return None
    types: dict[Hashable, str] = dict.fromkeys(range(plan.width), "S1")
    types.update(dict.fromkeys(plan.texts, f"S{_WIDEST_DATE}"))
    types.update(dict.fromkeys(plan.numbers, "float64"))
    missing: Any = {i: list(plan.missing[i]) for i in plan.numbers}
    try:
        frame = pd.read_csv(
            io.BytesIO(data),
            header=None,
            names=list(range(plan.width)),
            sep=r"\s+" if blanks else mark,
            decimal=plan.decimal,
            dtype=types,
            na_values=missing,
            keep_default_na=False,
            skip_blank_lines=False,
            skipinitialspace=not blanks and mark.encode() + b" " in data,
            encoding_errors="replace",
        )
    except (ValueError, OverflowError, pd.errors.ParserError):
        return None
    if len(frame) != rows or not isinstance(frame.index, pd.RangeIndex):
        return None
    if blanks and _short_rows(frame[plan.width - 1].to_numpy()):
        return None
    columns: dict[int, Texts | Floats] = {i: frame[i].to_numpy() for i in plan.texts}
    for i in plan.numbers:
        values = np.array(frame[i].to_numpy(), np.float64)
        if np.isinf(values).any():
            return None
        _blank_codes(values, plan.missing[i])
        columns[i] = values
        report.counts.missing[plan.names[i]] = report.counts.missing.get(plan.names[i], 0) + int(
            np.isnan(values).sum()
        )
    line = np.arange(first_line, first_line + rows, dtype=np.int32)
    return Chunk(line, columns)


def _occurrences(data: bytes, mark: str) -> int:
    return int(np.count_nonzero(np.frombuffer(data, np.uint8) == ord(mark)))


def _short_rows(last: NDArray[np.generic]) -> bool:
    """Whether the last column has an empty field: among blanks that is a row cut short."""
    if last.dtype.kind == "f":
        return bool(np.isnan(last.astype(np.float64)).any())
    return bool((last.astype("S3") == b"").any() | (last.astype("S3") == b"nan").any())


def _by_cell(data: bytes, first_line: int, plan: Plan, report: Report) -> Chunk:
    """Row by row and cell by cell; what does not fit is reported, the rest kept."""
    lines: list[int] = []
    rows: list[list[str]] = []
    for at, text in enumerate(data.decode("utf-8", errors="replace").split("\n")[:-1], first_line):
        if not text.strip("\x1a \t\r"):
            report.counts.blank_lines += 1
            continue
        if text.strip() in plan.repeated:
            report.counts.repeated_headers += 1
            continue
        fields = split_line(text, plan.delimiter)
        if len(fields) > plan.width and not any(fields[plan.width :]):
            fields = fields[: plan.width]
        if len(fields) != plan.width:
            _wrong_width(at, text, len(fields), plan, report)
            continue
        lines.append(at)
        rows.append(fields)
    if not rows:
        return _empty(plan)
    line = np.array(lines, np.int32)
    cells = list(zip(*rows, strict=True))
    columns: dict[int, Texts | Floats] = {}
    for i in plan.texts:
        columns[i] = np.array([cell.encode()[:_WIDEST_DATE] or b" " for cell in cells[i]], "S")
    for i in plan.numbers:
        columns[i] = _figures(cells[i], line, i, plan, report)
    return Chunk(line, columns)


def _wrong_width(line: int, text: str, found: int, plan: Plan, report: Report) -> None:
    report.counts.rows_refused += 1
    more = "too many" if found > plan.width else "too few"
    report.add(
        line,
        "(line)",
        text.strip(),
        f"{more} fields: {found} where the table has {plan.width}",
        "Left out. Mend the line in the file and send it again; the other lines are taken.",
        "refused",
    )


def _figures(
    cells: tuple[str, ...], line: Ints, position: int, plan: Plan, report: Report
) -> Floats:
    texts = pd.Series(list(cells), dtype=object)
    absent = texts.isin(plan.missing[position]).to_numpy()
    plain = _with_points(texts, plan.decimal).where(~absent, None)
    values = np.array(pd.to_numeric(plain, errors="coerce").to_numpy(np.float64, copy=True))
    junk = ~absent & ~np.isfinite(values)
    values[junk] = np.nan
    _blank_codes(values, plan.missing[position])
    name = plan.names[position]
    missing = int((np.isnan(values) & ~junk).sum())
    report.counts.missing[name] = report.counts.missing.get(name, 0) + missing
    report.counts.cells_refused += int(junk.sum())
    shown = texts.to_numpy()[junk]
    report.add_lines(
        line[junk],
        name,
        [str(text) for text in shown],
        "this is not a number",
        "Left out, the other columns of the row are taken. If it means 'missing', add it to the "
        "missing codes.",
        "refused",
    )
    return values


def _with_points(texts: pd.Series, decimal: str) -> pd.Series:
    """Decimal points for commas; thousands are closed up only where both marks make them plain.

    A mark that is not the file's decimal mark is left in a form that is no number: 1.500 in a file
    of decimal commas may be 1500 or 1.5.
    """
    group = "." if decimal == "," else ","
    odd = texts.str.contains(group, regex=False)
    if odd.any():
        inner, point = re.escape(group), re.escape(decimal)
        thousands = texts.str.fullmatch(rf"[-+]?\d{{1,3}}(?:{inner}\d{{3}})+{point}\d+")
        closed = texts.str.replace(group, "", regex=False)
        texts = texts.where(
            ~odd, closed.where(thousands, texts.str.replace(group, "~", regex=False))
        )
    return texts.str.replace(",", ".", regex=False) if decimal == "," else texts


def _blank_codes(values: Floats, missing: tuple[str, ...]) -> None:
    """Missing codes written another way (-9999.00) become NaN, in place."""
    if values.size == 0 or np.isnan(values).all():
        return
    low, high = np.nanmin(values), np.nanmax(values)
    for code in _codes(missing):
        if low <= code <= high:
            values[values == code] = np.nan


def _codes(missing: tuple[str, ...]) -> list[float]:
    codes = []
    for text in missing:
        try:
            code = float(text)
        except ValueError:
            continue
        if np.isfinite(code):
            codes.append(code)
    return codes


def _missing_for(mapping: Mapping, position: int) -> tuple[str, ...]:
    """The missing codes of one column: a figure the column may well read is none (9999 Wh/m2)."""
    column = mapping.column(position)
    if column is None or column.quantity is None or column.unit is None:
        return tuple(mapping.missing)
    limits = QUANTITIES[column.quantity]
    kept = []
    for text in mapping.missing:
        codes = _codes((text,))
        if codes and abs(codes[0]) > 1000:
            value = to_si(codes[0], column.unit, column.quantity, mapping.interval_s or 3600)
            if limits.low <= float(value) <= limits.high:
                continue
        kept.append(text)
    return tuple(kept)


def _empty(plan: Plan) -> Chunk:
    columns: dict[int, Texts | Floats] = {i: np.zeros(0, "S1") for i in plan.texts}
    columns.update({i: np.zeros(0) for i in plan.numbers})
    return Chunk(np.zeros(0, np.int32), columns)
