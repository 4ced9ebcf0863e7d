"""One block of lines to typed columns: typed at once, and only where that fails cell by cell."""

import io
from collections.abc import Hashable
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from app.intake.by_cell import by_cell
from app.intake.cells import DELIMITERS
from app.intake.dates import Texts
from app.intake.missing import blank_codes
from app.intake.model import Floats
from app.intake.plan import WIDEST_DATE, Chunk, Plan
from app.intake.report import Report
from app.intake.text import Block

PIECE_BYTES = 512 * 1024  # a block that cannot be typed at once is tried again in pieces


def parse(block: Block, plan: Plan, report: Report) -> Chunk:
    """Columns of one block; lines above the first data line are passed over."""
    skip = max(plan.first_data_line - block.first_line, 0)
    if skip >= block.lines:
        return Chunk.empty(plan)
    data, first_line, rows = block.data, block.first_line + skip, block.lines - skip
    if skip:
        data = data.split(b"\n", skip)[skip]
    report.counts.lines += rows
    whole = _typed(data, first_line, rows, plan, report)
    if whole is not None:
        return whole
    parts = []
    while data:
        cut = data.find(b"\n", PIECE_BYTES) + 1 or len(data)
        piece, data = data[:cut], data[cut:]
        rows = piece.count(b"\n")
        typed = _typed(piece, first_line, rows, plan, report)
        parts.append(typed or by_cell(piece, first_line, plan, report))
        first_line += rows
    return Chunk.joined(parts)


def _typed(data: bytes, first_line: int, rows: int, plan: Plan, report: Report) -> Chunk | None:
    """All rows at once; None when any row or cell is not as it should be."""
    blanks = plan.delimiter == "blanks"
    mark = DELIMITERS[plan.delimiter]
    if b"\x00" in data or (not blanks and _occurrences(data, mark) != rows * (plan.width - 1)):
        return None
    types: dict[Hashable, str] = dict.fromkeys(range(plan.width), "S1")
    types.update(dict.fromkeys(plan.texts, f"S{WIDEST_DATE}"))
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
        blank_codes(values, plan.missing[i])
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
