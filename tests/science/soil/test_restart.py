"""A ledger run on from a saved state is the ledger run whole, bit for bit. Source: our own rule
(regression)."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.science.ledger import (
    BlockLedger,
    Restart,
    block_ledgers,
    closure_error,
    state_after,
)
from tests.science.random_blocks import random_blocks
from tests.science.soil.fields import field, weather
from tests.science.test_ledger import assert_same, cut, shortened


@settings(max_examples=10, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_run_on_from_a_saved_state_equals_run_whole(seed: int) -> None:
    """Alone and in company, restarted or not, on the first day, in between and on the last."""
    plans, weather = random_blocks(seed, 10, most_days=60)
    whole = block_ledgers(plans, weather)
    rng = np.random.default_rng(seed)
    restarts: list[Restart | None] = []
    for ledger in whole:
        place = int(rng.integers(0, ledger.date.size))
        day = ledger.date[place]
        state = None if place == 0 else state_after(ledger, day - 1)
        restarts.append(None if state is None else Restart(since=day, state=state))
    together = block_ledgers(plans, weather, restarts)
    for i, (restart, ledger) in enumerate(zip(restarts, whole, strict=True)):
        rest = together[i]
        assert_same(rest, block_ledgers([plans[i]], [weather[i]], [restart])[0])
        assert_same(rest, from_place(ledger, ledger.date.size - rest.date.size))
        assert closure_error(rest) < 1e-9


def test_day_by_day_equals_at_once() -> None:
    """A ledger that grows by a day at a time, each from the state of the day before, and knows
    nothing of the days to come."""
    plans, weather = random_blocks(31, 12, most_days=40)
    for plan, sky in zip(plans, weather, strict=True):
        if plan.season.climate_adjustment == "stage_mean":
            continue
        whole = block_ledgers([plan], [sky])[0]
        restart: Restart | None = None
        for i in range(plan.days):
            today, known = shortened(plan, i + 1), cut(sky, i + 1)
            one = block_ledgers([today], [known], [restart])[0]
            assert one.date.tolist() == [plan.date[i].item()]
            assert_same(one, from_place(shortened_ledger(whole, i + 1), i))
            restart = Restart(since=plan.date[i] + 1, state=state_after(one, plan.date[i]))


def shortened_ledger(ledger: BlockLedger, days: int) -> BlockLedger:
    columns = {k: v[:days] for k, v in vars(ledger).items() if k != "opening_depletion_mm"}
    return BlockLedger(opening_depletion_mm=ledger.opening_depletion_mm, **columns)


def from_place(ledger: BlockLedger, place: int) -> BlockLedger:
    columns = {k: v[place:] for k, v in vars(ledger).items() if k != "opening_depletion_mm"}
    before = ledger.opening_depletion_mm if place == 0 else ledger.depletion_mm[place - 1]
    return BlockLedger(opening_depletion_mm=float(before), **columns)


def test_a_correction_eleven_days_back_recomputes_eleven_days() -> None:
    plan, sky = field(40, net={10: 30.0}, rise={20: 1.0}, curve_number=80.0), weather(40)
    before = block_ledgers([plan], [sky])[0]
    corrected = replace(plan, correction=np.where(np.arange(40) == 29, 9.0, 0.0))
    restart = Restart(since=plan.date[29], state=state_after(before, plan.date[28]))
    rest = block_ledgers([corrected], [sky], [restart])[0]
    assert rest.date.size == 11
    assert rest.correction_mm[0] == 9.0
    assert_same(rest, from_place(block_ledgers([corrected], [sky])[0], 29))


def test_a_restart_outside_its_plan_is_refused() -> None:
    plan, sky = field(5), weather(5)
    ledger = block_ledgers([plan], [sky])[0]
    state = state_after(ledger, plan.date[4])
    with pytest.raises(ValueError, match="a restart on 2025-06-06 lies outside"):
        block_ledgers([plan], [sky], [Restart(since=plan.date[4] + 1, state=state)])
    with pytest.raises(ValueError, match="not 2025-06-06"):
        state_after(ledger, plan.date[4] + 1)
    with pytest.raises(ValueError, match="1 plans, but 2 restarts"):
        block_ledgers([plan], [sky], [None, None])
