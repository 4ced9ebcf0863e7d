"""What a block's days ahead would be with water, or rain, that is not there: nothing is stored."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date, timedelta

from sqlalchemy.orm import Session

from app.workflows import agronomy
from app.workflows.assemble import Subject, assemble
from app.workflows.once import EntryError
from app.workflows.recompute import compute

MOST_MM = 500.0
"""More in one go is a slip of the pen."""


@dataclass(frozen=True)
class Tried:
    """One day ahead: depletion at its close as things stand and as tried, and the limit [mm]."""

    day: date
    depletion_mm: float
    tried_mm: float
    limit_mm: float


@dataclass(frozen=True)
class WhatIf:
    """The days ahead as tried; the first day each course closes past the limit, None for none."""

    days: tuple[Tried, ...]
    passes: date | None
    tried_passes: date | None
    net_mm: float


def what_if(
    session: Session, block: int, today: date, day: date, gross_mm: float, rain_mm: float
) -> WhatIf:
    """The days ahead of a block with `gross_mm` applied and `rain_mm` fallen on `day`.

    Raises EntryError for a day that is not ahead, amounts that cannot be, and a block on which
    nothing is reckoned.
    """
    for name, amount in (("gross_mm", gross_mm), ("rain_mm", rain_mm)):
        if not 0.0 <= amount <= MOST_MM:
            raise EntryError(f"{name} is {amount:g}; give 0 to {MOST_MM:g} mm")
    subjects = assemble(session, {block: today}, today - timedelta(days=1))
    if not subjects or subjects[-1].past >= subjects[-1].plan.days:
        raise EntryError("nothing grows here in the days ahead")
    subject = subjects[-1]
    first = agronomy.as_date(subject.plan.date[subject.past])
    last = agronomy.as_date(subject.plan.date[-1])
    if not first <= day <= last:
        raise EntryError(f"day is {day}; give a day from {first} to {last}")
    net = gross_mm * subject.block.system["efficiency"]
    plain, tried = compute([subject, _with(subject, day, gross_mm, net, rain_mm)])
    days = tuple(
        Tried(agronomy.as_date(at), float(depletion), float(other), float(limit))
        for at, depletion, other, limit in zip(
            plain.ledger.date[subject.past :],
            plain.ledger.depletion_mm[subject.past :],
            tried.ledger.depletion_mm[subject.past :],
            tried.ledger.limit_mm[subject.past :],
            strict=True,
        )
    )
    return WhatIf(
        days,
        _first_past([(one.day, one.depletion_mm, one.limit_mm) for one in days]),
        _first_past([(one.day, one.tried_mm, one.limit_mm) for one in days]),
        net,
    )


def _first_past(days: Sequence[tuple[date, float, float]]) -> date | None:
    return next((day for day, depletion, limit in days if depletion > limit), None)


def _with(subject: Subject, day: date, gross: float, net: float, rain: float) -> Subject:
    plan, weather = subject.plan, subject.weather
    place = (day - agronomy.as_date(plan.start)).days
    water = [values.copy() for values in (plan.irrigation_gross, plan.irrigation_net)]
    wetted, fallen = plan.irrigation_fw.copy(), weather.rain.copy()
    water[0][place] += gross
    water[1][place] += net
    fallen[place] += rain
    if net > 0.0:
        wetted[place] = agronomy.wetted_fraction(subject.block.system)
    return replace(
        subject,
        plan=replace(
            plan, irrigation_gross=water[0], irrigation_net=water[1], irrigation_fw=wetted
        ),
        weather=replace(weather, rain=fallen),
    )
