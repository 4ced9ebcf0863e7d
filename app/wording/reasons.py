"""The reason under each advice: one plain sentence for each code, with its figures."""

import string
import warnings
from collections.abc import Mapping
from datetime import date
from typing import Any

from app.wording.codes import UnwordedCode
from app.wording.figures import days, depth, near_day, number, share, volume


class _Figures(string.Formatter):
    """Puts figures into a sentence: `{net_mm:mm}`, `{limit_day:near}`, `{station:name}`."""

    def __init__(self, today: date) -> None:
        self.today = today

    def format_field(self, value: Any, format_spec: str) -> str:
        if format_spec in ("near", "weekday"):
            return near_day(date.fromisoformat(str(value)), self.today)
        if format_spec == "name":
            return str(value)
        return FIGURES[format_spec](float(value))


FIGURES = {
    "mm": depth,
    "mm1": lambda value: number(value, 1),
    "h": lambda value: number(value, 1),
    "n": number,
    "days": lambda value: days(round(value)),
    "share": share,
    "m3": volume,
}


def sentence(template: str, figures: Mapping[str, Any], today: date) -> str:
    """A sentence of a table with its figures; the first letter is made large."""
    text = _Figures(today).vformat(template, (), figures)
    return text[:1].upper() + text[1:]


REASONS = {
    "late": "Past its limit.",
}


def reason(code: str, figures: Mapping[str, Any], today: date) -> str:
    """The sentence of an advice's reason; a code without one warns and is shown as it is."""
    if code not in REASONS:
        warnings.warn(f"no sentence for {code!r}", UnwordedCode, stacklevel=2)
        return code.replace("_", " ")
    return sentence(REASONS[code], figures, today)
