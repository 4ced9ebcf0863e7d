"""The plan of a shared supply for the days ahead, from the ledgers as they stand."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np
from sqlalchemy.orm import Session

from app.book.supply import WEEKDAYS, SupplyPart
from app.science.advice.keeping_up import daily_change
from app.science.advice.supply_plan import (
    M3_PER_MM_HA,
    Allocation,
    Claim,
    SharedSupply,
    SupplyPlan,
    plan_supply,
)
from app.storage import supplies as store
from app.storage.tables_supply import Supply
from app.workflows import agronomy
from app.workflows.assemble import Subject, assemble
from app.workflows.once import EntryError
from app.workflows.recompute import Computed, compute

Pins = Mapping[tuple[int, date], float]
"""Hours fixed by hand, by block and day."""


@dataclass(frozen=True)
class Planned:
    """A plan with what it was made of: days, and in one order blocks, claims and field keys."""

    days: tuple[date, ...]
    blocks: tuple[int, ...]
    claims: tuple[Claim, ...]
    fields: tuple[str, ...]
    supply: SharedSupply
    plan: SupplyPlan


def planned(
    session: Session, row: Supply, today: date, days: int, pins: Pins, time_limit_s: float = 10.0
) -> Planned | None:
    """The plan of a supply for `days` days from today; None where nothing grows on it.

    Hours of a day fall over the whole block, also where the system covers it in several days: the
    least of a day is then its part of the least depth. Raises EntryError for pins that do not fit.
    """
    part = SupplyPart.model_validate({**row.details, "fields": ["any"]})
    blocks = store.blocks_on(session, row.id)
    names = _names(blocks)
    told = {number: (key, farm) for number, key, _, farm in blocks}
    subjects = assemble(session, dict.fromkeys(told, today), today - timedelta(days=1))
    computed = [one for one in compute(subjects) if one.subject.past < one.subject.plan.days]
    if not computed:
        return None
    ahead = min([days, *(one.subject.plan.days - one.subject.past for one in computed)])
    dates = tuple(today + timedelta(days=n) for n in range(ahead))
    claims = tuple(
        _claim(one, names[number], told[number][1], dates, part.conveyance_loss, pins)
        for one in computed
        for number in [one.subject.block.block_id]
    )
    shared = _supply(session, row, part, dates)
    try:
        plan = plan_supply(claims, shared, time_limit_s)
    except ValueError as error:
        raise EntryError(str(error)) from None
    numbers = tuple(one.subject.block.block_id for one in computed)
    fields = tuple(told[number][0] for number in numbers)
    return Planned(dates, numbers, claims, fields, shared, plan)


def _names(blocks: list[tuple[int, str, str, str]]) -> dict[int, str]:
    """A name for each block, its field's; numbered where a field has several."""
    keys = [key for _, key, _, _ in blocks]
    seen: dict[str, int] = {}
    names = {}
    for number, key, name, _ in blocks:
        seen[key] = seen.get(key, 0) + 1
        names[number] = name if keys.count(key) == 1 else f"{name} {seen[key]}"
    return names


def _claim(
    one: Computed, name: str, farm: str, dates: tuple[date, ...], loss: float, pins: Pins
) -> Claim:
    subject: Subject = one.subject
    ledger, past, size = one.ledger, subject.past, len(dates)
    system = agronomy.application_system(subject.block.system)
    now = float(ledger.depletion_mm[past - 1] if past else ledger.opening_depletion_mm)
    span = slice(past, past + size)
    limit = ledger.limit_mm[span]
    change = daily_change(now, ledger.depletion_mm[span], limit, ledger.etc_potential_mm[span])
    allowed = agronomy.keep_off_mask(subject.block.field, ledger.date[span], subject.keep_offs)
    gap = 1 if system.cover_days > 1 else system.interval_days
    if subject.last_irrigation is not None:
        since = (dates[0] - subject.last_irrigation).days
        allowed = allowed & (np.arange(size) >= gap - since)
    most = min(system.hours_per_day, system.most_mm / system.rate_mm_h)
    least = system.least_mm / system.rate_mm_h / system.cover_days
    return Claim(
        name=name,
        depletion_mm=now,
        change_mm=change,
        limit_mm=limit,
        allowed=allowed,
        area_ha=subject.block.area_ha,
        rate_mm_h=system.rate_mm_h,
        efficiency=system.efficiency,
        least_h=min(least, most),
        most_h=most,
        interval_days=gap,
        flow_m3_h=system.rate_mm_h * subject.block.area_ha * M3_PER_MM_HA / (1.0 - loss),
        farm=farm,
        pinned_h=np.array([pins.get((subject.block.block_id, day), np.nan) for day in dates]),
    )


def _supply(
    session: Session, row: Supply, part: SupplyPart, dates: tuple[date, ...]
) -> SharedSupply:
    size = len(dates)
    flows = sorted(part.flows, key=lambda flow: flow.since)
    flow = [
        next((f.flow_m3_h for f in reversed(flows) if f.since <= day), part.flow_m3_h)
        for day in dates
    ]
    open_days = np.array([_in_turn(part, day) for day in dates])
    bands = [(band.hours, band.price_m3) for band in part.tariff] or [(24.0, 0.0)]
    sets = [
        0.0
        if part.labour_days and WEEKDAYS[day.weekday()] not in part.labour_days
        else float(part.sets_a_day or np.inf)
        for day in dates
    ]
    allocations = []
    for one in part.allocations:
        if one.last < dates[0] or one.first > dates[-1]:
            continue
        taken = store.taken_mm_ha(session, row.id, one.first, dates[0], one.farm)
        used = sum(mm * area for mm, area in taken) * M3_PER_MM_HA / (1.0 - part.conveyance_loss)
        allocations.append(
            Allocation(
                first=max((one.first - dates[0]).days, 0),
                last=min((one.last - dates[0]).days, size - 1),
                volume_m3=max(one.volume_m3 - used, 0.0),
                farm=one.farm,
            )
        )
    return SharedSupply(
        flow_m3_h=np.array(flow, dtype=np.float64),
        hours=np.array([[hours] * size for hours, _ in bands]) * open_days,
        price_m3=np.array([[price] * size for _, price in bands]),
        sets=np.array(sets),
        allocations=tuple(allocations),
    )


def _in_turn(part: SupplyPart, day: date) -> bool:
    if part.turn is None:
        return True
    since = (day - part.turn.first).days
    return since >= 0 and since % part.turn.every_days < part.turn.for_days
