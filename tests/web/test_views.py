"""The small pieces behind the pages (checks of our own rules: regression)."""

from datetime import date, timedelta
from typing import Any

import pytest

from app.storage.pages import RecentDay, RoundsRow, StationRow
from app.web import charts, measured, trouble
from app.web.crops import crop_name, published_stages, season_words, stage
from app.web.rounds_view import Bar, bar
from app.workflows.managed import managed, one_a_field
from tests.web.factory import TODAY

NAN = float("nan")


def row(
    block: str, depletion: float, limit: float, by: str = "driest", number: int = 1
) -> RoundsRow:
    values: dict[str, Any] = dict.fromkeys(RoundsRow._fields)
    values.update(block_key=block, managed_by=by, depletion_mm=depletion, limit_mm=limit)
    return RoundsRow(**{**values, "number": number})


def test_the_bar_is_cut_at_both_ends() -> None:
    assert bar(71, 66, 132, 64, 78) == Bar(50, 50, 4, 48, 11)
    assert bar(0, 60, 120, 0, 4) == Bar(0, 50, 0, 0, 3)
    assert bar(-3, 60, 120, -9, 150) == Bar(0, 50, 0, 0, 100)
    assert bar(50, 66, 132, NAN, NAN) == Bar(38, 50, 0, 0, 0)
    assert bar(50, 66, 0, 40, 60) == Bar(0, 0, 0, 0, 0)


def test_a_field_goes_by_its_driest_median_or_named_block() -> None:
    by = {"a": 30.0, "b": 60.0, "c": 40.0}
    for rule, block in (("driest", "b"), ("median", "c"), ("a", "a")):
        assert managed([row(key, mm, 66, rule) for key, mm in by.items()]).block_key == block
    # of shallow roots 20 of 22 mm is drier than 30 of 66
    assert managed([row("deep", 30, 66), row("shallow", 20, 22)]).block_key == "shallow"
    two = [row("a", 10, 66, "median"), row("b", 20, 66, "median")]
    assert managed(two).block_key == "b"
    none = replace_number(row("a", 0, 66))
    assert managed([none, row("b", 1, 66)]).block_key == "b"
    assert managed([none, replace_number(row("b", 0, 0))]).block_key in ("a", "b")


def replace_number(blank: RoundsRow) -> RoundsRow:
    """The row of a block without advice."""
    return blank._replace(number=None)


def test_a_more_urgent_block_is_not_hidden_behind_the_managed_one() -> None:
    chosen = row("a", 10, 66, "a")._replace(field_id=1, standing="easy")
    other = row("b", 60, 66, "a")._replace(field_id=1, standing="due")
    assert one_a_field([chosen, other]) == [(chosen, [other])]
    calm = other._replace(standing="wet")
    assert one_a_field([chosen, calm]) == [(chosen, [])]


def days(rungs: list[int], until: int = 1, flags: str = "") -> list[RecentDay]:
    first = TODAY - timedelta(days=until + len(rungs) - 1)
    return [
        RecentDay(
            1,
            first + timedelta(days=place),
            rung,
            "2:missing:longwave_down",
            flags,
            0.2 + 0.1 * rung,
        )
        for place, rung in enumerate(rungs)
    ]


STATION = StationRow(1, "mast", "Mast", {})


def said(recent: list[RecentDay], last: date | None) -> list[str]:
    found = trouble.troubles([STATION], recent, {1: last} if last else {}, {}, TODAY)
    return [text for item in found for text in item.says]


def test_a_station_that_is_well_is_silent_on_the_strip() -> None:
    assert said(days([2] * 10), TODAY - timedelta(days=1)) == []
    assert said(days([5] * 10), TODAY - timedelta(days=1)) == []


def test_silence_is_told_by_its_length() -> None:
    for back, text in (
        (2, "Yesterday is missing; last data Sun 12 Jul."),
        (3, "Silent; last data Sat 11 Jul."),
    ):
        assert said([], TODAY - timedelta(days=back)) == [text]
    assert said([], None) == ["Has sent nothing yet."]
    (ahead,) = said([], TODAY + timedelta(days=400))
    assert "to come" in ahead


