"""Outturn of advice, worded."""

from collections.abc import Sequence
from typing import NamedTuple

from app import wording
from app.science.advice.outturn import FOLLOWED, NO_NEED, NOT_DONE, OTHERWISE, UNASKED, Skill
from app.workflows.outturn import Outturn

OUTCOMES = {
    FOLLOWED: "followed",
    OTHERWISE: "watered on another day or with another depth",
    NOT_DONE: "not watered",
    UNASKED: "watered unasked",
    NO_NEED: "no water asked for, none given",
}
DECIDED = {"accept": "accepted", "change": "changed by the advisor", "withhold": "withheld"}


class Told(NamedTuple):
    """One outturn in words."""

    morning: str
    field_key: str
    field: str
    number: int
    advised: str
    done: str
    foretold: str
    known: str
    lead: str
    late: str


def told(one: Outturn) -> Told:
    """An outturn as a row."""
    advice = one.advice
    watering = advice.day is not None and advice.net_mm > 0
    decided = f"; {DECIDED[one.decided.verdict]}" if one.decided else ""
    return Told(
        wording.short_day(advice.issued_on),
        advice.field_key,
        advice.field_name,
        advice.number,
        f"{wording.short_day(advice.day)}, {wording.depth(advice.net_mm)} mm net" + decided
        if watering and advice.day is not None
        else f"no water{decided}",
        OUTCOMES[one.done],
        wording.number(one.foretold_mm, 1),
        wording.number(one.known_mm, 1),
        wording.counted(one.lead, "day", "days") if one.lead else "watered at once",
        wording.counted(one.late_days, "day", "days") if one.late_days else "",
    )


def skill_rows(skill: Sequence[Skill]) -> list[tuple[str, ...]]:
    """Skill by lead, as figures."""
    return [
        (
            wording.counted(one.lead, "day", "days"),
            wording.number(one.n),
            wording.signed(one.bias),
            wording.number(one.rmse, 1),
            wording.share(one.covered),
            wording.number(one.persistence, 1),
        )
        for one in skill
    ]
