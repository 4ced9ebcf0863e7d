"""The plan of a supply as the page shows it."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date

import numpy as np

from app import wording
from app.workflows.plan_supply import Planned

RULES = {
    "allocation": "the allocation is spent",
    "share": "its farm's share is spent",
    "turn": "no day of the turn, or free of a keep-off, comes in time",
    "labour": "no more sets can be moved on those days",
    "draw": "it draws more than the supply gives; give its system the rate of what runs at once",
    "flow": "the flow is taken up by others",
    "set": "its own hours and interval, and the days of the turn, allow no more",
}


@dataclass(frozen=True)
class Cell:
    """Hours of one block on one day; pinned by hand; whether the day closes past the limit."""

    hours: float
    pinned: bool
    past: bool


@dataclass(frozen=True)
class Line:
    """One day: its cells, load [m3], share of what the supply could give, cost."""

    day: date
    cells: tuple[Cell, ...]
    load_m3: float
    share: float | None
    cost: float


@dataclass(frozen=True)
class SupplyView:
    """The plan in the order of its columns, and what is said of it."""

    columns: tuple[tuple[int, str, str], ...]
    lines: tuple[Line, ...]
    totals: tuple[float, ...]
    load_m3: float
    cost: float
    priced: bool
    given_up: tuple[str, ...]
    proof: str
    pinned: tuple[str, ...]


def supply_view(found: Planned, pins: Mapping[tuple[int, date], float], today: date) -> SupplyView:
    """The rows, sums and sentences of a plan."""
    plan, supply = found.plan, found.supply
    flow = np.array([claim.flow for claim in found.claims])
    cost = (plan.by_band * flow[:, None, None] * supply.price_m3).sum(axis=(0, 1))
    could = supply.flow_m3_h * supply.hours.sum(axis=0)
    names = {number: claim.name for number, claim in zip(found.blocks, found.claims, strict=True)}
    lines = tuple(
        Line(
            day=day,
            cells=tuple(
                Cell(
                    hours=float(plan.hours[i, d]),
                    pinned=(number, day) in pins,
                    past=bool(plan.depletion_mm[i, d] > found.claims[i].limit_mm[d] + 1e-3),
                )
                for i, number in enumerate(found.blocks)
            ),
            load_m3=float(plan.load_m3[d]),
            share=float(plan.load_m3[d] / could[d] * 100.0) if could[d] > 0.0 else None,
            cost=float(cost[d]),
        )
        for d, day in enumerate(found.days)
    )
    return SupplyView(
        columns=tuple(
            (number, key, claim.name)
            for number, key, claim in zip(found.blocks, found.fields, found.claims, strict=True)
        ),
        lines=lines,
        totals=tuple(float(total) for total in plan.hours.sum(axis=1)),
        load_m3=float(plan.load_m3.sum()),
        cost=plan.cost,
        priced=bool((supply.price_m3 > 0.0).any()),
        given_up=tuple(
            f"{one.name} passes its limit {wording.near_day(found.days[one.day], today)}, "
            f"at most by {one.deepest_mm:.0f} mm: {RULES[one.rule]}."
            for one in plan.given_up
        ),
        proof=_proof(found),
        pinned=tuple(
            f"{names[number]}, {wording.near_day(day, today)}: "
            + (f"{hours:g} h" if hours else "no water")
            for (number, day), hours in sorted(pins.items())
            if number in names
        ),
    )


def _proof(found: Planned) -> str:
    plan = found.plan
    if plan.chosen == "urgency":
        return "Served in order of urgency: no better plan was found in the time given."
    gap = plan.gaps[0]
    near = "the best there is" if gap < 1e-3 else f"within {gap:.1%} of the best there may be"
    return f"On what is given up, this plan is {near}; it is no worse than order of urgency."
