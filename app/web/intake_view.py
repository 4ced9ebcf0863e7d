"""What the Intake pages show, and how its mapping form becomes a mapping again."""

from collections.abc import Mapping as Dict
from dataclasses import dataclass
from typing import Any

from pydantic import ValidationError

from app import wording
from app.intake import IntakeError, Mapping, Problem, answer
from app.science.quantities import QUANTITIES
from app.units import UNITS, units_for
from app.workflows.take_in import Preview

LEAVE_OUT = ""
SHOWN = 24
DAY_S = 86400
STEPS = (60, 300, 600, 900, 1200, 1800, 3600, 7200, 10800, 21600, 43200, DAY_S)
ROLES = {
    "instant": "date and time",
    "date": "date",
    "time": "time",
    "hhmm": "time as a number",
    "year": "year",
    "month": "month",
    "day": "day",
    "day_of_year": "day of the year",
    "hour": "hour",
    "minute": "minute",
    "second": "second",
    "serial": "spreadsheet date",
    "epoch": "seconds since 1970",
}
ORDERS = {"ymd": "year, month, day", "dmy": "day, month, year", "mdy": "month, day, year"}
ROW_TIMES = {"end": "the end of its interval", "start": "the start of its interval"}
DELIMITERS = {
    ",": "comma",
    ";": "semicolon",
    "|": "bar",
    "tab": "tab",
    "blanks": "blanks",
}


@dataclass(frozen=True)
class ColumnLine:
    """A column of the file: what it looks like, what it is taken for, and why."""

    position: int
    name: str
    looks_like: str
    role: str
    quantity: str
    unit: str
    units: tuple[tuple[str, str], ...]
    why: str


def columns(preview: Preview) -> list[ColumnLine]:
    """Every column of the file in words."""
    mapping = preview.mapping
    if mapping is None:
        return []
    roles = {column.position: ROLES[column.role] for column in mapping.time.columns}
    lines = []
    for seen in preview.columns:
        position = int(seen["position"])
        column = mapping.column(position)
        quantity = (column.quantity or LEAVE_OUT) if column else LEAVE_OUT
        lines.append(
            ColumnLine(
                position,
                str(seen["name"]) or f"column {position + 1}",
                "; ".join(_short(str(example)) for example in seen["examples"][:3]),
                roles.get(position, ""),
                quantity,
                (column.unit or "") if column else "",
                unit_choices(quantity),
                str(seen["why"]),
            )
        )
    return lines


def _short(text: str) -> str:
    return text if len(text) <= SHOWN else f"{text[:SHOWN]}…"


def unit_choices(quantity: str) -> tuple[tuple[str, str], ...]:
    """The units of a quantity first, then every other one (the quantity may be changed too)."""
    fitting = [unit.name for unit in units_for(quantity)] if quantity in QUANTITIES else []
    names = [*fitting, *(name for name in UNITS if name not in fitting)]
    return tuple((name, UNITS[name].label) for name in names)


def quantity_choices() -> list[tuple[str, str]]:
    """Every quantity a column may mean."""
    return [(name, quantity.term) for name, quantity in QUANTITIES.items()]


def step_choices(current: int | None) -> list[tuple[str, str]]:
    """The steps between rows, the current one among them."""
    steps = sorted({*STEPS, *([current] if current else [])})
    return [(str(step), duration(step)) for step in steps]


