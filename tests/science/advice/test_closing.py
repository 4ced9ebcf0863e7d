"""Closing water against a case worked by hand, and what it must hold whatever comes.

Hand case (worked on paper, no source): 40 mm depleted now, 5 mm of ET a day, 20 days to maturity,
limit 60 mm, 84 mm allowed at maturity (0.7 of a TAW of 120 mm). Without water 40 + 100 = 140 mm,
so 56 mm are short. The fifth day opens at 60 and would close at 65: it is the last chance. 56 mm
leave 4, and 16 days of 5 mm end at 84. With at most 30 mm an application: 30 on the fifth day
leave 30, the eleventh opens at 60 again; 26 mm are still short: 34 + 10 x 5 = 84.
"""

import numpy as np
import pytest

from app.science.advice.closing import closing

DATE = np.datetime64("2026-08-01") + np.arange(20)
ETC = np.full(20, 5.0)
LIMIT = np.full(20, 60.0)
DRY = 40.0 + np.cumsum(ETC)
ALWAYS = np.ones(20, np.bool_)


def test_one_application_leaves_the_allowed_depletion_at_maturity() -> None:
    found = closing(DATE, 40.0, DRY, LIMIT, ETC, ALWAYS, 84.0)
    assert found.day.tolist() == [DATE[4].item()]
    assert found.net.tolist() == [56.0]
    assert (found.left_mm, found.without_mm, found.short_mm) == (84.0, 140.0, 0.0)


def test_the_systems_most_shares_it_over_two() -> None:
    found = closing(DATE, 40.0, DRY, LIMIT, ETC, ALWAYS, 84.0, net_most=30.0)
    assert found.day.tolist() == [DATE[4].item(), DATE[10].item()]
    assert found.net.tolist() == [30.0, 26.0]
    assert found.left_mm == 84.0


def test_enough_in_the_soil_asks_for_none_although_the_limit_is_passed() -> None:
    found = closing(DATE, 40.0, DRY, LIMIT, ETC, ALWAYS, 140.0)
    assert found.day.size == 0
    assert (found.left_mm, found.short_mm) == (140.0, 0.0)


def test_the_least_of_the_system_leaves_less_depletion() -> None:
    found = closing(DATE, 40.0, DRY, LIMIT, ETC, ALWAYS, 130.0, net_least=25.0)
    assert found.net.tolist() == [25.0]
    assert found.left_mm == 115.0


def test_less_than_the_least_does_not_pay_while_the_limit_holds() -> None:
    high = np.full(20, 150.0)
    found = closing(DATE, 40.0, DRY, high, ETC, ALWAYS, 130.0, net_least=25.0)
    assert (found.day.size, found.left_mm, found.short_mm) == (0, 140.0, 10.0)
    wetter = closing(DATE, 40.0, DRY, high, ETC, ALWAYS, 84.0)  # 84 binds before the limit
    assert wetter.day.tolist() == [DATE[8].item()]  # opens at 80, would close at 85
    assert wetter.net.tolist() == [56.0]


def test_keep_offs_bring_the_last_forward_and_none_leaves_it_short() -> None:
    kept = ALWAYS.copy()
    kept[3:] = False  # the third day opens at 50: all it can take is 50 of the 56
    found = closing(DATE, 40.0, DRY, LIMIT, ETC, kept, 84.0)
    assert found.day.tolist() == [DATE[2].item()]
    assert found.net.tolist() == [50.0]
    assert (found.left_mm, found.short_mm) == (90.0, 6.0)
    none = closing(DATE, 40.0, DRY, LIMIT, ETC, ~ALWAYS, 84.0)
    assert (none.day.size, none.short_mm) == (0, 56.0)


@pytest.mark.parametrize("seed", range(20))
def test_water_is_the_shortfall_and_an_interval_is_kept(seed: int) -> None:
    random = np.random.default_rng(seed)
    etc = random.uniform(2.0, 8.0, 40)
    date = DATE[0] + np.arange(40)
    limit = np.full(40, 60.0)
    found = closing(
        date, 30.0, 30.0 + np.cumsum(etc), limit, etc, np.ones(40, np.bool_), 80.0,
        net_most=25.0, gap=3,
    )  # fmt: skip
    assert found.left_mm == pytest.approx(30.0 + etc.sum() - found.net.sum())
    assert found.left_mm == pytest.approx(80.0) or found.short_mm > 0.0
    assert (np.diff(found.day) >= np.timedelta64(3, "D")).all()


def test_what_cannot_be_reckoned_is_refused() -> None:
    with pytest.raises(ValueError, match="limit has shape"):
        closing(DATE, 40.0, DRY, LIMIT[:5], ETC, ALWAYS, 84.0)
    with pytest.raises(ValueError, match="every day to maturity"):
        closing(DATE, 40.0, np.full(20, np.nan), LIMIT, ETC, ALWAYS, 84.0)
