"""The slow way through a block: line by line for the fields, cell by cell where a figure is none.

Lines without quotes are still parsed together, only as texts; a line with quotes or odd bytes is
split on its own. So a block with a few bad cells costs a few times the typed way, not twenty.
"""

import csv
import io
import re
from dataclasses import dataclass, field

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from app.intake.cells import DELIMITERS, split_line
from app.intake.missing import blank_codes
from app.intake.model import Floats, Ints
from app.intake.plan import WIDEST_DATE, Chunk, Plan
from app.intake.report import Report

Cells = NDArray[np.object_]


@dataclass
class _Lines:
    """Whole lines of a block: plain ones as bytes, the others as fields, with their numbers."""

    plain: list[bytes] = field(default_factory=list)
    plain_line: list[int] = field(default_factory=list)
    split: list[list[str]] = field(default_factory=list)
    split_line: list[int] = field(default_factory=list)


def by_cell(data: bytes, first_line: int, plan: Plan, report: Report) -> Chunk:
    """Columns of a block; rows and cells that do not fit are reported, the rest kept."""
    lines = _sort_lines(data, first_line, plan, report)
    line = np.array([*lines.plain_line, *lines.split_line], np.int32)
    if line.size == 0:
        return Chunk.empty(plan)
    order = np.argsort(line, kind="stable")
    table = _as_texts(lines.plain, plan)
    columns: dict[int, NDArray[np.bytes_] | Floats] = {}
    for i in (*plan.texts, *plan.numbers):
        apart = np.array([fields[i] for fields in lines.split] + [""], object)[:-1]
        cells = np.concatenate([table[i], apart])[order]
        if i in plan.texts:
            encoded = [str(cell).strip().encode()[:WIDEST_DATE] or b" " for cell in cells]
            columns[i] = np.array(encoded, "S")
        else:
            columns[i] = _figures(cells, line[order], i, plan, report)
    return Chunk(line[order], columns)


def _sort_lines(data: bytes, first_line: int, plan: Plan, report: Report) -> _Lines:
    found = _Lines()
    blanks = plan.delimiter == "blanks"
    mark = DELIMITERS[plan.delimiter].encode()
    repeated = {text.encode() for text in plan.repeated}
    for at, text in enumerate(data.split(b"\n")[:-1], first_line):
        bare = text.strip(b"\x1a \t\r")
        if not bare:
            report.counts.blank_lines += 1
        elif text.strip() in repeated:
            report.counts.repeated_headers += 1
        elif (
            b'"' not in text
            and b"\x00" not in text
            and (_among_blanks(text) if blanks else text.count(mark) + 1) == plan.width
        ):
            found.plain.append(text)
            found.plain_line.append(at)
        else:
            shown = text.decode("utf-8", errors="replace")
            fields = split_line(shown, plan.delimiter)
            if len(fields) > plan.width and not any(fields[plan.width :]):
                fields = fields[: plan.width]
            if len(fields) == plan.width:
                found.split.append(fields)
                found.split_line.append(at)
            else:
                _wrong_width(at, shown, len(fields), plan, report)
    return found


def _among_blanks(text: bytes) -> int:
    return sum(map(bool, text.replace(b"\t", b" ").split(b" ")))


def _as_texts(lines: list[bytes], plan: Plan) -> dict[int, Cells]:
    """Fields of plain lines, by column, as texts."""
    wanted = (*plan.texts, *plan.numbers)
    if not lines:
        return {i: np.zeros(0, object) for i in wanted}
    try:
        frame = pd.read_csv(
            io.BytesIO(b"\n".join(lines) + b"\n"),
            header=None,
            names=list(range(plan.width)),
            sep=r"\s+" if plan.delimiter == "blanks" else DELIMITERS[plan.delimiter],
            dtype=object,
            na_filter=False,
            skip_blank_lines=False,
            quoting=csv.QUOTE_NONE,
            encoding_errors="replace",
        )
    except pd.errors.ParserError:
        frame = pd.DataFrame()
    if len(frame) == len(lines) and isinstance(frame.index, pd.RangeIndex):
        return {i: frame[i].to_numpy() for i in wanted}
    rows = [split_line(text.decode("utf-8", errors="replace"), plan.delimiter) for text in lines]
    return {i: np.array([row[i] for row in rows], object) for i in wanted}


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


def _figures(cells: Cells, line: Ints, position: int, plan: Plan, report: Report) -> Floats:
    values = _numbers(cells if plan.decimal == "." else _with_points(cells, ","))
    if plan.decimal == ".":
        odd = np.flatnonzero(~np.isfinite(values))
        values[odd] = _numbers(_with_points(cells[odd], "."))
    unread = np.flatnonzero(~np.isfinite(values))
    values[unread] = np.nan
    missing = frozenset(plan.missing[position])
    shown = [str(cell).strip() for cell in cells[unread]]
    junk = np.array([text not in missing for text in shown], bool)
    blank_codes(values, plan.missing[position])
    name = plan.names[position]
    report.counts.missing[name] = (
        report.counts.missing.get(name, 0) + int(np.isnan(values).sum()) - int(junk.sum())
    )
    report.counts.cells_refused += int(junk.sum())
    report.add_lines(
        line[unread[junk]],
        name,
        [text for text, bad in zip(shown, junk.tolist(), strict=True) if bad],
        "this is not a number",
        "Left out, the other columns of the row are taken. If it means 'missing', add it to the "
        "missing codes.",
        "refused",
    )
    return values


def _numbers(cells: Cells) -> Floats:
    numbers = pd.to_numeric(pd.Series(cells, dtype=object), errors="coerce")
    return np.array(numbers.to_numpy(np.float64, copy=True))


def _with_points(cells: Cells, decimal: str) -> Cells:
    """Decimal points for commas; thousands are closed up only where both marks make them plain.

    A mark that is not the file's decimal mark is left in a form that is no number: 1.500 in a file
    of decimal commas may be 1500 or 1.5.
    """
    if cells.size == 0:
        return cells
    texts = pd.Series(cells, dtype=object)
    group = "." if decimal == "," else ","
    odd = texts.str.contains(group, regex=False)
    if odd.any():
        inner, point = re.escape(group), re.escape(decimal)
        thousands = texts.str.fullmatch(rf"[-+]?\d{{1,3}}(?:{inner}\d{{3}})+{point}\d+")
        closed = texts.str.replace(group, "", regex=False)
        no_number = texts.str.replace(group, "~", regex=False)
        texts = texts.where(~odd, closed.where(thousands, no_number))
    if decimal == ",":
        texts = texts.str.replace(",", ".", regex=False)
    return np.asarray(texts.to_numpy(), object)
