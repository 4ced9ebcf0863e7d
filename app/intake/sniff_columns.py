"""What each column means and in which unit, from its name and from its values."""

from dataclasses import dataclass

import numpy as np

from app.intake.cells import kind_of
from app.intake.model import Choice, ColumnMap, Floats, Question
from app.intake.names import read_name
from app.intake.sniff_table import Table
from app.science.quantities import QUANTITIES
from app.units import UNITS, to_si, units_for

_DAILY = 86400
_SUMS_FROM = 1800  # loggers that sum energy do so over half an hour or more (common practice)
_ENOUGH = 12  # values from which a column's spread says anything
_ODD_CODES = ("-99", "-99.0", "-99.9", "-99.99", "-88.8")
_CODE_SEEN = 2  # times in the sample
_LEAVE_OUT = "leave out"

# What a column of each quantity usually looks like: low and high of (1st percentile, median, 99th
# percentile), in the canonical unit. Working values, wide enough for any farmed place.
_Looks = tuple[tuple[float, float], tuple[float, float], tuple[float, float]]
_TEMPERATURE: _Looks = ((-50.0, 35.0), (-8.0, 38.0), (-5.0, 52.0))
_LONGWAVE: _Looks = ((100.0, 450.0), (150.0, 520.0), (180.0, 700.0))
_LOOKS: dict[str, _Looks] = {
    "air_temperature": _TEMPERATURE,
    "air_temperature_max": _TEMPERATURE,
    "air_temperature_min": _TEMPERATURE,
    "relative_humidity": ((0.0, 102.0), (8.0, 102.0), (15.0, 108.0)),
    "relative_humidity_max": ((2.0, 102.0), (15.0, 102.0), (30.0, 108.0)),
    "relative_humidity_min": ((0.0, 102.0), (2.0, 102.0), (4.0, 108.0)),
    "dew_point": ((-50.0, 28.0), (-20.0, 27.0), (-15.0, 34.0)),
    "vapour_pressure": ((0.01, 4.0), (0.1, 4.5), (0.2, 6.0)),
    "vapour_pressure_deficit": ((0.0, 4.0), (0.0, 6.0), (0.05, 9.0)),
    "wind_speed": ((0.0, 6.0), (0.1, 12.0), (0.5, 35.0)),
    "longwave_down": _LONGWAVE,
    "longwave_up": _LONGWAVE,
    "pressure": ((50.0, 106.0), (55.0, 106.0), (55.0, 108.0)),
    "wet_bulb": ((-50.0, 28.0), (-20.0, 30.0), (-15.0, 36.0)),
    "soil_heat_flux": ((-200.0, 40.0), (-60.0, 80.0), (-5.0, 350.0)),
    "sensible_heat": ((-250.0, 60.0), (-80.0, 200.0), (0.0, 700.0)),
    "latent_heat": ((-150.0, 130.0), (-30.0, 350.0), (5.0, 900.0)),
}
_LOOKS_DAILY: dict[str, _Looks] = {
    "shortwave_down": ((0.0, 300.0), (20.0, 380.0), (60.0, 440.0)),
    "shortwave_up": ((0.0, 200.0), (2.0, 250.0), (5.0, 330.0)),
    "net_radiation": ((-120.0, 150.0), (-60.0, 260.0), (5.0, 330.0)),
    "rain": ((0.0, 1.0), (0.0, 20.0), (0.0, 350.0)),
    "sunshine_hours": ((0.0, 12.0), (0.0, 16.0), (2.0, 24.0)),
}
_LOOKS_WITHIN_DAY: dict[str, _Looks] = {
    "shortwave_down": ((-15.0, 60.0), (-5.0, 700.0), (80.0, 1500.0)),
    "shortwave_up": ((-15.0, 60.0), (-5.0, 400.0), (8.0, 900.0)),
    "net_radiation": ((-250.0, 60.0), (-120.0, 500.0), (20.0, 1200.0)),
    "rain": ((0.0, 0.5), (0.0, 2.0), (0.0, 80.0)),
    "sunshine_hours": ((0.0, 0.5), (0.0, 1.0), (0.005, 1.0)),
}
_CANDIDATES = {
    "temperature": ("degC", "degF", "K"),
    "humidity": ("%", "fraction"),
    "speed": ("m/s", "km/h", "mph", "knot"),
    "depth": ("mm", "inch"),
    "duration": ("h", "min"),
}
_CANDIDATES_OF = {
    "pressure": ("hPa", "kPa", "mmHg", "inHg", "Pa"),
    "vapour_pressure": ("kPa", "hPa"),
    "vapour_pressure_deficit": ("kPa", "hPa"),
    "longwave_down": ("W/m2", "MJ/m2"),
    "longwave_up": ("W/m2", "MJ/m2"),
}
_SUN_DAILY = ("MJ/m2", "W/m2", "langley", "kWh/m2")
_SUN_WITHIN_DAY = ("W/m2", "MJ/m2", "kJ/m2", "langley", "kW/m2")


