"""The whole file, streamed, as rows and problems."""

from collections.abc import Iterator
from typing import BinaryIO

import numpy as np

from app.intake.cells import kind_of, split_line
from app.intake.chunk import parse
from app.intake.civil import civil_to_utc
from app.intake.dates import NOT_A_DATE, OK, WHY, Times, read_times
from app.intake.errors import IntakeError
from app.intake.model import (
    Clock,
    ColumnMap,
    Floats,
    Instants,
    Ints,
    Mapping,
    Progress,
    Reading,
)
from app.intake.plan import Chunk, Plan, plan_of
from app.intake.questions import check_mapping, unanswered
from app.intake.report import Report
from app.intake.sniff_dates import has_clock
from app.intake.text import Block, blocks, read_head, refuse_what_is_no_text
from app.intake.tidy import tidy
from app.science.quantities import QUANTITIES
from app.units import to_si

_DAY = 86400
_TAIL = 8192  # bytes of the lines before the last that tell whether the last is whole
_SIGMA = 5.670374419e-8  # W m-2 K-4, Stefan-Boltzmann constant (CODATA 2018)
_REMEDY_DATE = "The row is left out. Mend the date in the file, or choose another date layout."


def read(
    source: BinaryIO, mapping: Mapping, clock: Clock, progress: Progress | None = None
) -> Reading:
    """Read every row of a file by its mapping.

    Bad rows and cells are left out and reported, the rest is taken. Raises IntakeError when the
    file is no text table, the mapping contradicts itself, or a question is unanswered.
    """
    head, size = read_head(source)
    refuse_what_is_no_text(head)
    _check(mapping)
    report = Report()
    plan = plan_of(mapping, _lines_above(head, mapping))
    local: list[Instants] = []
    offset: list[Floats] = []
    line: list[Ints] = []
    values: dict[str, list[Floats]] = {c.quantity: [] for c in mapping.columns if c.quantity}
    for block in _closed(blocks(source, mapping.encoding, progress, size), plan, report):
        chunk = parse(block, plan, report)
        times = read_times(mapping.time, chunk.columns, chunk.line.size)
        good = times.why == OK
        if not good.all():
            _refuse_dates(chunk, times, mapping, report)
        local.append(times.local[good])
        offset.append(times.offset_s[good])
        line.append(chunk.line[good])
        for column in mapping.columns:
            if column.quantity:
                values[column.quantity].append(_si(column, chunk, good, mapping, report))
    return _gather(local, offset, line, values, mapping, clock, report)


def _gather(
    local: list[Instants],
    offset: list[Floats],
    line: list[Ints],
    values: dict[str, list[Floats]],
    mapping: Mapping,
    clock: Clock,
    report: Report,
) -> Reading:
    columns: dict[str, Floats] = {}
    for name in list(values):
        columns[name] = np.concatenate([np.zeros(0), *values.pop(name)])
    lines = np.concatenate([np.zeros(0, np.int32), *line])
    clocks = np.concatenate([np.zeros(0, np.int64), *local])
    stated = np.concatenate([np.zeros(0), *offset])
    instant, kept = _instants(clocks, stated, lines, mapping, clock, report)
    if not kept.all():
        instant, lines = instant[kept], lines[kept]
        columns = {name: column[kept] for name, column in columns.items()}
    rows = tidy(instant, lines, columns, mapping.interval_s or _DAY, report)
    report.add_missing(rows, {c.quantity: c.name for c in mapping.columns if c.quantity})
    return Reading(rows, report.problems(), report.counts)


def _check(mapping: Mapping) -> None:
    """IntakeError where a mapping cannot be used or a question is unanswered."""
    check_mapping(mapping)
    open_questions = unanswered(mapping)
    if open_questions:
        first = open_questions[0]
        raise IntakeError(
            f"{first.asks} This must be answered before the file can be read ({first.field}; "
            f"{len(open_questions)} open)."
        )


def _lines_above(head: bytes, mapping: Mapping) -> frozenset[str]:
    text = head.decode(mapping.encoding, errors="replace").lstrip("\ufeff")
    above = (
        text.replace("\r\n", "\n").replace("\r", "\n").split("\n")[: mapping.first_data_line - 1]
    )
    return frozenset(stripped for stripped in (line.strip() for line in above) if stripped)


def _closed(found: Iterator[Block], plan: Plan, report: Report) -> Iterator[Block]:
    """Blocks with the last line taken off where the file was cut in the middle of it."""
    recent = b""
    for block in found:
        if not block.ends_open:
            recent = block.data[-_TAIL:]
            yield block
            continue
        before, _, last = block.data.rpartition(b"\n")
        number = block.first_line + block.lines - 1
        if number >= plan.first_data_line and _is_cut(recent + before, last, plan):
            report.counts.lines += 1
            report.counts.rows_refused += 1
            report.add(
                number,
                "(line)",
                last.decode("utf-8", errors="replace").strip(),
                "cut off at the end of the file",
                "Left out. Send the file again when it is whole; nothing is lost.",
                "refused",
            )
            if before:
                yield Block(before + b"\n", block.first_line, block.lines - 1)
        else:
            yield Block(block.data + b"\n", block.first_line, block.lines)


