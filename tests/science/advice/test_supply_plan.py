"""The plan of a shared supply.

Sources: scipy.optimize.linprog on a second statement of the problem (only the caps are shared) for
the linear relaxation, and for brute force over every pattern of sets; bookkeeping by hand; the
rest regression of our rules.
"""

from dataclasses import replace
from itertools import product
from time import perf_counter

import numpy as np
import pytest
from scipy.optimize import linprog

from app.science import Bools
from app.science.advice.supply_plan import (
    TINY,
    Allocation,
    Claim,
    SharedSupply,
    _caps,
    _Model,
    by_urgency,
    plan_supply,
    worse,
)


def claim(days: int = 7, **said: object) -> Claim:
    plain: dict[str, object] = {
        "name": "mill-bottom",
        "depletion_mm": 20.0,
        "change_mm": np.full(days, 6.0),
        "limit_mm": np.full(days, 40.0),
        "allowed": np.ones(days, np.bool_),
        "area_ha": 10.0,
        "rate_mm_h": 2.0,
        "efficiency": 0.8,
        "least_h": 4.0,
        "most_h": 20.0,
    }
    return Claim(**(plain | said))  # type: ignore[arg-type]


def supply(days: int = 7, flow: float = 200.0, **said: object) -> SharedSupply:
    plain: dict[str, object] = {
        "flow_m3_h": np.full(days, flow),
        "hours": np.tile([[8.0], [16.0]], (1, days)),
        "price_m3": np.tile([[0.05], [0.12]], (1, days)),
        "sets": np.full(days, np.inf),
    }
    return SharedSupply(**(plain | said))  # type: ignore[arg-type]


