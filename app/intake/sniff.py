"""A first look at a file: what it is made of and what its columns mean."""

from typing import BinaryIO

import numpy as np

from app.intake.cells import MISSING, kind_of
from app.intake.errors import IntakeError
from app.intake.model import (
    Clock,
    ColumnMap,
    Instants,
    Mapping,
    Question,
    RowTime,
    Sniffed,
    TimeLayout,
)
from app.intake.questions import (
    interval_question,
    order_question,
    row_time_question,
    unanswered,
)
from app.intake.sniff_columns import ColumnGuess, find_codes, guess_columns
from app.intake.sniff_dates import (
    When,
    find_when,
    has_clock,
    order_matters,
    sample_times,
    usual_step,
)
from app.intake.sniff_order import find_order
from app.intake.sniff_table import Table, find_table
from app.intake.text import encoding_of, read_head, refuse_what_is_no_text, sample_lines

_DAY = 86400


def sniff(source: BinaryIO, clock: Clock, remembered: Mapping | None = None) -> Sniffed:
    """Guess the mapping of a file; what cannot be guessed safely comes back as questions.

    `source` is a seekable binary file. `remembered` is used where its header signature matches.
    Reads the head, two samples further on, and, only while day and month cannot be told apart,
    the dates of the whole file. Raises IntakeError when the file is no text table.
    """
    head, size = read_head(source)
    refuse_what_is_no_text(head)
    encoding = encoding_of(head)
    text = head.decode(encoding, errors="replace").lstrip("\ufeff").replace("\r\n", "\n")
    lines = text.replace("\r", "\n").split("\n")
    more: list[str] = []
    if size > len(head):
        lines = lines[:-1]
        more = sample_lines(source, encoding, size)
    table = find_table([line.replace("\x00", "") for line in lines], more)
    when = find_when(table)
    if remembered is not None and remembered.signature == table.signature:
        again = _remembered(remembered, table, encoding, when)
        if again is not None:
            return again
    return _fresh(source, encoding, table, when, clock)


def _fresh(source: BinaryIO, encoding: str, table: Table, when: When, clock: Clock) -> Sniffed:
    questions: list[Question] = []
    notes = [f"dates: {when.why}"]
    layout, suggested, when_why = when.layout, None, when.why
    if order_matters(table, layout):
        order = find_order(source, encoding, table, layout)
        layout = layout.model_copy(update={"order": order.settled})
        suggested = layout.model_copy(update={"order": order.suggested})
        notes.append(f"order of the date: {order.why}")
        when_why += f"; {order.why}"
        if order.settled is None:
            position = next(c.position for c in layout.columns if c.role in ("instant", "date"))
            first = table.rows[0][position] if table.rows else None
            questions.append(order_question(order.choices, order.suggested, order.why, first))
    else:
        layout = layout.model_copy(update={"order": "ymd"})
    interval, step_note = _interval(table, suggested or layout)
    notes.append(step_note)
    row_time, row_question = _row_time(table, suggested or layout, when, interval)
    questions += row_question
    if interval is None:
        questions.append(interval_question(step_note))
    zone_name = "UTC" if when.utc else "station"
    notes.append(
        "clock: the name of the time column says UTC"
        if when.utc
        else f"clock: the station's standard time (UTC{clock.utc_offset_h:+g} h)"
    )
    taken = {column.position for column in layout.columns}
    guesses = guess_columns(table, taken, interval or 3600, when_why)
    for guess in guesses:
        questions += guess.questions
    codes, code_note = find_codes(table)
    notes += code_note
    mapping = Mapping(
        encoding=encoding,
        delimiter=table.delimiter,
        decimal="," if table.decimal == "," else ".",
        header_line=table.header_line,
        first_data_line=table.first_data_line,
        time=layout,
        row_time=row_time,
        time_zone=zone_name,
        interval_s=interval,
        missing=[*MISSING, *codes],
        columns=[guess.column for guess in guesses],
        signature=table.signature,
    )
    return _sniffed(mapping, questions, table, guesses, notes, remembered=False)


