"""The reason under each advice: one plain sentence for each code, with its figures."""

import string
import warnings
from collections.abc import Mapping
from datetime import date
from functools import cache
from typing import Any

from app.wording.codes import UnwordedCode
from app.wording.figures import NEAR, days, depth, near_day, number, share, volume

FIGURES = {
    "mm": lambda value: f"{depth(value)} mm",
    "h": lambda value: number(value, 1),
    "n": number,
    "days": lambda value: days(round(value)),
    "share": share,
    "m3": volume,
}
REASONS = {
    "limit_not_reached": "Within its limit for {horizon_days:days}.",
    "back_within": "Past its limit now, and back within it without watering.",
    "last_chance": "Passes its limit {limit_day:on}; {day:near} is the last chance before.",
    "last_chance_same_day": "Passes its limit by the close of {day:near} unless watered.",
    "covering": (
        "Passes its limit {limit_day:on}; covering the field takes {cover_days:days}, "
        "so it starts {day:on}."
    ),
    "early_to_keep_up": (
        "Waiting for the last chance before the limit, {limit_day:near}, the system could not "
        "hold it afterwards; so it starts {day:on}."
    ),
    "past_limit": "Past its limit: {depletion_mm:mm} of {limit_mm:mm}.",
    "no_chance_in_time": (
        "Passes its limit {limit_day:on}, before water can hold it; the first chance is "
        "{first_chance:near}."
    ),
    "falling_behind": (
        "The system falls behind: at most {most_net_mm:mm} net every {interval_days:days}, "
        "against {etc_mm:mm} of crop ET in {horizon_days:days}."
    ),
    "no_chance": (
        "Passes its limit {limit_day:on}, and there is no chance to water within "
        "{horizon_days:days}: keep-off or interval."
    ),
}
BOUNDS = {
    "": "",
    "least": "The depth is the least the system applies.",
    "most": "The depth is the most the system applies at once.",
    "hours": "The depth is what the system’s hours allow.",
    "intake": "The depth is the most the soil takes in at once.",
}
PLANNED = (
    "By its stage’s plan {et_target:share} of the crop’s use is given back, and "
    "{refill_to_mm:mm} stay unfilled."
)
NOT_HELD = "{past_field_capacity_mm:mm} of it the root zone cannot hold."


@cache
def _pieces(template: str) -> tuple[tuple[str, str, str], ...]:
    """A template taken apart: text before, name of the figure, how it is said."""
    parts = string.Formatter().parse(template)
    return tuple((text, name or "", spec or "") for text, name, spec, _ in parts)


def _said(value: Any, spec: str, today: date) -> str:
    """A figure as its template wants it said: `net_mm:mm`, `limit_day:on`, `cover_days:days`."""
    if spec not in ("near", "on"):
        return FIGURES[spec](float(value))
    day = date.fromisoformat(str(value))
    said = near_day(day, today)
    return said if spec == "near" or (day - today).days in NEAR else f"on {said}"


def sentence(template: str, figures: Mapping[str, Any], today: date) -> str:
    """A sentence of a table with its figures; the first letter is made large."""
    said = "".join(
        text + (_said(figures[name], spec, today) if name else "")
        for text, name, spec in _pieces(template)
    )
    return said[:1].upper() + said[1:]


def reason(code: str, figures: Mapping[str, Any], day: date | None, today: date) -> str:
    """The sentence of an advice's reason; `day` is the day to water.

    A code without a sentence warns (`UnwordedCode`) and is shown as it is.
    """
    known = {**figures, "day": str(day)} if day is not None else figures
    if code == "last_chance" and known.get("limit_day") == known.get("day"):
        code = "last_chance_same_day"
    if code not in REASONS:
        warnings.warn(f"no sentence for {code!r}", UnwordedCode, stacklevel=2)
        return code.replace("_", " ")
    return sentence(REASONS[code], known, today)


def bound(figures: Mapping[str, Any], today: date) -> str:
    """What set the depth instead of the depletion, and what of it cannot be held."""
    code = str(figures.get("bound", ""))
    if code not in BOUNDS:
        warnings.warn(f"no sentence for bound {code!r}", UnwordedCode, stacklevel=2)
    said = [BOUNDS.get(code, code)]
    if "et_target" in figures:
        said.append(sentence(PLANNED, figures, today))
    if float(figures.get("past_field_capacity_mm", 0.0)) >= 0.05:
        said.append(sentence(NOT_HELD, figures, today))
    return " ".join(text for text in said if text)