def duration(seconds: int) -> str:
    """`15 min`, `1 h`, `1 day`."""
    if seconds % DAY_S == 0:
        return wording.days(seconds // DAY_S)
    if seconds % 3600 == 0:
        return f"{seconds // 3600} h"
    return f"{seconds // 60} min" if seconds % 60 == 0 else f"{seconds} s"


def corrected(mapping: Mapping, form: Dict[str, str]) -> Mapping:
    """The mapping with what the form says; raises IntakeError naming what cannot be used."""
    data: dict[str, Any] = mapping.model_dump()
    for name in ("decimal", "delimiter", "row_time", "time_zone", "encoding"):
        if form.get(name):
            data[name] = form[name].strip()
    for name in ("interval_s", "header_line", "first_data_line"):
        if form.get(name):
            data[name] = _whole(form[name], name)
    if form.get("order"):
        data["time"]["order"] = form["order"]
    if "missing" in form:
        data["missing"] = [code.strip() for code in form["missing"].split(",")]
    for column in data["columns"]:
        place = column["position"]
        if f"quantity.{place}" in form:
            quantity = form[f"quantity.{place}"] or None
            unit = form.get(f"unit.{place}") or None
            if quantity != column["quantity"] or unit != column["unit"]:
                column["body_position"] = None
                if "needs_body" in column:
                    column["needs_body"] = False
            column["quantity"], column["unit"] = quantity, unit if quantity else None
            fitting = units_for(quantity) if quantity in QUANTITIES else ()
            if quantity and fitting and unit and unit not in {known.name for known in fitting}:
                label = UNITS[unit].label if unit in UNITS else unit
                raise IntakeError(
                    f"Column {column['name']!r}: {wording.word(wording.QUANTITIES, quantity)} "
                    f"cannot be in {label}; choose one of "
                    f"{', '.join(known.label for known in fitting)}."
                )
    try:
        changed = Mapping.model_validate(data)
    except ValidationError as error:
        item = error.errors()[0]
        place = ".".join(str(step) for step in item["loc"])
        raise IntakeError(f"{place} is {item.get('input')!r}: {item['msg']}.") from None
    answers = {
        name.removeprefix("q."): value
        for name, value in form.items()
        if name.startswith("q.") and value
    }
    return answer(changed, {"time_zone": changed.time_zone, **answers})


def _whole(text: str, name: str) -> int:
    try:
        return int(text)
    except ValueError:
        raise IntakeError(f"{name} is {text[:40]!r}; write a whole number.") from None


def headline(preview: Preview) -> tuple[str, str]:
    """The one sentence that matters, as lead and rest."""
    rows = wording.counted(preview.rows_accepted, "row", "rows")
    refused = wording.number(preview.rows_refused)
    if preview.state == "applied":
        return f"{rows} taken in", "; it can be undone."
    if preview.state == "undone":
        return "Undone", ": its days are what they were without it."
    if preview.state == "same":
        return "Nothing new", ": every row was here already and the same."
    if preview.state == "away":
        return "Put away", ": nothing of it was taken in."
    if preview.message:
        return "This file cannot be taken in as it is.", ""
    blocking = sum(bool(question["blocking"]) for question in preview.questions)
    if blocking:
        return wording.counted(blocking, "question", "questions"), " to be answered first."
    if not preview.rows_accepted:
        return "Nothing to take", f": no row can be used, {refused} refused."
    if preview.rows_ahead:
        ahead = wording.counted(preview.rows_ahead, "row is", "rows are")
        last = wording.full_day(preview.last_day)
        return f"{ahead} dated after now", f", up to {last}; they are taken only if you say so."
    if not preview.days_changed:
        return "Nothing new", f": {rows}, all of them here already and the same."
    return (
        rows,
        f" will be taken, {refused} will not; "
        f"{wording.counted(len(preview.days_changed), 'day changes', 'days change')}, "
        f"from {wording.full_day(preview.days_changed[0])}.",
    )


def ready(preview: Preview) -> bool:
    """Whether the file can be taken in as it is read, and would change anything."""
    asks = any(question["blocking"] for question in preview.questions)
    looked = preview.state == "previewed" and not preview.message and not asks
    return looked and bool(preview.days_changed)


def doubtful(preview: Preview) -> bool:
    """Whether something stands in the way of a file, or it is better looked at twice."""
    return preview.state == "previewed" and (
        not preview.rows_accepted or bool(preview.message) or preview.rows_ahead > 0
    )


def next_step(preview: Preview) -> str:
    """What to do with a file that cannot be taken in as it is read."""
    if any(question["blocking"] for question in preview.questions):
        return "Answer what is asked first."
    if preview.mapping is None:
        return "Mend the file and send it again."
    if preview.message or not preview.rows_accepted:
        return "Correct how it is read, or mend the file and send it again."
    return "There is nothing in it to take."


def effects(preview: Preview) -> str:
    """What stands behind the headline: same, differing, fields touched."""
    said = []
    if preview.first_day and preview.last_day:
        said.append(
            f"The rows run from {wording.full_day(preview.first_day)} to "
            f"{wording.full_day(preview.last_day)}."
        )
    if preview.rows_same:
        said.append(
            f"{wording.counted(preview.rows_same, 'row is', 'rows are')} here already and the same."
        )
    if preview.rows_differing:
        said.append(
            f"{wording.counted(preview.rows_differing, 'row differs', 'rows differ')} from what "
            "is here and will replace it (kept for undo)."
        )
    if preview.fields_touched:
        said.append(
            f"{wording.counted(preview.fields_touched, 'field is', 'fields are')} reckoned anew."
        )
    return " ".join(said)


def problems(preview: Preview) -> list[tuple[str, Problem]]:
    """Problems with their lines: what is dated after now, what is refused, then what is doubted."""
    order = sorted(
        preview.problems, key=lambda p: (p.column != "(date)", p.severity == "warning", p.line)
    )
    return [(lines_of(problem), problem) for problem in order]


def lines_of(problem: Any) -> str:
    """`1 204` or `2 881 to 2 896`."""
    last = problem.last_line or problem.line
    first = wording.number(problem.line)
    return first if last == problem.line else f"{first} to {wording.number(last)}"
