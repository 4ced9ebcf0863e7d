"""The panel of checks: what was found, what is missing, what served."""

from datetime import date, timedelta
from typing import Any

import pytest

from app.web.station_watch import QUANTITIES, dates, watch
from tests.web.conftest import Browser

TODAY = date(2026, 7, 14)


def day(back: int, **change: Any) -> dict[str, Any]:
    """A station day `back` days ago with nothing wrong."""
    plain = {"rung": 2, "flags": "", "notes": "", "rn_uncertainty": 0.7, "eto_uncertainty": 0.2}
    return {
        "day": TODAY - timedelta(days=back),
        **dict.fromkeys(QUANTITIES, 1.0),
        **plain,
        **change,
    }


def test_findings_name_days_dates_and_the_last_figure() -> None:
    seen = watch(
        [
            day(5, flags="wind_stuck=0.1"),
            day(4),
            day(3, flags="wind_stuck=0.2", notes="rain:set_aside:3:marked_bad"),
            day(2, flags="wind_stuck=0.3"),
            day(1),
        ],
        TODAY,
    )
    first, second = seen.findings
    assert "wind stood still" in first.name
    assert (first.days, first.when, first.figure) == (3, "9 July, 11 July to 12 July", "0.3")
    assert second.name.startswith("rain set aside")
    assert (second.days, second.figure) == (1, "3 intervals")
    assert seen.missing == ()


def test_what_is_missing_since_when_and_the_range_it_costs() -> None:
    lost = {"longwave_down": None, "rung": 5, "rn_uncertainty": 1.7, "eto_uncertainty": None}
    seen = watch([day(3), day(2, **lost), day(1, **lost)], TODAY)
    assert seen.missing == ("Downward longwave since 12 July.",)
    best, worse = seen.served
    assert (best.days, best.rn_range, best.eto_range) == (1, 0.7, 0.2)
    assert worse.days == 2
    assert worse.rn_range == pytest.approx(1.7)
    assert worse.eto_range is None
    silent = watch([day(6), day(5), day(1, rung=9)], TODAY)
    assert silent.missing == ("Everything since 10 July.",)
    assert watch([], TODAY).missing == ()


def test_of_many_spans_the_last_are_named() -> None:
    every_other = [TODAY - timedelta(days=back) for back in (9, 7, 5, 3, 1)]
    assert dates(every_other) == "2 spans before, 9 July, 11 July, 13 July"


def test_the_station_page_shows_it(browse: Browser) -> None:
    text = browse.get("/stations/bench").text
    assert "Checks, last 30 days" in text
    assert "1 day: 13 July" in text
    assert "mm ETo a day" in text
