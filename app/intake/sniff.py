"""A first look at a file: what it is made of and what its columns mean."""

from typing import BinaryIO

import numpy as np

from app.intake.cells import MISSING, kind_of
from app.intake.civil import zone
from app.intake.errors import IntakeError
from app.intake.model import (
    Choice,
    Clock,
    ColumnMap,
    Mapping,
    Question,
    RowTime,
    Sniffed,
    TimeLayout,
)
from app.intake.sniff_columns import ColumnGuess, guess_columns, unit_question
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
_LEAVE_OUT = "leave out"
_STEPS = (60, 300, 600, 900, 1800, 3600, 10800, 86400)


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


def answer(mapping: Mapping, answers: dict[str, str]) -> Mapping:
    """The mapping with questions answered: question field -> chosen value.

    Raises IntakeError for a field no question has, or a value that does not fit it.
    """
    data = mapping.model_dump()
    for field, value in answers.items():
        parts = field.split(".")
        if field == "time.order":
            data["time"]["order"] = value
        elif field in ("row_time", "time_zone") or field == "interval_s":
            data[field] = value
        elif parts[0] == "columns" and len(parts) == 3:
            _answer_column(data["columns"], parts[1], parts[2], value)
        else:
            raise IntakeError(f"There is no question {field!r} about this file.")
    try:
        answered = Mapping.model_validate(data)
    except ValueError as error:
        given = ", ".join(f"{field} = {value}" for field, value in answers.items())
        raise IntakeError(f"This answer cannot be used: {given}. {error}") from error
    if answered.time_zone not in ("station", "UTC"):
        zone(answered.time_zone)
    return answered


def _answer_column(columns: list[dict[str, object]], position: str, key: str, value: str) -> None:
    column = next((c for c in columns if str(c["position"]) == position), None)
    if column is None or key not in ColumnMap.model_fields:
        raise IntakeError(f"There is no question about column {position} {key!r} in this file.")
    if value == _LEAVE_OUT:
        column.update(quantity=None, needs_body=False, body_position=None)
    else:
        column[key] = value


def _fresh(source: BinaryIO, encoding: str, table: Table, when: When, clock: Clock) -> Sniffed:
    questions: list[Question] = []
    notes = [f"dates: {when.why}"]
    layout, suggested = when.layout, None
    if order_matters(table, layout):
        order = find_order(source, encoding, table, layout)
        layout = layout.model_copy(update={"order": order.settled})
        suggested = layout.model_copy(update={"order": order.suggested})
        notes.append(f"order of the date: {order.why}")
        if order.settled is None:
            questions.append(
                _order_question(order.choices, order.suggested, order.why, table, when)
            )
    else:
        layout = layout.model_copy(update={"order": "ymd"})
    interval, step_note = _interval(table, suggested or layout)
    notes.append(step_note)
    row_time, row_question = _row_time(table, suggested or layout, when, interval)
    questions += row_question
    if interval is None:
        questions.append(_interval_question(step_note))
    zone_name = "UTC" if when.utc else "station"
    notes.append(
        "clock: the name of the time column says UTC"
        if when.utc
        else f"clock: the station's standard time (UTC{clock.utc_offset_h:+g} h)"
    )
    taken = {column.position for column in layout.columns}
    guesses = guess_columns(table, taken, interval or 3600)
    for guess in guesses:
        questions += guess.questions
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
        missing=list(MISSING),
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


def unanswered(mapping: Mapping) -> list[Question]:
    """Blocking questions a mapping still leaves open; `read` refuses while there is one."""
    questions: list[Question] = []
    texts = any(column.role in ("instant", "date") for column in mapping.time.columns)
    if texts and mapping.time.order is None:
        why = "the order of day and month has not been settled"
        questions.append(_order_question(("dmy", "mdy", "ymd"), None, why, None, None))
    if mapping.interval_s is None:
        questions.append(_interval_question("the step between the rows is not known"))
    if mapping.row_time is None:
        questions.append(_row_time_question("it has not been said"))
    for column in mapping.columns:
        if column.quantity is None:
            continue
        if column.unit is None:
            questions.append(unit_question(column, "the unit has not been settled"))
        elif column.needs_body and column.body_position is None:
            questions.append(
                Question(
                    f"columns.{column.position}.body_position",
                    f"Which column has the body temperature for {column.name!r}?",
                    (Choice(_LEAVE_OUT, "none: leave the column out"),),
                    "its longwave lacks the term of the instrument's own temperature",
                )
            )
    return questions


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
    if not has_clock(layout):
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
    if not has_clock(layout):
        return "start", []
    if when.starts:
        return "start", []
    clocks = sample_times(table, layout) % _DAY
    midnight = clocks.size > 0 and bool(np.all(clocks == 0))
    if interval == _DAY and midnight and not _writes_24(table, layout):
        why = "one row a day, always at 00:00, may mean the day that begins or the one that ended"
        return None, [_row_time_question(why)]
    return "end", []


def _writes_24(table: Table, layout: TimeLayout) -> bool:
    positions = [
        c.position for c in layout.columns if c.role in ("instant", "time", "hhmm", "hour")
    ]
    return any(
        "24:00" in row[i] or row[i] in ("2400", "24") for row in table.rows[:200] for i in positions
    )


def _row_time_question(why: str) -> Question:
    return Question(
        "row_time",
        "Which day does a row at 00:00 stand for?",
        (
            Choice("start", "the day written in the row"),
            Choice("end", "the day before, which ended at that midnight"),
        ),
        why,
        "start",
    )


def _interval_question(why: str) -> Question:
    choices = tuple(
        Choice(
            str(s), "1 day" if s == _DAY else f"{s // 3600} h" if s >= 3600 else f"{s // 60} min"
        )
        for s in _STEPS
    )
    return Question("interval_s", "How much time does one row cover?", choices, why)


def _duration(seconds: int) -> str:
    if seconds == _DAY:
        return "1 day"
    return f"{seconds // 3600} h" if seconds >= 3600 else f"{seconds // 60} min"


def _order_question(
    orders: tuple[str, ...],
    suggested: str | None,
    why: str,
    table: Table | None,
    when: When | None,
) -> Question:
    shown = ""
    if table is not None and when is not None and table.rows:
        position = next(c.position for c in when.layout.columns if c.role in ("instant", "date"))
        shown = f" (the first is {table.rows[0][position]})"
    labels = {
        "dmy": "day, month, year",
        "mdy": "month, day, year",
        "ymd": "year, month, day",
    }
    return Question(
        "time.order",
        f"In which order are the dates written{shown}?",
        tuple(Choice(order, labels[order]) for order in orders),
        why,
        suggested,
    )
