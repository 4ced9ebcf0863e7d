"""Figures and dates as text."""

import math
from datetime import date

NARROW = "\u202f"
MINUS = "\u2212"
NO_FIGURE = "–"


def number(value: float | None, digits: int = 0) -> str:
    """A figure with `digits` decimals, thousands set apart, a true minus sign; a dash for none."""
    if value is None or not math.isfinite(value):
        return NO_FIGURE
    text = f"{value:,.{digits}f}".replace(",", NARROW)
    if text.startswith("-"):
        text = text[1:] if not text.strip("-0." + NARROW) else MINUS + text[1:]
    return text


def blank(value: float | None, digits: int = 1) -> str:
    """As `number`, but nothing at all for none and for what rounds to zero (ledger columns)."""
    if value is None or not math.isfinite(value) or abs(value) < 0.5 * 10**-digits:
        return ""
    return number(value, digits)


def depth(value: float | None) -> str:
    """A depth [mm] for a decision: whole, one decimal below 10."""
    if value is None or not math.isfinite(value):
        return NO_FIGURE
    return number(value, 0 if abs(value) >= 9.95 or abs(value) < 0.05 else 1)


def signed(value: float | None, digits: int = 1) -> str:
    """A change, with its sign."""
    text = number(value, digits)
    return f"+{text}" if value is not None and value > 0 and text.strip("0.") else text


def volume(value: float | None) -> str:
    """A volume [m3] to three figures."""
    if value is None or not math.isfinite(value) or value == 0:
        return number(value)
    return number(round(value, 2 - math.floor(math.log10(abs(value)))))


def share(value: float | None) -> str:
    """A fraction as per cent."""
    return NO_FIGURE if value is None else f"{number(100 * value)}{NARROW}%"


def plain(value: float) -> str:
    """A figure for an input box: no spaces, no trailing zeros."""
    return f"{round(value, 6):.12g}"


def reading(value: float) -> str:
    """A reading as it was measured, to at most five figures; nothing for none."""
    return "" if not math.isfinite(value) else f"{value:.5g}".replace("-", MINUS)


# Dates

WEEKDAYS = ("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
MONTHS = (
    *("January", "February", "March", "April", "May", "June"),
    *("July", "August", "September", "October", "November", "December"),
)


def long_day(day: date) -> str:
    """`Tuesday 14 July`."""
    return f"{WEEKDAYS[day.weekday()]} {day.day} {MONTHS[day.month - 1]}"


def short_day(day: date) -> str:
    """`Tue 14 Jul`."""
    return f"{WEEKDAYS[day.weekday()][:3]} {day.day} {MONTHS[day.month - 1][:3]}"


def plain_day(day: date | None) -> str:
    """`14 July`; a dash for none."""
    return NO_FIGURE if day is None else f"{day.day} {MONTHS[day.month - 1]}"


def full_day(day: date | None) -> str:
    """`14 July 2026`; a dash for none."""
    return NO_FIGURE if day is None else f"{plain_day(day)} {day.year}"


def near_day(day: date, today: date) -> str:
    """`today`, `tomorrow`, `yesterday`, the weekday within six days, else `14 Jul`."""
    away = (day - today).days
    if away in NEAR:
        return NEAR[away]
    if -7 < away < 7:
        return WEEKDAYS[day.weekday()]
    return f"{day.day} {MONTHS[day.month - 1][:3]}"


NEAR = {-1: "yesterday", 0: "today", 1: "tomorrow"}


def days(count: int) -> str:
    """`1 day`, `3 days`."""
    return f"{number(count)} {'day' if count == 1 else 'days'}"


def counted(count: int, one: str, many: str) -> str:
    """`1 field`, `23 fields`."""
    return f"{number(count)} {one if count == 1 else many}"