def _remembered(remembered: Mapping, table: Table, encoding: str, when: When) -> Sniffed | None:
    """The remembered meaning over this file's own layout; None where its dates do not fit."""
    times = sample_times(table, remembered.time)
    if times.size < 0.9 * min(len(table.rows), 2000):
        return None
    interval, _ = _interval(table, remembered.time)
    mapping = remembered.model_copy(
        update={
            "encoding": encoding,
            "delimiter": table.delimiter,
            "decimal": table.decimal,
            "header_line": table.header_line,
            "first_data_line": table.first_data_line,
            "interval_s": interval or remembered.interval_s,
        }
    )
    guesses = []
    for column in mapping.columns:
        meaning = column.quantity or ("says when" if _says_when(mapping, column) else "left out")
        guesses.append(ColumnGuess(column, f"as last time: {meaning.replace('_', ' ')}"))
    notes = ["the header is the one remembered for this station; its mapping is used again"]
    return _sniffed(mapping, unanswered(mapping), table, guesses, notes, remembered=True)


def _says_when(mapping: Mapping, column: ColumnMap) -> bool:
    return any(part.position == column.position for part in mapping.time.columns)


def _sniffed(
    mapping: Mapping,
    questions: list[Question],
    table: Table,
    guesses: list[ColumnGuess],
    notes: list[str],
    *,
    remembered: bool,
) -> Sniffed:
    examples = []
    for i in range(table.width):
        cells = [row[i] for row in table.rows[:200] if kind_of(row[i]) != "missing"]
        examples.append(tuple(cells[:3]))
    return Sniffed(
        mapping,
        tuple(questions),
        tuple(examples),
        tuple(guess.why for guess in guesses),
        tuple(notes),
        remembered,
    )


def _interval(table: Table, layout: TimeLayout) -> tuple[int | None, str]:
    times = sample_times(table, layout)
    step, share = usual_step(times)
    if not _shows_clock(layout, times):
        if step > _DAY and share > 0.5 and times.size > 3:
            raise IntakeError(
                f"The rows are {step // _DAY} days apart. Daily or finer readings are needed; sums "
                "over weeks or months cannot feed a daily balance."
            )
        return _DAY, "step: dates without a clock time, one row a day"
    if step == 0:
        return None, "the step between the rows cannot be told from one row"
    if abs(step - _DAY) <= 3600:
        return _DAY, "step: one row a day"
    if step > _DAY:
        raise IntakeError(
            f"The rows are mostly {step / _DAY:.3g} days apart. Daily or finer readings are needed."
        )
    return step, f"step: {step // 60} min between most rows" if step >= 60 else f"step: {step} s"


def _row_time(
    table: Table, layout: TimeLayout, when: When, interval: int | None
) -> tuple[RowTime | None, list[Question]]:
    clocks = sample_times(table, layout)
    if when.starts or not _shows_clock(layout, clocks):
        return "start", []
    clocks = clocks % _DAY
    midnight = clocks.size > 0 and bool(np.all(clocks == 0))
    if interval == _DAY and midnight and not _writes_24(table, layout):
        why = "one row a day, always at 00:00, may mean the day that begins or the one that ended"
        return None, [row_time_question(why)]
    return "end", []


def _shows_clock(layout: TimeLayout, times: Instants) -> bool:
    """Whether rows state a clock time, in a column of its own or as a fraction of the day."""
    return has_clock(layout) or bool(np.any(times % _DAY != 0))


def _writes_24(table: Table, layout: TimeLayout) -> bool:
    positions = [
        c.position for c in layout.columns if c.role in ("instant", "time", "hhmm", "hour")
    ]
    return any(
        "24:00" in row[i] or row[i] in ("2400", "24") for row in table.rows[:200] for i in positions
    )