@dataclass(frozen=True)
class ColumnGuess:
    """One column's mapping, why, and what to ask about it."""

    column: ColumnMap
    why: str
    questions: tuple[Question, ...] = ()


def guess_columns(
    table: Table, taken: set[int], interval_s: int, when_why: str
) -> list[ColumnGuess]:
    """A guess for every column; those at the positions `taken` say when, for `when_why`."""
    guesses: list[ColumnGuess] = []
    used: dict[str, str] = {}
    for i, name in enumerate(table.names):
        if i in taken:
            guesses.append(ColumnGuess(ColumnMap(position=i, name=name), when_why))
            continue
        says = read_name(name, table.units[i], table.kinds[i])
        empty = ColumnMap(position=i, name=name, unit=says.unit)
        if says.quantity is None:
            guesses.append(ColumnGuess(empty, says.why))
        elif says.quantity in used:
            why = f"left out: {used[says.quantity]!r} already gives the {_term(says.quantity)}"
            guesses.append(ColumnGuess(empty, why))
        else:
            used[says.quantity] = name
            column = empty.model_copy(update={"quantity": says.quantity, "height_m": says.height_m})
            values = column_values(table, i)
            guesses.append(_unit_guess(column, values, interval_s, says.why, says.unknown_unit))
    return [_ask_body(guess, guesses, table, interval_s) for guess in guesses]


def column_values(table: Table, position: int) -> Floats:
    """Figures of the sample of one column, missing codes left out."""
    cells = [row[position] for row in table.rows[:4000]]
    numbers = [float(c.replace(",", ".")) for c in cells if kind_of(c) == "number"]
    values = np.array(numbers, np.float64)
    return values[np.isfinite(values)]


def find_codes(table: Table) -> tuple[list[str], list[str]]:
    """Figures such as -99 that stand for missing here: repeated, and far below all others."""
    codes: list[str] = []
    notes = []
    for i in range(table.width):
        cells = [row[i].replace(",", ".") for row in table.rows[:4000]]
        for code in _ODD_CODES:
            if code in codes or cells.count(code) < _CODE_SEEN:
                continue
            others = [float(c) for c in cells if kind_of(c) == "number" and float(c) > float(code)]
            below = any(kind_of(c) == "number" and float(c) < float(code) for c in cells)
            if others and not below and min(others) > float(code) / 2:
                codes.append(code)
                notes.append(
                    f"{code} is taken as missing: {table.names[i]!r} has it {cells.count(code)} "
                    f"times, and its next value is {min(others):g}"
                )
    return codes, notes


def unit_question(column: ColumnMap, why: str, suggested: str | None = None) -> Question:
    """The question which unit a column is in."""
    quantity = str(column.quantity)
    choices = [Choice(unit.name, unit.label) for unit in units_for(quantity)]
    return Question(
        f"columns.{column.position}.unit",
        f"Which unit is {column.name!r} ({_term(quantity)}) in?",
        (*choices, Choice(_LEAVE_OUT, "leave the column out")),
        why,
        suggested,
    )


def _unit_guess(
    column: ColumnMap, values: Floats, interval_s: int, name_why: str, unknown: str | None
) -> ColumnGuess:
    quantity = str(column.quantity)
    fitting = [
        u for u in _candidates(quantity, interval_s) if _looks(values, u, quantity, interval_s)
    ]
    height = _height_question(column)
    if unknown is not None:
        why = f"its unit is written {unknown!r}, which is not known here"
        question = unit_question(column, why, fitting[0] if len(fitting) == 1 else None)
        return ColumnGuess(column.model_copy(update={"unit": None}), why, (question, *height))
    if column.unit is not None:
        odd = _odd_for_unit(column, values, interval_s, fitting)
        if odd:
            cleared = column.model_copy(update={"unit": None})
            return ColumnGuess(cleared, odd, (unit_question(column, odd, fitting[0]), *height))
        return ColumnGuess(column, f"{name_why}; the unit is written with it", height)
    if len(fitting) == 1:
        label = UNITS[fitting[0]].label
        why = f"{name_why}; no unit is given, {_span(values)} fit only {label}"
        return ColumnGuess(column.model_copy(update={"unit": fitting[0]}), why, height)
    labels = " or ".join(UNITS[u].label for u in fitting)
    why = f"no unit is given; {_span(values)} " + (
        f"may be {labels}" if fitting else "fit no usual unit"
    )
    suggested = fitting[0] if fitting else None
    return ColumnGuess(
        column, f"{name_why}; {why}", (unit_question(column, why, suggested), *height)
    )


