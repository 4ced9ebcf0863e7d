"""What the model would have asked for more since planting."""

from datetime import date

import pytest

from app.science.energy.compare import CUBIC_M_PER_ACRE_FOOT
from app.storage.saved import FedDay
from app.workflows.measuring_saved import add_up

FIRST, SECOND, THIRD = date(2026, 7, 1), date(2026, 7, 2), date(2026, 7, 3)


def test_kc_times_the_difference_is_summed_by_field_over_its_area() -> None:
    """By hand, regression: 10 m3 to the mm and hectare."""
    fed = [
        FedDay("long", "Long Piece", 1, 10.0, FIRST, 1.0),
        FedDay("long", "Long Piece", 1, 10.0, SECOND, 0.5),
        FedDay("long", "Long Piece", 1, 10.0, THIRD, 1.2),  # not measured that day
        FedDay("halves", "Two Halves", 2, 5.0, FIRST, 1.0),
        FedDay("halves", "Two Halves", 3, 15.0, FIRST, 0.2),
        FedDay("far", "Far End", 4, 8.0, THIRD, 1.0),
    ]
    saved = add_up(fed, {FIRST: 0.6, SECOND: -0.2})
    long, halves = saved.fields
    assert (long.key, long.days, long.area_ha) == ("long", 2, 10.0)
    assert long.mm == pytest.approx(0.5)  # 1.0 x 0.6 - 0.5 x 0.2
    assert long.m3 == pytest.approx(50.0)
    assert halves.m3 == pytest.approx(30.0 + 18.0)
    assert halves.mm == pytest.approx(48.0 / 200.0)
    assert saved.m3 == pytest.approx(98.0)
    assert saved.area_ha == 30.0
    assert saved.acre_feet == pytest.approx(98.0 / CUBIC_M_PER_ACRE_FOOT)


def test_nothing_measured_saves_nothing() -> None:
    assert add_up([FedDay("a", "A", 1, 1.0, FIRST, 1.0)], {}).fields == ()
    assert add_up([], {FIRST: 1.0}).m3 == 0.0
