"""The questions a file may raise, and their answers."""

from pydantic import ValidationError

from app.intake.cells import DELIMITERS
from app.intake.civil import zone
from app.intake.errors import IntakeError
from app.intake.model import Choice, ColumnMap, Mapping, Question
from app.intake.sniff_columns import unit_question
from app.science.quantities import QUANTITIES
from app.units import UNITS, fits

_DAY = 86400
ENCODINGS = ("utf-8", "utf-8-sig", "utf-16-le", "utf-16-be", "cp1252", "latin-1", "iso-8859-15",
             "cp1250", "cp1251", "cp850", "cp437", "mac-roman", "ascii")  # fmt: skip
_LEAVE_OUT = "leave out"
_STEPS = (60, 300, 600, 900, 1800, 3600, 10800, 86400)


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
    except ValidationError as error:
        given = ", ".join(f"{field} = {value}" for field, value in answers.items())
        why = error.errors()[0]["msg"]
        raise IntakeError(f"This answer cannot be used: {given}. {why}.") from error
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


def check_mapping(mapping: Mapping) -> None:
    """IntakeError where a mapping contradicts itself, naming the column and the remedy."""
    _check_frame(mapping)
    when = {column.position for column in mapping.time.columns}
    seen: dict[str, str] = {}
    for column in mapping.columns:
        if column.quantity is None:
            continue
        if wrong := _wrong(column, when, seen):
            raise IntakeError(f"Column {column.name!r}: {wrong}")
        seen[column.quantity] = column.name
    if not seen:
        raise IntakeError(
            "No column is taken for a weather quantity; say of at least one what it means, and in "
            "which unit."
        )


def _check_frame(mapping: Mapping) -> None:
    """IntakeError where what holds for the whole file is not known."""
    if mapping.delimiter not in DELIMITERS:
        known = ", ".join(repr(name) for name in DELIMITERS)
        raise IntakeError(f"The delimiter {mapping.delimiter!r} is not known; use one of {known}.")
    if mapping.encoding.lower() not in ENCODINGS:
        raise IntakeError(
            f"The encoding {mapping.encoding[:40]!r} is not known; use one of "
            f"{', '.join(ENCODINGS)}."
        )
    if mapping.time_zone not in ("station", "UTC"):
        zone(mapping.time_zone)
    if not mapping.time.columns:
        raise IntakeError("The mapping names no column that says when.")


def _wrong(column: ColumnMap, when: set[int], seen: dict[str, str]) -> str:
    """What cannot be about a column that is taken, and the remedy; "" where nothing is wrong."""
    quantity = str(column.quantity)
    if column.position in when or column.body_position in when:
        return f"a column that says when cannot be read as {quantity} as well; leave it out."
    if quantity not in QUANTITIES:
        return f"{quantity[:60]!r} is no quantity known here; use one of {', '.join(QUANTITIES)}."
    if quantity in seen:
        return f"it and {seen[quantity]!r} are both mapped to {quantity}; leave one of them out."
    if column.unit is not None and (column.unit not in UNITS or not fits(column.unit, quantity)):
        return f"the unit {column.unit[:60]!r} does not measure {quantity}; choose another."
    if column.needs_body and not quantity.startswith("longwave_"):
        return f"{quantity} takes no body temperature; it belongs to longwave alone."
    if column.factor == 0.0:
        return "its factor is 0, which makes every value the same; give another, or leave it out."
    return ""


def unanswered(mapping: Mapping) -> list[Question]:
    """Blocking questions a mapping still leaves open; `read` refuses while there is one."""
    questions: list[Question] = []
    texts = any(column.role in ("instant", "date") for column in mapping.time.columns)
    if texts and mapping.time.order is None:
        why = "the order of day and month has not been settled"
        questions.append(order_question(("dmy", "mdy", "ymd"), None, why))
    if mapping.interval_s is None:
        questions.append(interval_question("the step between the rows is not known"))
    if mapping.row_time is None:
        questions.append(row_time_question("it has not been said"))
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


def order_question(
    orders: tuple[str, ...], suggested: str | None, why: str, first: str | None = None
) -> Question:
    """In which order day, month and year stand; `first` is the first date of the file."""
    shown = f" (the first is {first})" if first else ""
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


def interval_question(why: str) -> Question:
    """How much time one row covers."""
    choices = tuple(
        Choice(
            str(s), "1 day" if s == _DAY else f"{s // 3600} h" if s >= 3600 else f"{s // 60} min"
        )
        for s in _STEPS
    )
    return Question("interval_s", "How much time does one row cover?", choices, why)


def row_time_question(why: str) -> Question:
    """Which day a daily row at midnight means."""
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


def _duration(seconds: int) -> str:
    if seconds == _DAY:
        return "1 day"
    return f"{seconds // 3600} h" if seconds >= 3600 else f"{seconds // 60} min"
