"""Which block gets how many hours of a shared supply on which day: a mixed-integer plan."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from app.science import Bools, Floats

M3_PER_MM_HA = 10.0
# Share by which a later aim may worsen an earlier one, and the shares of the time each may take.
HOLD, TIME_SHARES = 0.001, (0.6, 0.25, 0.15)
# Hours and mm below this are none; at most so many parallel sets are counted one by one.
TINY, PARALLEL = 1e-6, 4


@dataclass(frozen=True, kw_only=True)
class Claim:
    """What one block asks of the supply.

    depletion_mm: at the opening of the first day. change_mm, limit_mm (H,) [mm]: change of
    depletion on a day without water, and its limit (NaN: never passed). allowed (H,) bool: no
    keep-off. area_ha above 0. rate_mm_h: gross over the block while it runs. efficiency 0-1: net
    over gross. least_h, most_h: hours of a set on one day, 0-24. interval_days: from one set to
    the next. flow_m3_h: drawn from the supply while it runs, None for rate over area; above that
    where water is lost on the way. priority: weight of a day past the limit. farm: whose share it
    draws on. pinned_h (H,): hours fixed by hand, NaN where free; a pin overrules `allowed`, the
    interval and the least.
    Raises ValueError naming block and value.
    """

    name: str
    depletion_mm: float
    change_mm: Floats
    limit_mm: Floats
    allowed: Bools
    area_ha: float
    rate_mm_h: float
    efficiency: float
    least_h: float
    most_h: float
    interval_days: int = 1
    flow_m3_h: float | None = None
    priority: float = 1.0
    farm: str = ""
    pinned_h: Floats | None = None

    def __post_init__(self) -> None:
        days = self.change_mm.shape
        for name in ("limit_mm", "allowed") + (() if self.pinned_h is None else ("pinned_h",)):
            if getattr(self, name).shape != days:
                raise ValueError(f"{self.name}: {name} has another number of days than change_mm")
        if not np.isfinite(self.depletion_mm) or not np.isfinite(self.change_mm).all():
            raise ValueError(f"{self.name}: a depletion is missing; fill the weather's gaps first")
        for name in ("area_ha", "rate_mm_h", "priority", "flow"):
            if not 0.0 < getattr(self, name) < np.inf:
                raise ValueError(f"{self.name}: {name} is {getattr(self, name)}; give one above 0")
        if not 0.0 < self.efficiency <= 1.0:
            raise ValueError(f"{self.name}: efficiency is {self.efficiency}; it lies in 0-1")
        if not (0.0 <= self.least_h <= self.most_h <= 24.0 and self.most_h > 0.0):
            raise ValueError(
                f"{self.name}: a set of {self.least_h} to {self.most_h} h; least is at most most, "
                "and most at most 24"
            )
        if self.interval_days < 1:
            raise ValueError(f"{self.name}: interval_days is {self.interval_days}; at least 1")
        if self.pinned_h is not None and ((self.pinned_h < 0) | (self.pinned_h > 24)).any():
            raise ValueError(f"{self.name}: a pin outside 0-24 h")

    @property
    def flow(self) -> float:
        """Flow [m3 h-1] drawn while it runs."""
        if self.flow_m3_h is not None:
            return self.flow_m3_h
        return self.rate_mm_h * self.area_ha * M3_PER_MM_HA


@dataclass(frozen=True, kw_only=True)
class Allocation:
    """Water [m3] left to take on the days `first` to `last` (indices, both included); of one farm
    where `farm` is given, else of all."""

    first: int
    last: int
    volume_m3: float
    farm: str | None = None


@dataclass(frozen=True, kw_only=True)
class SharedSupply:
    """What the supply gives on each of H days, in B bands of the tariff.

    flow_m3_h (H,). hours (B, H): hours it runs in each band, 0 outside a turn; a day's sum at most
    24. price_m3 (B, H): cost of a cubic metre. sets (H,): most sets that can be started a day, inf
    for no bound. Raises ValueError.
    """

    flow_m3_h: Floats
    hours: Floats
    price_m3: Floats
    sets: Floats
    allocations: tuple[Allocation, ...] = ()

    def __post_init__(self) -> None:
        days = self.flow_m3_h.shape
        if self.hours.ndim != 2 or self.hours.shape[1:] != days or self.sets.shape != days:
            raise ValueError("hours is (bands, days); flow_m3_h and sets are (days,)")
        if self.price_m3.shape != self.hours.shape or not np.isfinite(self.price_m3).all():
            raise ValueError("price_m3 needs a price for each band and day")
        for name in ("flow_m3_h", "hours", "sets"):
            if not (getattr(self, name) >= 0.0).all():
                raise ValueError(f"{name} has a value that is missing or below 0")
        if (self.hours.sum(axis=0) > 24.0 + TINY).any():
            raise ValueError("the bands of a day add up to more than 24 h")
        for part in self.allocations:
            if not (0 <= part.first <= part.last < days[0] and part.volume_m3 >= 0.0):
                raise ValueError(f"{part} lies outside the days planned, or is below 0")


@dataclass(frozen=True, kw_only=True)
class GivenUp:
    """A block that passes its limit in the plan: first day (index), deepest [mm] below the limit,
    sum over days [mm d], and the rule that stops it: allocation, share, turn (no day on which it
    may be watered by then), labour, flow, draw (it draws more than the supply gives), or set (its
    own hours and interval)."""

    name: str
    day: int
    deepest_mm: float
    mm_days: float
    rule: str


@dataclass(frozen=True, kw_only=True)
class SupplyPlan:
    """Hours (N, H), by band (N, B, H); depletion (N, H) [mm] at each day's close; load (H,) [m3];
    the three aims: past [ha mm d, weighted], cost, starts; what is given up; gaps of the three
    solves (NaN where none was found in time); chosen: plan or urgency."""

    hours: Floats
    by_band: Floats
    depletion_mm: Floats
    load_m3: Floats
    past: float
    cost: float
    starts: int
    given_up: tuple[GivenUp, ...]
    gaps: tuple[float, ...]
    chosen: str


@dataclass(frozen=True)
class _Cap:
    """Sum of coef (N, B, H) x hours stays at or below bound."""

    rule: str
    coef: Floats
    bound: float


def plan_supply(
    claims: tuple[Claim, ...], supply: SharedSupply, time_limit_s: float = 10.0
) -> SupplyPlan:
    """The plan that keeps all blocks within their limits where the supply can, cheapest first.

    Three solves by scipy.optimize.milp (HiGHS), each holding the earlier within 0.1 %: days past
    the limit (area x mm x priority), cost, starts. The limit of time is shared among them. Never
    worse than `by_urgency`: the better of the two is returned. Sets run in parallel as far as the
    flow goes: no more volume in a band than it gives, and of sets of which only k fit beside each
    other no more than k times its hours. Depletion is projected without the relief of stress; what
    passes field capacity is lost. Raises ValueError for sizes and for pins that do not fit.
    Source: the project's own rules; the solver, HiGHS through scipy.
    """
    _check(claims, supply)
    caps = _caps(claims, supply)
    urgent = by_urgency(claims, supply)
    solved, gaps = _solve(claims, supply, caps, time_limit_s)
    if solved is not None:
        own = _result(claims, supply, caps, solved, "plan", gaps)
        if not worse(own, urgent):
            return own
    return _result(claims, supply, caps, urgent.by_band, "urgency", gaps)


def by_urgency(claims: tuple[Claim, ...], supply: SharedSupply) -> SupplyPlan:
    """Day by day, whoever passes the limit first is served first, cheapest hours first.

    As `plan_supply`, without looking ahead for the others.
    """
    _check(claims, supply)
    caps = _caps(claims, supply)
    hours, on = _pins_placed(claims, supply, caps)
    for day in range(supply.flow_m3_h.size):
        depletion = _depletion(claims, hours)
        queue = []
        for i, claim in enumerate(claims):
            past = np.flatnonzero(depletion[i, day:] > claim.limit_mm[day:])
            opening = depletion[i, day - 1] if day else claim.depletion_mm
            wanted = (opening + claim.change_mm[day]) / (claim.rate_mm_h * claim.efficiency)
            if past.size and wanted > TINY and _may_start(claim, on[i], day):
                queue.append((int(past[0]), -claim.priority * claim.area_ha, i, wanted))
        for _, _, i, wanted in sorted(queue):
            if on[:, day].sum() + 1 > supply.sets[day]:
                break
            claim = claims[i]
            target = min(max(wanted, claim.least_h), claim.most_h)
            given = _fill(hours, caps, supply, i, day, target)
            if given.sum() >= max(claim.least_h - TINY, TINY):
                hours[i, :, day], on[i, day] = given, True
    return _result(claims, supply, caps, hours, "urgency", ())


def worse(one: SupplyPlan, other: SupplyPlan) -> bool:
    """Whether `one` is worse: more past the limit; where level within the 0.1 %, dearer."""
    slack = HOLD * other.past + TINY
    if one.past > other.past + TINY:
        return True
    return abs(one.past - other.past) <= slack and one.cost > other.cost * (1.0 + HOLD) + TINY


def _check(claims: tuple[Claim, ...], supply: SharedSupply) -> None:
    if not claims or supply.flow_m3_h.size == 0:
        raise ValueError("a plan needs at least one block and one day")
    for claim in claims:
        if claim.change_mm.shape != supply.flow_m3_h.shape:
            raise ValueError(f"{claim.name}: another number of days than the supply has")


def _caps(claims: tuple[Claim, ...], supply: SharedSupply) -> list[_Cap]:
    bands, days = supply.hours.shape
    shape = (len(claims), bands, days)
    flow = np.array([claim.flow for claim in claims])
    caps = []
    for b in range(bands):
        for d in range(days):
            rule = "flow" if supply.hours[:, d].sum() > 0.0 else "turn"
            coef = np.zeros(shape)
            coef[:, b, d] = flow
            caps.append(_Cap(rule, coef, supply.flow_m3_h[d] * supply.hours[b, d]))
            for k in range(PARALLEL):
                big = flow > supply.flow_m3_h[d] / (k + 1) * (1.0 + 1e-9)
                if big.sum() > k:
                    coef = np.zeros(shape)
                    coef[big, b, d] = 1.0
                    caps.append(_Cap(rule, coef, k * supply.hours[b, d]))
    for part in supply.allocations:
        mine = np.array([part.farm in (None, claim.farm) for claim in claims])
        coef = np.zeros(shape)
        coef[mine, :, part.first : part.last + 1] = flow[mine, None, None]
        caps.append(_Cap("share" if part.farm else "allocation", coef, part.volume_m3))
    return caps


def _pin(claim: Claim, day: int) -> float:
    return float("nan") if claim.pinned_h is None else float(claim.pinned_h[day])


def _may_start(claim: Claim, on: Bools, day: int) -> bool:
    near = on[max(day - claim.interval_days + 1, 0) : day + claim.interval_days]
    return bool(claim.allowed[day] and np.isnan(_pin(claim, day)) and not near.any())


def _fill(
    hours: Floats, caps: list[_Cap], supply: SharedSupply, i: int, day: int, target: float
) -> Floats:
    """Hours by band (B,), up to `target`, that every cap still has room for."""
    trial = hours.copy()
    for b in np.argsort(supply.price_m3[:, day], kind="stable"):
        room = min(target - trial[i, :, day].sum(), supply.hours[b, day])
        for cap in caps:
            per_hour = cap.coef[i, b, day]
            if per_hour > 0.0:
                room = min(room, (cap.bound - float((cap.coef * trial).sum())) / per_hour)
        trial[i, b, day] = max(room, 0.0)
    return np.asarray(trial[i, :, day])


def _pins_placed(
    claims: tuple[Claim, ...], supply: SharedSupply, caps: list[_Cap]
) -> tuple[Floats, Bools]:
    bands, days = supply.hours.shape
    hours = np.zeros((len(claims), bands, days))
    on = np.zeros((len(claims), days), np.bool_)
    for i, claim in enumerate(claims):
        for day in range(days):
            pinned = _pin(claim, day)
            if not pinned > 0.0:
                continue
            given = _fill(hours, caps, supply, i, day, pinned)
            hours[i, :, day], on[i, day] = given, True
            if given.sum() < pinned - 1e-4 or on[:, day].sum() > supply.sets[day]:
                raise ValueError(
                    f"{claim.name}: {pinned:g} h pinned on day {day + 1} do not fit; the supply "
                    f"has {given.sum():.1f} h left for it and {supply.sets[day]:g} sets that day: "
                    "free or shorten a pin"
                )
    return hours, on


def _depletion(claims: tuple[Claim, ...], by_band: Floats) -> Floats:
    """Depletion (N, H) [mm] at each close; what passes field capacity is lost."""
    net = by_band.sum(axis=1)
    out = np.empty(net.shape)
    for i, claim in enumerate(claims):
        now, floor = claim.depletion_mm, min(claim.depletion_mm, 0.0)
        for day in range(net.shape[1]):
            water = net[i, day] * claim.rate_mm_h * claim.efficiency
            now = max(now + claim.change_mm[day] - water, floor)
            out[i, day] = now
    return out


def _result(
    claims: tuple[Claim, ...],
    supply: SharedSupply,
    caps: list[_Cap],
    by_band: Floats,
    chosen: str,
    gaps: tuple[float, ...],
) -> SupplyPlan:
    hours = by_band.sum(axis=1)
    depletion = _depletion(claims, by_band)
    limit = np.array([claim.limit_mm for claim in claims])
    past = np.nan_to_num(np.maximum(depletion - limit, 0.0))
    weight = np.array([claim.area_ha * claim.priority for claim in claims])
    volume = by_band * np.array([claim.flow for claim in claims])[:, None, None]
    given_up = [
        GivenUp(
            name=claim.name,
            day=int(np.argmax(past[i] > 1e-3)),
            deepest_mm=float(past[i].max()),
            mm_days=float(past[i].sum()),
            rule=_rule(claim, i, supply, caps, by_band, int(np.argmax(past[i] > 1e-3))),
        )
        for i, claim in enumerate(claims)
        if past[i].max() > 1e-3
    ]
    return SupplyPlan(
        hours=hours,
        by_band=by_band,
        depletion_mm=depletion,
        load_m3=volume.sum(axis=(0, 1)),
        past=float(weight @ past.sum(axis=1)),
        cost=float((volume * supply.price_m3).sum()),
        starts=int((hours > TINY).sum()),
        given_up=tuple(given_up),
        gaps=gaps,
        chosen=chosen,
    )


def _rule(
    claim: Claim, i: int, supply: SharedSupply, caps: list[_Cap], by_band: Floats, day: int
) -> str:
    """What stands in the way of more water up to `day`: the widest rule that is used up."""
    full = {
        cap.rule
        for cap in caps
        if cap.coef[i, :, : day + 1].any()
        and cap.bound - float((cap.coef * by_band).sum()) <= 1e-3 * max(cap.bound, 1.0)
    }
    for rule in ("allocation", "share"):
        if rule in full:
            return rule
    if claim.flow > supply.flow_m3_h.max() * (1.0 + 1e-9):
        return "draw"
    usable = claim.allowed[: day + 1] & (supply.hours[:, : day + 1].sum(axis=0) > 0.0)
    if not usable.any():
        return "turn"
    on = (by_band.sum(axis=1) > TINY).sum(axis=0)
    if (on >= supply.sets)[: day + 1][usable].all():
        return "labour"
    return "flow" if "flow" in full else "set"


def _solve(
    claims: tuple[Claim, ...], supply: SharedSupply, caps: list[_Cap], time_limit_s: float
) -> tuple[Floats | None, tuple[float, ...]]:
    """Hours (N, B, H) of the last solve that found some, and the gap of each."""
    from scipy.optimize import Bounds, LinearConstraint, milp

    model = _Model(claims, supply, caps)
    found: Floats | None = None
    gaps: list[float] = []
    held: list[tuple[Floats, float]] = []
    for aim, share in zip(model.aims(), TIME_SHARES, strict=True):
        rows, lows, highs = model.rows(*held)
        answer: Any = milp(
            aim,
            integrality=model.integral,
            bounds=Bounds(model.low, model.high),
            constraints=LinearConstraint(rows, lows, highs),
            options={"time_limit": time_limit_s * share, "mip_rel_gap": HOLD / 10},
        )
        if answer.x is None:
            gaps.append(float("nan"))
            break
        found = model.hours(answer.x)
        gaps.append(float(answer.mip_gap or 0.0))
        value = float(aim @ answer.x)
        held.append((aim, value + HOLD * abs(value) + TINY))
    return found, tuple(gaps)


class _Model:
    """Columns: hours (N, B, H), on, depletion, past, lost (each N, H), in one vector."""

    def __init__(self, claims: tuple[Claim, ...], supply: SharedSupply, caps: list[_Cap]) -> None:
        self.claims, self.supply, self.caps = claims, supply, caps
        self.shape = (len(claims), *supply.hours.shape)
        n, b, h = self.shape
        self.first = n * b * h
        self.cells = n * h
        size = self.first + 4 * self.cells
        self.low, self.high = np.zeros(size), np.full(size, np.inf)
        self.integral = np.zeros(size)
        on = slice(self.first, self.first + self.cells)
        self.integral[on], self.high[on] = 1, 1.0
        self.high[: self.first] = np.broadcast_to(supply.hours, self.shape).ravel()
        for i, claim in enumerate(claims):
            for d in range(h):
                at, pinned = i * h + d, _pin(claim, d)
                self.low[self.first + self.cells + at] = min(claim.depletion_mm, 0.0)
                if pinned > 0.0:
                    self.low[self.first + at] = 1.0
                elif pinned == 0.0 or not claim.allowed[d]:
                    self.high[self.first + at] = 0.0

    def hours(self, x: Floats) -> Floats:
        """Hours (N, B, H), without the solver's crumbs."""
        n, _, h = self.shape
        on = x[self.first : self.first + self.cells].reshape(n, h) > 0.5
        hours = np.clip(x[: self.first].reshape(self.shape), 0.0, self.supply.hours)
        return np.where(on[:, None, :] & (hours > TINY), hours, 0.0)

    def aims(self) -> tuple[Floats, Floats, Floats]:
        """Coefficients of days past the limit, cost, starts."""
        size = self.low.size
        past, cost, starts = np.zeros(size), np.zeros(size), np.zeros(size)
        weight = np.array([claim.area_ha * claim.priority for claim in self.claims])
        at = self.first + 2 * self.cells
        past[at : at + self.cells] = np.repeat(weight, self.shape[2])
        flow = np.array([claim.flow for claim in self.claims])
        cost[: self.first] = (flow[:, None, None] * self.supply.price_m3[None]).ravel()
        starts[self.first : self.first + self.cells] = 1.0
        return past, cost, starts

    def rows(self, *held: tuple[Floats, float]) -> tuple[Any, Floats, Floats]:
        """Rows as a sparse matrix with their bounds."""
        from scipy.sparse import csr_array

        n, b, h = self.shape
        entries: list[tuple[int, int, float]] = []
        lows: list[float] = []
        highs: list[float] = []

        def row(terms: list[tuple[int, float]], low: float, high: float) -> None:
            entries.extend((len(lows), column, value) for column, value in terms)
            lows.append(low)
            highs.append(high)

        for cap in self.caps:
            flat = cap.coef.ravel()
            row([(int(c), float(flat[c])) for c in np.flatnonzero(flat)], -np.inf, cap.bound)
        for aim, most in held:
            row([(int(c), float(aim[c])) for c in np.flatnonzero(aim)], -np.inf, most)
        on, depletion = self.first, self.first + self.cells
        past, lost = depletion + self.cells, depletion + 2 * self.cells
        for d in range(h):
            if np.isfinite(self.supply.sets[d]):
                row([(on + i * h + d, 1.0) for i in range(n)], -np.inf, float(self.supply.sets[d]))
        for i, claim in enumerate(self.claims):
            net = claim.rate_mm_h * claim.efficiency
            free = [d for d in range(h) if np.isnan(_pin(claim, d))]
            for d in range(h):
                at = i * h + d
                hours = [((i * b + k) * h + d, 1.0) for k in range(b)]
                pinned = _pin(claim, d)
                least, most = (
                    (claim.least_h, claim.most_h) if np.isnan(pinned) else (pinned, pinned)
                )
                row([*hours, (on + at, -most)], -np.inf, 0.0)
                row([*hours, (on + at, -least)], 0.0, np.inf)
                terms = [(depletion + at, 1.0), (lost + at, -1.0)]
                terms += [(column, net) for column, _ in hours]
                start = claim.change_mm[d]
                if d:
                    terms.append((depletion + at - 1, -1.0))
                else:
                    start = start + claim.depletion_mm
                row(terms, float(start), float(start))
                if np.isfinite(claim.limit_mm[d]):
                    row(
                        [(past + at, 1.0), (depletion + at, -1.0)],
                        -float(claim.limit_mm[d]),
                        np.inf,
                    )
                window = range(d, min(d + claim.interval_days, h))
                if len(window) > 1 and any(e in free for e in window):
                    pins = sum(_pin(claim, e) > 0.0 for e in window)
                    row([(on + i * h + e, 1.0) for e in window], -np.inf, float(max(1, pins)))
        r, c, v = (np.array(part) for part in zip(*entries, strict=True))
        return (
            csr_array((v, (r, c)), shape=(len(lows), self.low.size)),
            np.array(lows),
            np.array(highs),
        )