def _is_cut(before: bytes, last: bytes, plan: Plan) -> bool:
    fields = split_line(last.decode("utf-8", errors="replace"), plan.delimiter)
    if len(fields) < plan.width:
        return True
    lines = before.strip(b"\n").rsplit(b"\n", 30)[-30:]
    rows = [split_line(text.decode("utf-8", errors="replace"), plan.delimiter) for text in lines]
    ends = [row[-1] for row in rows if len(row) == plan.width]
    if len(ends) < 3:
        return False
    if fields[-1] == "":
        return all(ends)
    ends = [end for end in ends if kind_of(end) == "number"]
    decimals = {len(end.rpartition(plan.decimal)[2]) if plan.decimal in end else 0 for end in ends}
    if len(decimals) != 1 or decimals == {0}:
        return False
    here = len(fields[-1].rpartition(plan.decimal)[2]) if plan.decimal in fields[-1] else 0
    return (
        here < next(iter(decimals))
        and fields[-1].lstrip("-").replace(plan.decimal, "", 1).isdigit()
    )


def _refuse_dates(chunk: Chunk, times: Times, mapping: Mapping, report: Report) -> None:
    positions = [column.position for column in mapping.time.columns]
    name = " + ".join(
        column.name if (column := mapping.column(p)) else f"column {p + 1}" for p in positions
    )
    for code, why in WHY.items():
        bad = np.flatnonzero(times.why == code)
        report.counts.rows_refused += int(bad.size)
        shown = [" ".join(_shown(chunk.columns[p][i]) for p in positions) for i in bad[:2000]]
        shown += [""] * (bad.size - len(shown))
        if code == NOT_A_DATE and mapping.time.order and bad.size:
            why = f"{why} ({mapping.time.order.replace('', ' ').strip().replace(' ', '-')})"
        report.add_lines(chunk.line[bad], name, shown, why, _REMEDY_DATE, "refused")


def _shown(cell: bytes | float) -> str:
    if isinstance(cell, bytes):
        return cell.decode("utf-8", errors="replace").strip()
    return "" if np.isnan(cell) else f"{cell:g}"


def _si(
    column: ColumnMap, chunk: Chunk, good: np.ndarray, mapping: Mapping, report: Report
) -> Floats:
    """One column in canonical unit; a value no weather has is left out and reported."""
    quantity, unit = str(column.quantity), str(column.unit)
    raw = np.asarray(chunk.columns[column.position], np.float64)[good]
    values = raw
    if column.factor != 1.0 or column.offset != 0.0:
        values = raw * column.factor + column.offset
    values = to_si(values, unit, quantity, mapping.interval_s or _DAY)
    if column.needs_body and column.body_position is not None:
        values = values + _body_term(mapping, column.body_position, chunk, good)
    limits = QUANTITIES[quantity]
    wrong = (values < limits.low) | (values > limits.high)
    if wrong.any():
        at = np.flatnonzero(wrong)
        values[wrong] = np.nan
        report.counts.cells_refused += int(at.size)
        report.add_lines(
            chunk.line[good][wrong],
            column.name,
            np.char.mod("%.10g", raw[wrong]),
            f"impossible {limits.term}: outside {limits.low:g} to {limits.high:g} {limits.unit}",
            "The value is left out. If many are, check the unit chosen for the column.",
            "refused",
        )
    return values


def _body_term(mapping: Mapping, position: int, chunk: Chunk, good: np.ndarray) -> Floats:
    body = mapping.column(position)
    unit = body.unit if body is not None and body.unit in ("degC", "degF", "K") else "degC"
    raw = np.asarray(chunk.columns[position], np.float64)[good]
    kelvin = to_si(raw, unit, "air_temperature", _DAY) + 273.15
    return np.asarray(_SIGMA * kelvin**4, np.float64)


def _instants(
    local: Instants,
    stated: Floats,
    line: Ints,
    mapping: Mapping,
    clock: Clock,
    report: Report,
) -> tuple[Instants, np.ndarray]:
    """UTC of the end of each row's interval, and which rows have one."""
    station = round(clock.utc_offset_h * 3600)
    interval = mapping.interval_s or _DAY
    kept = np.ones(local.size, bool)
    if not has_clock(mapping.time) and interval == _DAY:
        return local - station + interval, kept
    if mapping.time_zone == "station":
        instant = local - station
    elif mapping.time_zone == "UTC":
        instant = local.copy()
    else:
        civil = civil_to_utc(local, mapping.time_zone)
        instant = civil.utc
        kept = ~civil.no_such_hour | ~np.isnan(stated)
        lost = line[~kept]
        report.counts.rows_refused += int(lost.size)
        report.add_lines(
            lost,
            "(clock)",
            [str(np.datetime64(int(s), "s")).replace("T", " ") for s in local[~kept]],
            f"this hour did not exist in {mapping.time_zone}: the clock was put forward",
            "Left out. If the logger stays on standard time, choose the station's clock.",
            "refused",
        )
    own = ~np.isnan(stated)
    if own.any():
        instant[own] = local[own] - stated[own].astype(np.int64)
    if mapping.row_time == "start":
        instant = instant + interval
    return instant, kept
