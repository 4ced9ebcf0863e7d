"""Closing water in words."""

from dataclasses import dataclass
from datetime import date

from app import wording
from app.workflows.closing_water import ClosingWater


@dataclass(frozen=True)
class ClosingWords:
    """What leads, and the rest."""

    lead: str
    says: str


def closing_words(found: ClosingWater, today: date) -> ClosingWords:
    """The last application that pays, the one before it, and what maturity is left with."""
    left = "It leaves" if found.applications else "The soil is left"
    ends = (
        f"{left} {wording.depth(found.left_mm)} mm depleted at maturity, "
        f"{wording.plain_day(found.maturity)}; {wording.depth(found.allowed_mm)} mm "
        f"({wording.share(found.allowed_share)} of TAW) are allowed."
    )
    basis = "By the usual weather, without rain"
    if not found.applications:
        return ClosingWords("Closing water: none to come.", f"{ends}{_short(found)} {basis}.")
    *before, last = found.applications
    count = "" if not before else f" the last of {len(found.applications)} to come,"
    said = (
        f"{wording.depth(last.gross_mm)} mm gross, {wording.number(last.hours, 1)} h;{count} "
        "none after it pays."
    )
    if before:
        said += (
            f" Before it: {wording.plain_day(before[-1].day)}, "
            f"{wording.depth(before[-1].gross_mm)} mm."
        )
    return ClosingWords(
        f"Closing water: {wording.near_day(last.day, today)}",
        f"{said} {ends}{_short(found)} {basis}; each rain puts it off or does away with it.",
    )


def _short(found: ClosingWater) -> str:
    return f" {wording.depth(found.short_mm)} mm will be missing." if found.short_mm else ""
