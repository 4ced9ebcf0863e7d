"""Day before month, or month before day: settled by the whole file, or asked."""

import io
import re
from dataclasses import dataclass
from typing import BinaryIO

import numpy as np
import pandas as pd

from app.intake.cells import DELIMITERS, split_line
from app.intake.model import DateOrder, TimeLayout
from app.intake.sniff_dates import sample_times, usual_step
from app.intake.sniff_table import Table
from app.intake.text import Block, blocks

_THREE = re.compile(rb"\s*(\d{1,2})\s*([-/. ])\s*(\d{1,2})\s*[-/. ]\s*(\d{1,4})")
_MOST_BYTES = 256 * 1024 * 1024


@dataclass(frozen=True)
class Order:
    """The order found; `settled` None means a person must say."""

    settled: DateOrder | None
    suggested: DateOrder
    choices: tuple[DateOrder, ...]
    why: str


def find_order(source: BinaryIO, encoding: str, table: Table, layout: TimeLayout) -> Order:
    """Order of the dates of a file, from the first date that only one order allows."""
    position = next(c.position for c in layout.columns if c.role in ("instant", "date"))
    open_orders: tuple[DateOrder, ...] = ("dmy", "mdy", "ymd")
    seen = 0
    for block in blocks(source, encoding):
        seen += len(block.data)
        for text, line in _dates(block, table, position):
            left = _allowed(text, open_orders)
            if len(left) == 1:
                source.seek(0)
                what = {"dmy": "day before month", "mdy": "month before day", "ymd": "year first"}
                shown = text.decode(errors="replace").strip()
                return Order(
                    left[0], left[0], left, f"line {line} ({shown}) settles {what[left[0]]}"
                )
            open_orders = left or open_orders
        if seen > _MOST_BYTES:
            break
    source.seek(0)
    return _by_steps(table, layout, open_orders)


def _allowed(text: bytes, orders: tuple[DateOrder, ...]) -> tuple[DateOrder, ...]:
    match = _THREE.match(text)
    if not match:
        return orders
    first, second, third = int(match[1]), int(match[3]), int(match[4])
    fits = {
        "dmy": 1 <= first <= 31 and 1 <= second <= 12,
        "mdy": 1 <= first <= 12 and 1 <= second <= 31,
        "ymd": len(match[4]) <= 2 and 1 <= second <= 12 and 1 <= third <= 31,
    }
    left = tuple(order for order in orders if fits[order])
    return left or orders


def _dates(block: Block, table: Table, position: int) -> list[tuple[bytes, int]]:
    """Distinct dates of a block, in order, with the line each is first seen on."""
    skip = max(table.first_data_line - block.first_line, 0)
    try:
        frame = pd.read_csv(
            io.BytesIO(block.data),
            header=None,
            names=list(range(table.width)),
            usecols=[position],
            sep=r"\s+" if table.delimiter == "blanks" else DELIMITERS[table.delimiter],
            dtype={position: "S32"},
            skiprows=skip,
            skip_blank_lines=False,
            on_bad_lines="error",
            encoding_errors="replace",
            na_filter=False,
        )
        texts = frame[position].to_numpy().astype("S10")
    except (ValueError, pd.errors.ParserError):
        lines = block.data.decode(errors="replace").split("\n")[skip:]
        fields = [split_line(line, table.delimiter) for line in lines]
        texts = np.array([f[position][:10].encode() if len(f) > position else b"" for f in fields])
    if texts.size == 0:
        return []
    _, first = np.unique(texts, return_index=True)
    return [(bytes(texts[i]), block.first_line + skip + int(i)) for i in np.sort(first)]


def _by_steps(table: Table, layout: TimeLayout, orders: tuple[DateOrder, ...]) -> Order:
    """No date settles it: the order under which the rows step most evenly is only suggested."""
    even: dict[DateOrder, float] = {}
    for order in orders:
        times = sample_times(table, layout.model_copy(update={"order": order}))
        step, _ = usual_step(times)
        following = np.count_nonzero(np.diff(times) == step) / max(times.size - 1, 1)
        even[order] = following * times.size * (1.0 if 0 < step <= 86400 else 0.5)
    suggested = max(orders, key=lambda order: even[order])
    why = "no date in the file has a figure above 12 that would tell day from month"
    if "ymd" in orders:
        why = "the years have two figures, and more than one order fits every date of the file"
    if sorted(even.values())[-1] > 1.2 * sorted([0.0, *even.values()])[-2]:
        first = {"dmy": "the day", "mdy": "the month", "ymd": "the year"}[suggested]
        why += f"; the rows follow each other evenly if {first} comes first"
    return Order(None, suggested, orders, why)