def chance(seed: int, blocks: int, days: int) -> tuple[tuple[Claim, ...], SharedSupply]:
    rng = np.random.default_rng(seed)
    claims = tuple(
        claim(
            days,
            name=f"block-{i}",
            depletion_mm=float(rng.uniform(0, 45)),
            change_mm=rng.uniform(-4, 9, days),
            limit_mm=np.full(days, rng.uniform(20, 45)),
            allowed=rng.random(days) > 0.15,
            area_ha=float(rng.uniform(2, 20)),
            interval_days=int(rng.integers(1, 4)),
            farm="ab"[i % 2],
        )
        for i in range(blocks)
    )
    need = sum(one.flow for one in claims)
    return claims, supply(
        days,
        flow=float(need * rng.uniform(0.15, 0.8)),
        hours=np.where(rng.random(days) > 0.2, [[8.0], [10.0]], 0.0),
        sets=rng.choice([1.0, 2.0, np.inf], days),
        allocations=(
            Allocation(first=0, last=days - 1, volume_m3=float(need * days * rng.uniform(1, 8))),
            Allocation(first=0, last=days // 2, volume_m3=float(need * 5), farm="a"),
        ),
    )


def kept(claims: tuple[Claim, ...], shared: SharedSupply, hours: np.ndarray) -> None:
    """Every rule of the supply, counted afresh from the hours by band."""
    flow = np.array([one.flow for one in claims])
    volume = hours * flow[:, None, None]
    assert (hours <= shared.hours + 1e-6).all()
    assert (volume.sum(axis=0) <= shared.flow_m3_h * shared.hours * (1 + 1e-6) + 1e-4).all()
    day = hours.sum(axis=1)
    assert ((day > 0).sum(axis=0) <= shared.sets).all()
    for part in shared.allocations:
        mine = [part.farm in (None, one.farm) for one in claims]
        taken = volume[mine][:, :, part.first : part.last + 1].sum()
        assert taken <= part.volume_m3 * (1 + 1e-6) + 1e-4
    for one, mine in zip(claims, day, strict=True):
        ran = np.flatnonzero(mine)
        assert one.allowed[ran].all()
        assert (mine[ran] >= one.least_h - 1e-4).all()
        assert (mine <= one.most_h + 1e-4).all()
        assert (np.diff(ran) >= one.interval_days).all()


@pytest.mark.parametrize("seed", range(200))
def test_never_worse_than_the_order_of_urgency_and_no_rule_broken(seed: int) -> None:
    claims, shared = chance(seed, 4, 6)
    plan, urgent = plan_supply(claims, shared, 2.0), by_urgency(claims, shared)
    assert plan.past <= urgent.past + TINY
    assert not worse(plan, urgent)
    kept(claims, shared, plan.by_band)
    kept(claims, shared, urgent.by_band)


def independent(
    claims: tuple[Claim, ...], shared: SharedSupply, pattern: Bools | None = None
) -> float:
    """Least past the limit [ha mm d] by linprog, rain-free, written from cumulated water.

    Columns: hours (N, B, H), on (N, H), past (N, H). With a pattern, `on` is that pattern; without,
    it lies in 0-1. Days without rain, and no gain from passing field capacity.
    """
    n, (bands, days) = len(claims), shared.hours.shape
    hours, cells = n * bands * days, n * days
    rows, tops = [], []
    for i, one in enumerate(claims):
        for d in range(days):
            row = np.zeros((3, hours + 2 * cells))
            mine = [(i * bands + b) * days + d for b in range(bands)]
            upto = [(i * bands + b) * days + e for b in range(bands) for e in range(d + 1)]
            on, past = hours + i * days + d, hours + cells + i * days + d
            row[0, mine], row[0, on] = 1.0, -one.most_h
            row[1, mine], row[1, on] = -1.0, one.least_h
            row[2, upto], row[2, past] = -one.rate_mm_h * one.efficiency, -1.0
            rows.append(row)
            dry = one.depletion_mm + one.change_mm[: d + 1].sum()
            tops += [0.0, 0.0, one.limit_mm[d] - dry]
    for cap in _caps(claims, shared):
        rows.append(np.concatenate((cap.coef.ravel(), np.zeros(2 * cells)))[None])
        tops.append(cap.bound)
    for d in range(days):
        if np.isfinite(shared.sets[d]):
            row = np.zeros((1, hours + 2 * cells))
            row[0, [hours + i * days + d for i in range(n)]] = 1.0
            rows.append(row)
            tops.append(shared.sets[d])
    aim = np.zeros(hours + 2 * cells)
    aim[hours + cells :] = np.repeat([one.area_ha * one.priority for one in claims], days)
    bounds = [(0.0, None)] * hours
    bounds += [(0.0, 1.0)] * cells if pattern is None else [(v, v) for v in pattern.ravel() * 1.0]
    bounds += [(0.0, None)] * cells
    found = linprog(aim, np.concatenate(rows), tops, bounds=bounds, method="highs-ipm")
    return float(found.fun) if found.status == 0 else np.inf


def tiny(seed: int) -> tuple[tuple[Claim, ...], SharedSupply]:
    """Two blocks and three days, dry enough that no set passes field capacity."""
    rng = np.random.default_rng(seed)
    claims = tuple(
        claim(
            3,
            name=f"block-{i}",
            depletion_mm=float(rng.uniform(35, 50)),
            change_mm=rng.uniform(2, 9, 3),
            area_ha=float(rng.uniform(5, 15)),
            least_h=8.0,
            most_h=11.0,
            priority=float(rng.choice([1.0, 2.0])),
        )
        for i in range(2)
    )
    flow = float(rng.uniform(150, 450))
    volume = float(flow * rng.uniform(12, 40))
    parts = (Allocation(first=0, last=2, volume_m3=volume),)
    return claims, supply(3, flow=flow, sets=np.array([2.0, 1.0, 2.0]), allocations=parts)


@pytest.mark.parametrize("seed", range(12))
def test_as_good_as_trying_every_pattern_of_sets(seed: int) -> None:
    claims, shared = tiny(seed)
    patterns = product((False, True), repeat=6)
    best = min(independent(claims, shared, np.reshape(p, (2, 3))) for p in patterns)
    assert plan_supply(claims, shared).past == pytest.approx(best, rel=3e-3, abs=0.01)


@pytest.mark.parametrize("seed", range(12))
def test_the_linear_relaxation_is_that_of_linprog(seed: int) -> None:
    from scipy.optimize import Bounds, LinearConstraint, milp

    claims, shared = tiny(seed)
    model = _Model(claims, shared, _caps(claims, shared))
    rows, low, high = model.rows()
    relaxed = milp(
        model.aims()[0],
        bounds=Bounds(model.low, model.high),
        constraints=LinearConstraint(rows, low, high),
    )
    assert relaxed.fun == pytest.approx(independent(claims, shared), rel=1e-6, abs=1e-4)


def test_plenty_keeps_all_within_their_limit_in_the_cheap_hours() -> None:
    plan = plan_supply((claim(), claim(name="reach")), supply(flow=500.0))
    assert plan.given_up == ()
    assert plan.past == 0.0
    # each lacks 20 + 42 - 40 mm net over the week, 1.6 mm net an hour, 200 m3 an hour at 0.05
    assert plan.cost == pytest.approx(2 * 22 / 1.6 * 200 * 0.05, rel=2e-3)


def test_what_is_given_up_is_named_with_its_mm_and_the_rule() -> None:
    spent = supply(allocations=(Allocation(first=0, last=6, volume_m3=1000.0),))
    plan = plan_supply((claim(),), spent)
    (given,) = plan.given_up
    # 1000 m3 on 10 ha at 0.8 is 8 mm of the 22 mm that lack
    assert given.deepest_mm == pytest.approx(14.0, abs=0.05)
    assert (given.name, given.rule) == ("mill-bottom", "allocation")
    assert plan_supply((claim(),), supply(hours=np.zeros((2, 7)))).given_up[0].rule == "turn"
    assert plan_supply((claim(),), supply(sets=np.zeros(7))).given_up[0].rule == "labour"
    assert plan_supply((claim(),), supply(flow=199.0)).given_up[0].rule == "draw"


def test_pins_are_kept_and_those_that_do_not_fit_are_refused() -> None:
    pinned = np.full(7, np.nan)
    pinned[1], pinned[3] = 10.0, 0.0
    plan = plan_supply((claim(pinned_h=pinned), claim(name="reach")), supply(flow=300.0))
    assert plan.hours[0, 1] == pytest.approx(10.0, abs=1e-4)
    assert plan.hours[0, 3] == 0.0
    with pytest.raises(ValueError, match=r"mill-bottom: 10 h pinned on day 2 do not fit"):
        plan_supply((claim(pinned_h=pinned),), supply(flow=100.0))


def test_two_sets_that_do_not_fit_beside_each_other_share_the_hours() -> None:
    claims = (claim(depletion_mm=60.0), claim(name="reach", depletion_mm=60.0))
    plan = plan_supply(claims, supply(flow=300.0))
    assert plan.hours.sum(axis=0).max() <= 24.0 + 1e-4


@pytest.mark.parametrize(
    ("said", "words"),
    [
        ({"area_ha": 0.0}, "area_ha"),
        ({"efficiency": 1.2}, "efficiency"),
        ({"least_h": 21.0}, "a set of"),
        ({"depletion_mm": float("nan")}, "missing"),
        ({"interval_days": 0}, "interval_days"),
        ({"pinned_h": np.full(7, 30.0)}, "pin"),
        ({"limit_mm": np.zeros(3)}, "limit_mm"),
    ],
)
def test_wrong_claims_are_refused(said: dict[str, object], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        claim(**said)


def test_wrong_supplies_are_refused() -> None:
    with pytest.raises(ValueError, match="24 h"):
        supply(hours=np.full((2, 7), 13.0))
    with pytest.raises(ValueError, match="below 0"):
        supply(flow=-1.0)
    with pytest.raises(ValueError, match="outside the days"):
        supply(allocations=(Allocation(first=0, last=9, volume_m3=1.0),))
    with pytest.raises(ValueError, match="number of days"):
        plan_supply((claim(6),), supply(7))


def test_sixty_blocks_and_fourteen_days_are_planned_and_the_gap_is_told() -> None:
    claims, shared = chance(3, 60, 14)
    shared = replace(shared, sets=np.full(14, 20.0))
    start = perf_counter()
    plan = plan_supply(claims, shared, 10.0)
    assert perf_counter() - start < 20.0  # 10 s of solving on two free cores; others may share them
    assert plan.past <= by_urgency(claims, shared).past + TINY
    assert 1 <= len(plan.gaps) <= 3
    kept(claims, shared, plan.by_band)
