"""When to irrigate a field and how much: the decision for one morning."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from app.science import Bools, Days, Floats
from app.science.advice.keeping_up import Ahead, chances, daily_change, holds
from app.science.advice.reasons import Reason
from app.science.advice.stage_plan import StagePlan
from app.science.advice.system import ApplicationSystem

# A millimetre over a hectare.
M3_PER_MM_HA = 10.0
# "soon" reaches this many days beyond "due"; inputs older than, or limit dates further apart
# than, these days make an advice unsure (working values).
SOON_DAYS, STALE_DAYS, WIDE_DAYS, NEAR_DAYS = 3, 2, 4, 2
# Leaching requirements up to this one are met by ordinary losses (NEH 623, from memory).
LEACHING_COUNTS = 0.1


@dataclass(frozen=True, kw_only=True)
class Outlook:
    """The days ahead without any irrigation not yet counted on; the first is today.

    date (H,) datetime64[D], consecutive; depletion, limit, taw, etc (H,) [mm]: projected end of
    day depletion, its limit, TAW and unstressed ETc; allowed (H,) bool: no keep-off, inside the
    turn; p10, p90 (H,) [mm]: range of the projected depletion, or None.
    plan: what applications leave by stage, in place of `refill_to_mm`, or None.
    A NaN limit is never passed.
    """

    date: Days
    depletion: Floats
    limit: Floats
    taw: Floats
    etc: Floats
    allowed: Bools
    p10: Floats | None = None
    p90: Floats | None = None
    plan: StagePlan | None = None


@dataclass(frozen=True, kw_only=True)
class Advice:
    """One recommendation: standing, day, depths, hours, volume, and why.

    standing: late, due, soon, wet or easy. day: when to water, None for no need or no chance.
    net_mm, gross_mm, hours, volume_m3: 0 when `day` is None. reason: code (see `decide`), with
    the figures of its sentence. limit_day: first day that closes past the limit, None within the
    horizon. falling_behind: the system cannot hold the limit over the horizon. unsure: an input
    is stale or the range too wide.
    """

    standing: str
    day: np.datetime64 | None
    net_mm: float
    gross_mm: float
    hours: float
    volume_m3: float
    reason: str
    figures: dict[str, float | str] = field(default_factory=dict)
    limit_day: np.datetime64 | None = None
    falling_behind: bool = False
    unsure: bool = False


def decide(
    outlook: Outlook,
    depletion_now: float,
    system: ApplicationSystem,
    area_ha: float,
    refill_to_mm: float = 0.0,
    rain_room_mm: float = 0.0,
    last_irrigation: np.datetime64 | None = None,
    *,
    leaching_requirement: float = 0.0,
    intake_mm: float | None = None,
    input_age_days: int = 0,
) -> Advice:
    """Standing of a field this morning, and on which day to water it and how much.

    depletion_now [mm]: at the opening of today (yesterday's close). area_ha above 0. refill_to_mm:
    depletion to leave. rain_room_mm: room to leave for rain. last_irrigation: start of the last
    application. leaching_requirement 0-0.9: above 0.1 it raises gross to 0.9 net / ((1 - LR)
    efficiency). intake_mm: most net the soil takes in one application, None for no bound.
    input_age_days: age of the oldest input.

    The day is the last chance at or before the first close past the limit, brought forward by the
    days the system needs to cover the field, and further where it could not hold the limit over
    the horizon from that day on; a field that cannot be held starts at once. The depth
    refills the opening depletion within the system's least and most. A depth below the least is
    raised to it, even where it passes field capacity: the chance is the last one, and waiting
    would pass the limit. Room for rain and refill_to give way where they would leave no water at
    all. Only allowed days are ever advised.
    Standing, in this order: late (past the limit), due (passes it by the close of the second
    chance if the first is skipped), soon (within three days after), wet (at or above field
    capacity), easy. Returns an `Advice`; reasons in `app.science.advice.reasons`.
    Raises ValueError for NaN in depletions and for wrong sizes.
    Source: leaching, NEH 623 (from memory); the rest are the project's own rules.
    """
    _check(outlook, depletion_now, area_ha)
    per_net = _gross_per_net(system.efficiency, leaching_requirement)
    ahead = _ahead(
        outlook, depletion_now, system, per_net, refill_to_mm, intake_mm, last_irrigation
    )
    passed = first_passed(outlook.depletion, outlook.limit)
    late = bool(depletion_now > outlook.limit[0])

    def leaves(day: int) -> float:
        if outlook.plan is None:
            return refill_to_mm
        return outlook.plan.leaves(day, float(ahead.opening[day]))

    def wanted(day: int) -> float:
        return _wanted(float(ahead.opening[day]), leaves(day), rain_room_mm)

    def depth(day: int) -> float:
        return min(max(wanted(day), ahead.net_least), ahead.net_most)

    day, reason = _choose(ahead, passed, late, system.cover_days, depth)
    net = 0.0 if day is None else depth(day)
    if net <= 0.0:  # a full root zone and no least depth: nothing to give
        day = None
    gross = net * per_net
    figures: dict[str, float | str] = {
        "horizon_days": float(outlook.date.size),
        "depletion_mm": float(depletion_now),
        "limit_mm": float(outlook.limit[0]),
        "cover_days": float(system.cover_days),
        "most_net_mm": ahead.net_most,
        "interval_days": float(ahead.gap),
        "etc_mm": float(np.nansum(outlook.etc)),
        **_limit_figures(outlook, passed),
        **_chance_figures(outlook, ahead, passed),
    }
    if day is not None:
        opening = float(ahead.opening[day])
        figures |= {
            "opening_mm": opening,
            "refill_to_mm": leaves(day),
            "rain_room_mm": rain_room_mm,
            "efficiency": system.efficiency,
            "bound": _bound(wanted(day), ahead, system, intake_mm),
            "past_field_capacity_mm": max(net - max(opening, 0.0), 0.0),
        }
        if outlook.plan is not None:
            figures["et_target"] = float(outlook.plan.target[day])
    return Advice(
        standing=_standing(depletion_now, late, passed, ahead.may_start),
        day=None if day is None else outlook.date[day],
        net_mm=net,
        gross_mm=gross,
        hours=gross / system.rate_mm_h,
        volume_m3=gross * area_ha * M3_PER_MM_HA,
        reason=reason.value,
        figures=figures,
        limit_day=None if passed is None else outlook.date[passed],
        falling_behind=reason is Reason.FALLING_BEHIND,
        unsure=input_age_days > STALE_DAYS or _wide(outlook),
    )


def first_passed(depletion: Floats, limit: Floats) -> int | None:
    """Index of the first day that closes past the limit, None for none; NaN is never past."""
    past = depletion > limit
    return int(np.argmax(past)) if past.any() else None


def _check(outlook: Outlook, depletion_now: float, area_ha: float) -> None:
    days = outlook.date.shape
    if outlook.date.size == 0:
        raise ValueError("the outlook has no days; it needs at least today")
    for name in ("depletion", "limit", "taw", "etc", "allowed"):
        shape = getattr(outlook, name).shape
        if shape != days:
            raise ValueError(f"outlook.{name} has shape {shape}; its dates have {days}")
    if np.isnan(depletion_now) or np.isnan(outlook.depletion).any():
        raise ValueError("a depletion of the outlook is missing; fill the weather's gaps first")
    if not area_ha > 0.0:
        raise ValueError(f"area_ha is {area_ha:g}; it must be above 0")


def _ready(outlook: Outlook, last: np.datetime64 | None, gap: int) -> int:
    """First day (index) the interval since the last irrigation allows."""
    if last is None:
        return 0
    since = (outlook.date[0] - last.astype("datetime64[D]")).astype(int)
    return max(gap - int(since), 0)


def _gross_per_net(efficiency: float, leaching_requirement: float) -> float:
    if leaching_requirement > LEACHING_COUNTS:
        return 0.9 / ((1.0 - min(leaching_requirement, 0.9)) * efficiency)
    return 1.0 / efficiency


def _standing(depletion_now: float, late: bool, passed: int | None, may_start: Bools) -> str:
    if late:
        return "late"
    if passed is not None:
        starts = np.flatnonzero(may_start)
        second = int(starts[1]) if starts.size > 1 else may_start.size
        if passed <= second:
            return "due"
        if passed <= second + SOON_DAYS:
            return "soon"
    return "wet" if depletion_now <= 0.0 else "easy"


def _ahead(
    outlook: Outlook,
    depletion_now: float,
    system: ApplicationSystem,
    per_net: float,
    leave: float,
    intake_mm: float | None,
    last_irrigation: np.datetime64 | None,
) -> Ahead:
    gap = max(system.interval_days, system.cover_days)
    net_least, net_most = system.least_mm / per_net, system.deliverable_mm / per_net
    if intake_mm is not None:
        net_most = max(min(net_most, intake_mm), net_least)
    ready = _ready(outlook, last_irrigation, gap)
    if outlook.plan is not None:
        leave = float(np.minimum(outlook.plan.refill, outlook.plan.floor).min())
    return Ahead(
        opening=np.concatenate(([depletion_now], outlook.depletion[:-1])),
        change=daily_change(depletion_now, outlook.depletion, outlook.limit, outlook.etc),
        limit=outlook.limit,
        may_start=chances(outlook.allowed, ready, system.cover_days),
        net_least=net_least,
        net_most=net_most,
        leave=leave,
        gap=gap,
    )


def _choose(
    ahead: Ahead,
    passed: int | None,
    late: bool,
    cover_days: int,
    depth: Callable[[int], float],
) -> tuple[int | None, Reason]:
    """The day to start (index) and why: the latest start in time that holds the limit."""
    if passed is None:
        return None, Reason.BACK_WITHIN if late else Reason.LIMIT_NOT_REACHED
    starts: list[int] = np.flatnonzero(ahead.may_start).tolist()
    if not starts:
        return None, Reason.NO_CHANCE
    in_time = [s for s in starts if s <= passed - (cover_days - 1)]
    tried = in_time or starts[:1]
    last = tried[-1]
    roomy = [s for s in tried if s == last or 0.0 < depth(s) <= ahead.opening[s]]
    held = [s for s in roomy if holds(ahead, s, depth(s))]
    if not held:
        return roomy[0], Reason.FALLING_BEHIND
    if late and passed == 0:
        return held[-1], Reason.PAST_LIMIT
    if not in_time:
        return last, Reason.NO_CHANCE_IN_TIME
    if held[-1] < last:
        return held[-1], Reason.EARLY_TO_KEEP_UP
    covering = any(last < s <= passed for s in starts)
    return last, Reason.COVERING if covering else Reason.LAST_CHANCE


def _wanted(opening: float, refill_to_mm: float, rain_room_mm: float) -> float:
    """Net depth [mm] the root zone asks for; room for rain, then the refill target, give way where
    they would leave nothing although the limit calls for water."""
    for kept in (refill_to_mm + rain_room_mm, refill_to_mm):
        if opening > kept:
            return opening - kept
    return opening


def _bound(wanted: float, ahead: Ahead, system: ApplicationSystem, intake_mm: float | None) -> str:
    """What set the depth instead of the depletion: "", least, most, hours or intake."""
    if wanted < ahead.net_least:
        return "least"
    if wanted <= ahead.net_most:
        return ""
    if intake_mm is not None and intake_mm <= ahead.net_most:
        return "intake"
    return "most" if system.deliverable_mm >= system.most_mm else "hours"


def _chance_figures(outlook: Outlook, ahead: Ahead, passed: int | None) -> dict[str, float | str]:
    starts = np.flatnonzero(ahead.may_start)
    if not starts.size:
        return {"chances_before": 0.0}
    in_time = starts[starts <= passed] if passed is not None else starts
    last = in_time[-1] if in_time.size else starts[0]
    return {
        "chances_before": float(in_time.size),
        "first_chance": str(outlook.date[starts[0]]),
        "last_chance": str(outlook.date[last]),
    }


def _limit_figures(outlook: Outlook, passed: int | None) -> dict[str, float | str]:
    if passed is None:
        return {
            "last_depletion_mm": float(outlook.depletion[-1]),
            "last_limit_mm": float(outlook.limit[-1]),
        }
    return {
        "limit_day": str(outlook.date[passed]),
        "limit_day_depletion_mm": float(outlook.depletion[passed]),
        "limit_day_limit_mm": float(outlook.limit[passed]),
    }


def _wide(outlook: Outlook) -> bool:
    """Whether the limit dates of p90 (dry) and p10 (wet) lie more than four days apart, the dry
    one today or tomorrow: a range as wide further off changes nothing that is decided now. A date
    beyond the horizon counts as the day after it."""
    if outlook.p10 is None or outlook.p90 is None:
        return False
    dry = first_passed(outlook.p90, outlook.limit)
    wet = first_passed(outlook.p10, outlook.limit)
    beyond = outlook.date.size
    if dry is None or dry >= NEAR_DAYS:
        return False
    return (beyond if wet is None else wet) - dry > WIDE_DAYS