def _candidates(quantity: str, interval_s: int) -> tuple[str, ...]:
    dimension = units_for(quantity)[0].dimension
    if quantity in _CANDIDATES_OF:
        return _CANDIDATES_OF[quantity]
    if dimension == "irradiance":
        if interval_s == _DAILY:
            return _SUN_DAILY
        return _SUN_WITHIN_DAY if interval_s >= _SUMS_FROM else ("W/m2", "kW/m2")
    return _CANDIDATES[dimension]


def _looks(values: Floats, unit: str, quantity: str, interval_s: int) -> bool:
    if values.size == 0:
        return False
    by_step = _LOOKS_DAILY if interval_s == _DAILY else _LOOKS_WITHIN_DAY
    looks = _LOOKS.get(quantity) or by_step[quantity]
    marks = np.percentile(to_si(values, unit, quantity, interval_s), (1, 50, 99))
    fits = all(low <= mark <= high for mark, (low, high) in zip(marks, looks, strict=True))
    if unit == "inch":
        # A gauge in inches is read to a hundredth; figures such as 12.6 or 0.254 are millimetres.
        most = float(values.max())
        return fits and most * 25.4 <= looks[2][1] and bool(np.any(values % 0.1 > 1e-6))
    return fits


def _odd_for_unit(
    column: ColumnMap, values: Floats, interval_s: int, fitting: list[str]
) -> str | None:
    """Why the written unit cannot be right, where the values say so clearly."""
    quantity, unit = str(column.quantity), str(column.unit)
    if values.size < _ENOUGH or not fitting or unit in fitting:
        return None
    if _looks(values, unit, quantity, interval_s):
        return None
    si = to_si(values, unit, quantity, interval_s)
    limits = QUANTITIES[quantity]
    outside = np.mean((si < limits.low) | (si > limits.high))
    tiny = unit == "%" and values.max() <= 1.05
    if outside < 0.2 and not tiny:
        return None
    return f"the unit is written {UNITS[unit].label}, but {_span(values)} do not fit it"


def _ask_body(
    guess: ColumnGuess, all_guesses: list[ColumnGuess], table: Table, interval_s: int
) -> ColumnGuess:
    """Longwave near zero lacks the term of its body temperature: ask which column has that."""
    column = guess.column
    if column.quantity not in ("longwave_down", "longwave_up"):
        return guess
    values = column_values(table, column.position)
    unit = column.unit or "W/m2"
    if values.size == 0 or np.median(to_si(values, unit, column.quantity, interval_s)) > 100.0:
        return guess
    bodies = [
        other.column
        for other in all_guesses
        if "own temperature" in other.why and (other.column.unit in ("degC", "K", "degF", None))
    ]
    why = (
        f"{_span(values)} are too small for longwave: the term of the instrument's own "
        "temperature (sigma T^4) has not been added"
    )
    question = Question(
        f"columns.{column.position}.body_position",
        f"Which column has the body temperature of the instrument of {column.name!r}?",
        (
            *(Choice(str(body.position), body.name) for body in bodies),
            Choice(_LEAVE_OUT, "none: leave the column out"),
        ),
        why,
        str(bodies[0].position) if len(bodies) == 1 else None,
    )
    cleared = column.model_copy(update={"unit": unit, "needs_body": True})
    return ColumnGuess(cleared, why, (question,))


def _height_question(column: ColumnMap) -> tuple[Question, ...]:
    if column.height_m is None or column.quantity != "wind_speed":
        return ()
    return (
        Question(
            f"columns.{column.position}.height_m",
            f"Is the wind measured at {column.height_m:g} m?",
            (Choice(f"{column.height_m:g}", f"{column.height_m:g} m"),),
            "the height is in the name; it must agree with the station's",
            f"{column.height_m:g}",
            blocking=False,
        ),
    )


def _span(values: Floats) -> str:
    if values.size == 0:
        return "the values (none in the part looked at)"
    return f"values from {values.min():g} to {values.max():g}"


def _term(quantity: str) -> str:
    return QUANTITIES[quantity].term
