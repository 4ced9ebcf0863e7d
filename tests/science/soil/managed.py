"""A field watered whenever its limit would be passed, through restarts of its ledger."""

from dataclasses import replace

import numpy as np

from app.science.ledger import (
    BlockLedger,
    BlockPlan,
    BlockWeather,
    Restart,
    block_ledgers,
    state_after,
)


def managed(
    plan: BlockPlan, weather: BlockWeather, *, efficiency: float, fw: float
) -> tuple[BlockPlan, BlockLedger]:
    """The plan with irrigations that refill the root zone on each day that would pass its limit,
    and its ledger."""
    net, wetted = np.zeros(plan.days), np.full(plan.days, np.nan)
    restart: Restart | None = None
    at = 0
    for _ in range(plan.days):
        watered = replace(
            plan, irrigation_net=net, irrigation_gross=net / efficiency, irrigation_fw=wetted
        )
        ledger = block_ledgers([watered], [weather], [restart])[0]
        past = np.flatnonzero(ledger.depletion_mm > ledger.limit_mm)
        past = past[past + at > 0]
        past = past[net[past + at] == 0.0]
        if not past.size:
            break
        i = int(past[0])
        before = ledger.opening_depletion_mm if i == 0 else float(ledger.depletion_mm[i - 1])
        at += i
        net[at], wetted[at] = max(before, 0.0), fw
        state = state_after(ledger, ledger.date[i - 1]) if i > 0 else None
        restart = Restart(since=plan.date[at], state=state) if state is not None else restart
        net, wetted = net.copy(), wetted.copy()
    return watered, block_ledgers([watered], [weather])[0]


def dry_summer(start: np.datetime64, days: int) -> BlockWeather:
    """An invented dry climate of the northern hemisphere: ETo 1.2 to 6.0 mm/d, most in early
    July, 6 mm of rain every 25th day."""
    first = start.astype("datetime64[D]") - start.astype("datetime64[Y]").astype("datetime64[D]")
    day_of_year = int(first.astype(int)) + np.arange(days)
    season = (1.0 - np.cos(2.0 * np.pi * (day_of_year - 5) / 365.0)) / 2.0
    return BlockWeather(
        eto=1.2 + 4.8 * season,
        rain=np.where(np.arange(days) % 25 == 24, 6.0, 0.0),
        u2=np.full(days, 2.0),
        rh_min=np.full(days, 30.0),
        rung=np.full(days, 2, dtype=np.int8),
        rn=np.full(days, 12.0),
    )
