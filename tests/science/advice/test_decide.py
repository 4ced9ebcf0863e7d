"""Advice: standing, day and depth under a system's limits. Rules of the project's own; the
leaching form is NEH 623's (from memory)."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from app.science.advice.decide import Advice, Outlook, decide, first_passed
from app.science.advice.keeping_up import daily_change
from app.science.advice.reasons import Reason
from app.science.advice.system import ApplicationSystem

TODAY = np.datetime64("2025-07-01")
SYSTEM = ApplicationSystem(efficiency=0.8, rate_mm_h=5.0, least_mm=5.0, most_mm=60.0)


def outlook(
    now: float,
    daily: float | list[float] = 6.0,
    *,
    days: int = 10,
    limit: float = 60.0,
    off: tuple[int, ...] = (),
) -> Outlook:
    """Depletion from `now`, rising by `daily`; the days of `off` are not allowed."""
    steps = np.full(days, daily) if isinstance(daily, float) else np.array(daily)
    allowed = np.ones(steps.size, dtype=np.bool_)
    allowed[list(off)] = False
    return Outlook(
        date=TODAY + np.arange(steps.size),
        depletion=now + np.cumsum(steps),
        limit=np.full(steps.size, limit),
        taw=np.full(steps.size, 2.0 * limit),
        etc=np.maximum(steps, 0.0),
        allowed=allowed,
    )


def advise(now: float, system: ApplicationSystem = SYSTEM, **changes: object) -> Advice:
    decide_names = {
        "refill_to_mm",
        "rain_room_mm",
        "last_irrigation",
        "leaching_requirement",
        "intake_mm",
        "input_age_days",
    }
    asked = {k: changes.pop(k) for k in list(changes) if k in decide_names}
    return decide(outlook(now, **changes), now, system, 4.0, **asked)  # type: ignore[arg-type]


def test_the_last_chance_at_or_before_the_limit_day_refills_its_opening() -> None:
    """40 mm, 6 mm a day: 58 after three days, past 60 on the fourth; watered on its morning."""
    advice = advise(40.0)
    assert advice.limit_day == TODAY + 3
    assert advice.day == TODAY + 3
    assert advice.reason == Reason.LAST_CHANCE
    assert advice.net_mm == pytest.approx(58.0 * 48.0 / 58.0)  # most: 60 gross
    assert advice.gross_mm == pytest.approx(60.0)
    assert advice.figures["bound"] == "most"
    assert advice.hours == pytest.approx(12.0)
    assert advice.volume_m3 == pytest.approx(60.0 * 4.0 * 10.0)


def test_the_depth_leaves_refill_and_rain_room() -> None:
    roomy = replace(SYSTEM, most_mm=200.0)
    advice = advise(40.0, roomy, refill_to_mm=10.0, rain_room_mm=8.0)
    assert advice.net_mm == pytest.approx(58.0 - 18.0)
    assert advice.gross_mm == pytest.approx(40.0 / 0.8)
    assert advice.figures["bound"] == ""


@pytest.mark.parametrize(
    ("now", "standing"),
    [
        (60.5, "late"),
        (55.0, "due"),  # passes today
        (49.0, "due"),  # passes by the close of tomorrow, the second chance
        (43.0, "soon"),
        (31.0, "soon"),  # fifth day: three days after the second chance
        (25.0, "easy"),
        (-1.0, "wet"),
    ],
)
def test_standing(now: float, standing: str) -> None:
    assert advise(now).standing == standing


def test_due_looks_at_the_second_chance_not_at_the_second_day() -> None:
    """Chances on days 0 and 5 only: the limit of day 4 is passed if today is skipped."""
    advice = advise(31.0, off=(1, 2, 3, 4, 6, 7, 8, 9))
    assert advice.limit_day == TODAY + 4
    assert advice.standing == "due"
    assert advice.day == TODAY


def test_late_is_watered_at_the_first_chance() -> None:
    advice = advise(66.0, replace(SYSTEM, most_mm=150.0), off=(0,))
    assert advice.standing == "late"
    assert advice.day == TODAY + 1
    assert advice.reason == Reason.PAST_LIMIT


def test_keep_offs_bring_the_day_forward() -> None:
    advice = advise(40.0, off=(2, 3))
    assert advice.day == TODAY + 1
    assert advice.limit_day == TODAY + 3


def test_no_chance_in_time_takes_the_first_and_says_so() -> None:
    advice = advise(40.0, replace(SYSTEM, most_mm=150.0), off=(0, 1, 2, 3, 4))
    assert advice.day == TODAY + 5
    assert advice.reason == Reason.NO_CHANCE_IN_TIME


def test_no_chance_at_all_names_it_and_gives_no_water() -> None:
    advice = advise(40.0, off=tuple(range(10)))
    assert advice.day is None
    assert advice.gross_mm == advice.hours == advice.volume_m3 == 0.0
    assert advice.reason == Reason.NO_CHANCE
    assert advice.standing == "due"


def test_the_interval_since_the_last_irrigation_is_kept() -> None:
    slow = replace(SYSTEM, interval_days=5, most_mm=150.0)
    advice = advise(40.0, slow, last_irrigation=TODAY - 2)
    assert advice.day == TODAY + 3
    advice = advise(50.0, slow, last_irrigation=TODAY - 2)
    assert advice.limit_day == TODAY + 1
    assert advice.day == TODAY + 3
    assert advice.reason == Reason.NO_CHANCE_IN_TIME


def test_covering_days_bring_the_start_forward_and_must_all_be_allowed() -> None:
    wide = replace(SYSTEM, cover_days=3, most_mm=150.0)
    advice = advise(40.0, wide)
    assert advice.day == TODAY + 1
    assert advice.reason == Reason.COVERING
    assert advise(40.0, wide, off=(2,)).day != TODAY + 1


def test_easy_within_the_horizon_asks_for_nothing() -> None:
    advice = advise(10.0, daily=2.0)
    assert advice.standing == "easy"
    assert advice.day is None
    assert advice.limit_day is None
    assert advice.reason == Reason.LIMIT_NOT_REACHED


def test_rain_that_brings_a_late_field_back_asks_for_nothing() -> None:
    advice = advise(63.0, daily=[-40.0] + [2.0] * 9)
    assert advice.standing == "late"
    assert advice.day is None
    assert advice.reason == Reason.BACK_WITHIN


def test_a_system_that_cannot_keep_up_starts_now_and_says_so() -> None:
    """3.2 mm net every other day against 6 mm a day."""
    weak = ApplicationSystem(
        efficiency=0.8, rate_mm_h=1.0, least_mm=2.0, most_mm=4.0, interval_days=2
    )
    advice = advise(30.0, weak)
    assert advice.falling_behind
    assert advice.reason == Reason.FALLING_BEHIND
    assert advice.day == TODAY
    assert advice.figures["most_net_mm"] == pytest.approx(3.2)
    strong = replace(weak, most_mm=24.0, interval_days=2)
    assert not advise(30.0, strong).falling_behind


def test_a_late_field_that_can_recover_is_not_falling_behind() -> None:
    daily = ApplicationSystem(efficiency=1.0, rate_mm_h=5.0, least_mm=2.0, most_mm=12.0)
    assert not advise(66.0, daily).falling_behind
    assert advise(66.0, replace(daily, most_mm=6.0)).falling_behind
    assert not advise(66.0, replace(daily, most_mm=9.0)).falling_behind  # back after two days


def test_the_interval_counts_in_keeping_up() -> None:
    """24 mm net each time against 6 mm a day: every fourth day is enough, every fifth is not."""
    turn = ApplicationSystem(efficiency=1.0, rate_mm_h=5.0, least_mm=2.0, most_mm=24.0)
    daily, now = [6.0] * 28, 45.0
    ahead = outlook(now, daily)
    assert not decide(ahead, now, replace(turn, interval_days=4), 1.0).falling_behind
    assert decide(ahead, now, replace(turn, interval_days=5), 1.0).falling_behind


def test_stress_past_the_limit_does_not_pass_for_low_demand() -> None:
    """A projection that dries out slowly, because it is stressed, still asks for its full ET."""
    limit, etc = np.full(4, 60.0), np.full(4, 6.0)
    change = daily_change(58.0, np.array([64.0, 67.0, 69.0, 60.0]), limit, etc)
    np.testing.assert_allclose(change, [6.0, 6.0, 6.0, -9.0])


def test_hours_bound_the_depth() -> None:
    short = replace(SYSTEM, hours_per_day=4.0)
    advice = advise(40.0, short)
    assert advice.gross_mm == pytest.approx(20.0)
    assert advice.hours == pytest.approx(4.0)
    assert advice.figures["bound"] == "hours"


def test_the_soils_intake_bounds_the_depth() -> None:
    advice = advise(40.0, intake_mm=25.0)
    assert advice.net_mm == pytest.approx(25.0)
    assert advice.figures["bound"] == "intake"


def test_less_than_the_least_is_raised_to_it_even_past_field_capacity() -> None:
    """A young root zone: limit 12 mm, least 40 mm gross. Waiting would pass the limit."""
    coarse = replace(SYSTEM, least_mm=40.0)
    advice = advise(2.0, coarse, limit=12.0)
    assert advice.gross_mm == pytest.approx(40.0)
    assert advice.net_mm == pytest.approx(32.0)
    assert advice.figures["bound"] == "least"
    opening = float(advice.figures["opening_mm"])
    assert advice.figures["past_field_capacity_mm"] == pytest.approx(32.0 - opening)
    assert not advice.falling_behind


def test_leaching_raises_gross_above_a_tenth() -> None:
    """NEH 623 (from memory): 0.9 net / ((1 - LR) efficiency)."""
    roomy = replace(SYSTEM, most_mm=300.0)
    advice = advise(40.0, roomy, leaching_requirement=0.2)
    assert advice.gross_mm == pytest.approx(0.9 * advice.net_mm / (0.8 * 0.8))
    assert advise(40.0, roomy, leaching_requirement=0.1).gross_mm == pytest.approx(58.0 / 0.8)


def test_room_for_rain_and_refill_give_way_rather_than_leave_nothing() -> None:
    roomy = replace(SYSTEM, least_mm=0.0, most_mm=200.0)
    assert advise(40.0, roomy, rain_room_mm=80.0, refill_to_mm=5.0).net_mm == pytest.approx(53.0)
    assert advise(40.0, roomy, refill_to_mm=90.0).net_mm == pytest.approx(58.0)


def test_a_full_root_zone_that_one_day_empties_gets_no_water_but_a_word() -> None:
    advice = advise(0.0, replace(SYSTEM, least_mm=0.0), daily=9.0, limit=5.0)
    assert advice.falling_behind
    assert advice.day is None or advice.net_mm > 0.0


def test_unsure_by_age_or_by_range() -> None:
    assert not advise(40.0, input_age_days=2).unsure
    assert advise(40.0, input_age_days=3).unsure
    base = outlook(40.0)
    near = replace(base, p10=base.depletion - 20.0, p90=base.depletion + 2.0)
    far = replace(base, p10=base.depletion - 26.0, p90=base.depletion + 13.0)
    later = replace(base, p10=base.depletion - 32.0, p90=base.depletion + 1.0)
    assert not decide(near, 40.0, SYSTEM, 1.0).unsure
    assert decide(far, 40.0, SYSTEM, 1.0).unsure
    assert not decide(later, 40.0, SYSTEM, 1.0).unsure  # as wide, but nothing hangs on it yet
    assert decide(far, 40.0, SYSTEM, 1.0).standing == decide(near, 40.0, SYSTEM, 1.0).standing


def test_bad_input_is_refused_by_name() -> None:
    good = outlook(40.0)
    with pytest.raises(ValueError, match="depletion of the outlook is missing"):
        decide(good, float("nan"), SYSTEM, 1.0)
    with pytest.raises(ValueError, match="area_ha is 0"):
        decide(good, 1.0, SYSTEM, 0.0)
    with pytest.raises(ValueError, match=r"outlook\.limit has shape"):
        decide(replace(good, limit=good.limit[:3]), 1.0, SYSTEM, 1.0)
    with pytest.raises(ValueError, match="mend the rate, the hours or least_mm"):
        ApplicationSystem(
            efficiency=0.8, rate_mm_h=1.0, least_mm=30.0, most_mm=40.0, hours_per_day=10.0
        )
    with pytest.raises(ValueError, match=r"efficiency is 1\.2"):
        replace(SYSTEM, efficiency=1.2)


def test_a_missing_limit_is_never_passed() -> None:
    assert first_passed(np.array([5.0, 9.0]), np.array([np.nan, np.nan])) is None
    advice = decide(replace(outlook(40.0), limit=np.full(10, np.nan)), 40.0, SYSTEM, 1.0)
    assert advice.day is None


systems = st.builds(
    lambda e, r, least, more, interval, cover: ApplicationSystem(
        efficiency=e,
        rate_mm_h=r,
        least_mm=least,
        most_mm=least + more,
        interval_days=interval,
        cover_days=cover,
    ),
    st.floats(0.4, 1.0),
    st.floats(2.0, 20.0),
    st.floats(0.0, 40.0),
    st.floats(0.1, 80.0),
    st.integers(1, 6),
    st.integers(1, 3),
)
outlooks = st.builds(
    lambda now, steps, limit, off: (now, outlook(now, steps, limit=limit, off=tuple(off))),
    st.floats(-10.0, 90.0),
    st.lists(st.floats(-15.0, 12.0), min_size=10, max_size=10),
    st.floats(5.0, 80.0),
    st.sets(st.integers(0, 9), max_size=7),
)


@settings(max_examples=300, deadline=None)
@given(outlooks, systems, st.integers(0, 8) | st.none(), st.floats(0, 20))
def test_what_every_advice_keeps(
    asked: tuple[float, Outlook], system: ApplicationSystem, ago: int | None, refill: float
) -> None:
    now, ahead = asked
    last = None if ago is None else TODAY - ago
    advice = decide(ahead, now, system, 2.0, refill_to_mm=refill, last_irrigation=last)
    assert advice == decide(ahead, now, system, 2.0, refill_to_mm=refill, last_irrigation=last)
    assert advice.standing in ("late", "due", "soon", "wet", "easy")
    assert Reason(advice.reason)
    assert (advice.standing == "late") == (now > ahead.limit[0])
    if advice.day is None:
        assert advice.net_mm == advice.gross_mm == advice.hours == advice.volume_m3 == 0.0
        return
    assert advice.net_mm > 0.0
    start = int((advice.day - TODAY).astype(int))
    covered = ahead.allowed[start : start + system.cover_days]
    assert covered.all()
    if last is not None:
        assert (advice.day - last).astype(int) >= max(system.interval_days, system.cover_days)
    assert system.least_mm - 1e-9 <= advice.gross_mm <= system.deliverable_mm + 1e-9
    assert advice.gross_mm == pytest.approx(advice.net_mm / system.efficiency)
    assert advice.hours <= system.hours_per_day * system.cover_days + 1e-9
    assert advice.volume_m3 == pytest.approx(advice.gross_mm * 20.0)
    passed = first_passed(ahead.depletion, ahead.limit)
    assert passed is not None
    in_time = advice.reason in (Reason.LAST_CHANCE, Reason.COVERING, Reason.FALLING_BEHIND)
    if in_time and advice.reason != Reason.FALLING_BEHIND:
        assert start + system.cover_days - 1 <= passed


@settings(max_examples=200, deadline=None)
@given(outlooks, systems)
def test_where_the_system_keeps_up_the_advised_water_holds_the_limit(
    asked: tuple[float, Outlook], system: ApplicationSystem
) -> None:
    """From the advised day to the day before the next chance, no close passes the limit."""
    now, ahead = asked
    assume(now <= ahead.limit[0])
    advice = decide(ahead, now, system, 1.0)
    if advice.reason not in (Reason.LAST_CHANCE, Reason.COVERING, Reason.EARLY_TO_KEEP_UP):
        return
    assert advice.day is not None
    start = int((advice.day - TODAY).astype(int))
    assert first_passed(ahead.depletion[:start], ahead.limit[:start]) is None
    held = now if start == 0 else float(ahead.depletion[start - 1])
    held = max(held - advice.net_mm, min(held, 0.0))
    gap = max(system.interval_days, system.cover_days)
    for day in range(start, min(start + gap, 10)):
        held += float(np.diff(ahead.depletion, prepend=now)[day])
        assert held <= ahead.limit[day] + 1e-6


def test_a_small_application_is_brought_forward_so_that_it_keeps_up() -> None:
    """At most 8 mm net a day; 20 mm fall due on the last day of the horizon."""
    small = ApplicationSystem(efficiency=1.0, rate_mm_h=2.0, least_mm=1.0, most_mm=8.0)
    advice = advise(0.0, small, daily=[3.0] * 8 + [12.0, 12.0], limit=30.0)
    assert advice.limit_day == TODAY + 8
    assert advice.reason == Reason.EARLY_TO_KEEP_UP
    assert advice.day is not None
    assert advice.day < TODAY + 8
    assert not advice.falling_behind