def test_a_fall_down_the_ladder_is_told_from_its_first_day() -> None:
    (text,) = said(days([2] * 8 + [5, 5]), TODAY - timedelta(days=1))
    assert text == (
        "Energy fell from measured sky to model from solar since Sun 12 Jul: no downward longwave."
        " ETo is known to ± 0.70 mm a day in place of ± 0.40."
    )
    assert said(days([5] * 8 + [2]), TODAY - timedelta(days=1)) == []


def test_checks_of_the_last_two_days_are_told_once() -> None:
    (text,) = said(days([2] * 10, flags="wind_low=0.3"), TODAY - timedelta(days=1))
    assert text == "Wind is below 0.5 m/s (0.3)."


def test_the_path_breaks_where_a_value_is_missing() -> None:
    assert charts.path([(0, 1.0), (1, None), (2, 3.0), (3, 4.0)]) == "M0.0 1.0M2.0 3.0L3.0 4.0"
    assert charts.path([]) == ""


def test_the_depletion_hangs_below_field_capacity() -> None:
    dates = [TODAY - timedelta(days=back) for back in (3, 2, 1)]
    ahead = [TODAY + timedelta(days=step) for step in range(3)]
    drawn = charts.depletion_chart(
        dates, [10.0, 20.0, 30.0], [40.0] * 3, [0, 5, 0], [12, 0, 0], ahead,
        [35.0, 40.0, 45.0], [40.0] * 3, [30.0, 33.0, 36.0], [40.0, 50.0, 400.0],
    )  # fmt: skip
    assert drawn is not None
    heights = [float(point.split()[1]) for point in drawn.known[1:].split("L")]
    assert heights == sorted(heights)
    numbers = [float(n) for n in drawn.veil.replace("M", " ").replace("L", " ").strip("Z ").split()]
    assert max(numbers[1::2]) <= drawn.bottom
    assert [mark.text for mark in drawn.rain] == ["Sun 12 Jul: 5.0 mm"]
    assert len(drawn.irrigation) == 1
    assert "30 mm against a limit of 40 mm" in drawn.said
    assert charts.depletion_chart([], [], [], [], [], [], [], [], [], []) is None


def test_one_day_can_be_drawn() -> None:
    assert charts.depletion_chart([TODAY], [5.0], [40.0], [0], [0], [], [], [], [], []) is not None
    assert charts.energy_chart([TODAY], [14.0], [None], [14.0]) is not None
    assert charts.energy_chart([TODAY], [None], [None], [None]) is None


def test_measured_against_modelled_is_told_in_mm_of_eto() -> None:
    """0.408 Δ/(Δ + γ (1 + 0.34 u2)) mm a MJ (FAO-56 eq 6), about 0.25 to 0.33 in summer."""
    day = {
        "day": TODAY, "tmax": 30.0, "tmin": 14.0, "vapour_pressure": 1.4, "wind_2m": 2.0,
        "rn_measured": 14.0, "rn_modelled": 15.0,
    }  # fmt: skip
    found = measured.compare([day, {**day, "rn_measured": None}], 100.0)
    assert found is not None
    assert (found.days, found.both) == (2, 1)
    assert found.ratio - 1.0 == pytest.approx(1 / 14)
    assert found.bias_mj == pytest.approx(1.0)
    assert 0.2 < found.eto_more_mm < 0.35
    assert measured.compare([], 0.0) is None
    assert [month for month, _ in measured.by_month([day], 100.0)] == ["2026-07"]


def test_crops_are_named_and_staged() -> None:
    assert crop_name("maize_grain") == "maize, grain"
    assert crop_name("no_such_crop") == "no such crop"
    assert stage((25, 40, 45, 30), 25) == "initial"
    assert stage((25, 40, 45, 30), 26) == "development"
    assert stage((25, 40, 45, 30), 141) == ""
    assert stage(None, 3) == ""
    assert published_stages("no_such_crop") is None
    planting = date(2026, 5, 8)
    assert season_words("maize_grain", planting, None, planting).startswith("maize, grain, day 1")
    assert season_words(None, None, None, planting) == ""
