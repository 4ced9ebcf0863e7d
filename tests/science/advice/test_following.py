"""What follows an advice (checks of our own rule: regression; bookkeeping by hand)."""

import numpy as np
import pytest

from app.science.advice.decide import Outlook, decide
from app.science.advice.following import following
from app.science.advice.system import ApplicationSystem

DRIP = ApplicationSystem(efficiency=0.9, rate_mm_h=2.0, least_mm=5.0, most_mm=18.0)
FIRST = np.datetime64("2026-07-13")


def ahead(now: float = 20.0, use: float = 7.0, days: int = 14) -> Outlook:
    return Outlook(
        date=FIRST + np.arange(days),
        depletion=now + use * np.arange(1, days + 1),
        limit=np.full(days, 30.0),
        taw=np.full(days, 400.0),
        etc=np.full(days, use),
        allowed=np.ones(days, bool),
    )


def test_a_drip_field_is_watered_every_other_day_and_never_passes_its_limit() -> None:
    outlook = ahead()
    first = decide(outlook, 20.0, DRIP, 8.0)
    assert first.day is not None
    rest = following(outlook, 20.0, first.day, first.net_mm, FIRST + 6, DRIP, 8.0)
    assert 2 <= len(rest) <= 4
    water = {advice.day: advice.net_mm for advice in [first, *rest]}
    depletion = 20.0
    for day in outlook.date[:7]:
        depletion += 7.0 - water.get(day, 0.0)
        assert depletion <= 30.0 + 1e-9, day
    assert all(advice.day <= FIRST + 6 for advice in rest)


def test_nothing_follows_where_the_week_ends_first_or_water_lasts() -> None:
    assert following(ahead(), 20.0, FIRST, 16.0, FIRST, DRIP, 8.0) == []
    assert following(ahead(use=0.5), 20.0, FIRST, 16.0, FIRST + 6, DRIP, 8.0) == []
    assert following(ahead(), 20.0, FIRST - 1, 16.0, FIRST + 6, DRIP, 8.0) == []


def test_days_kept_off_are_left_out() -> None:
    outlook = ahead()
    outlook.allowed[2:4] = False
    rest = following(outlook, 20.0, FIRST + 1, 16.2, FIRST + 6, DRIP, 8.0)
    assert rest
    assert not {FIRST + 2, FIRST + 3} & {advice.day for advice in rest}


@pytest.mark.parametrize("net", [0.0, 500.0])
def test_odd_depths_are_taken(net: float) -> None:
    for advice in following(ahead(), 20.0, FIRST, net, FIRST + 6, DRIP, 8.0):
        assert advice.day is not None
        assert advice.net_mm > 0
