"""Deficit plans by stage, worked by hand (the project's own rule)."""

from dataclasses import replace

import numpy as np
import pytest

from app.science.advice.decide import decide
from app.science.advice.following import following
from app.science.advice.stage_plan import StagePlan, stage_plan
from tests.science.advice.test_decide import SYSTEM, TODAY, outlook

TAW = np.full(10, 120.0)
MIDDLE = np.full(10, 3, np.int8)


def planned(
    refill: float | None = None, target: float | None = None, floor: float | None = None
) -> StagePlan:
    def four(value: float | None) -> tuple[float | None, ...]:
        return (None, None, value, None)

    found = stage_plan(MIDDLE, TAW, 0.0, four(refill), four(target), four(floor))
    assert found is not None
    return found


@pytest.mark.parametrize(
    ("refill", "target", "floor", "net"),
    [
        (None, None, None, 58.0),  # opens at 40 + 3 x 6 = 58
        (0.1, None, None, 46.0),  # 58 - 12
        (None, 0.5, None, 29.0),
        (0.1, 0.5, None, 23.0),  # half of what is above 12
        (0.1, 0.5, 0.2, 34.0),  # 35 would be left; the floor is 24
    ],
)
def test_an_application_leaves_what_the_stage_plans(
    refill: float | None, target: float | None, floor: float | None, net: float
) -> None:
    ahead = replace(outlook(40.0), plan=planned(refill, target, floor))
    advice = decide(ahead, 40.0, replace(SYSTEM, most_mm=80.0), 4.0)
    assert advice.day == TODAY + 3
    assert advice.net_mm == pytest.approx(net)
    assert advice.figures["refill_to_mm"] == pytest.approx(58.0 - net)
    assert advice.figures["et_target"] == (1.0 if target is None else target)


def test_stages_have_their_own_plan_and_none_is_none() -> None:
    stage = np.array([3, 3, 4, 4], np.int8)
    found = stage_plan(stage, TAW[:4], 5.0, (None, None, None, 0.3), None, None)
    assert found is not None
    assert found.refill.tolist() == [5.0, 5.0, 36.0, 36.0]
    assert stage_plan(stage, TAW[:4], 5.0, None, None, None) is None


def test_the_applications_after_it_follow_the_plan_too() -> None:
    ahead = replace(outlook(40.0, days=10), plan=planned(target=0.5))
    first = decide(ahead, 40.0, SYSTEM, 4.0)
    assert first.day is not None
    # 29 mm left; 29 + 5 x 6 = 59 opens the ninth day, which would close past 60: half of 59
    (second,) = following(ahead, 40.0, first.day, first.net_mm, TODAY + 9, SYSTEM, 4.0)
    assert second.day == TODAY + 8
    assert second.net_mm == pytest.approx(29.5)
