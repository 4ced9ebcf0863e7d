"""Words for every code, and figures as people read them (checks of our own tables: regression)."""

import re
from datetime import date, timedelta

import pytest

from app import wording
from app.book.parts import Purpose, SaidToBeDone, Variable
from app.science.advice.reasons import Reason
from app.science.energy import checks
from app.science.energy.day_checks import CHECKS
from app.science.energy.ladder import LADDER
from app.science.quantities import QUANTITIES
from app.wording.reasons import BOUNDS, REASONS

TODAY = date(2026, 7, 14)
FIGURES = {
    "horizon_days": 14.0,
    "depletion_mm": 71.2,
    "limit_mm": 66.0,
    "cover_days": 2.0,
    "most_net_mm": 20.0,
    "interval_days": 2.0,
    "etc_mm": 113.0,
    "chances_before": 1.0,
    "first_chance": "2026-07-17",
    "last_chance": "2026-07-15",
    "last_depletion_mm": 50.0,
    "last_limit_mm": 66.0,
    "limit_day": "2026-07-16",
    "limit_day_depletion_mm": 67.0,
    "limit_day_limit_mm": 66.0,
    "opening_mm": 60.0,
    "refill_to_mm": 0.0,
    "rain_room_mm": 0.0,
    "efficiency": 0.8,
    "bound": "least",
    "past_field_capacity_mm": 3.0,
}


@pytest.mark.parametrize("reason", list(Reason))
def test_every_reason_of_an_advice_is_one_sentence(reason: Reason) -> None:
    said = wording.reason(reason.value, FIGURES, date(2026, 7, 15), TODAY)
    assert re.fullmatch(r"[A-Z].*\.", said), said
    assert "_" not in said
    assert "{" not in said


def test_there_is_no_sentence_for_a_reason_that_does_not_exist() -> None:
    assert set(REASONS) - {reason.value for reason in Reason} == {"last_chance_same_day"}


def test_the_last_chance_names_limit_and_chance() -> None:
    said = wording.reason("last_chance", FIGURES, date(2026, 7, 15), TODAY)
    assert said == "Passes its limit on Thursday; tomorrow is the last chance before."
    same = wording.reason("last_chance", FIGURES, date(2026, 7, 16), TODAY)
    assert same == "Passes its limit by the close of Thursday unless watered."


@pytest.mark.parametrize("bound", ["", "least", "most", "hours", "intake"])
def test_every_bound_is_worded(bound: str) -> None:
    assert set(BOUNDS) == {"", "least", "most", "hours", "intake"}
    said = wording.bound({"bound": bound, "past_field_capacity_mm": 3.0}, TODAY)
    assert said.endswith("3.0 mm of it the root zone cannot hold.")


def test_an_unknown_code_warns_and_is_shown() -> None:
    with pytest.warns(wording.UnwordedCode, match="snow_on_mars"):
        assert wording.reason("snow_on_mars", {}, None, TODAY) == "snow on mars"
    with pytest.warns(wording.UnwordedCode):
        assert wording.check_word("no_such_check") == "no such check"


def test_every_day_check_and_quantity_is_worded() -> None:
    assert set(CHECKS) <= set(wording.FLAGS)
    assert set(QUANTITIES) <= set(wording.QUANTITIES)


def test_every_row_check_is_worded() -> None:
    """The checks are named in the text of their module, `quantity/check`."""
    with open(checks.__file__, encoding="utf-8") as file:
        names = re.findall(r'yield\s*\(?\s*f?"[^"/]*/(\w+)"', file.read())
    assert len(names) > 8
    for name in names:
        assert name in wording.FLAGS, name


def test_rungs_are_named_as_the_ladder_names_them() -> None:
    assert [rung.name for rung in LADDER] == list(wording.RUNGS[1:])


def test_every_choice_of_the_book_is_worded() -> None:
    assert set(Purpose.__args__) == set(wording.PURPOSES)
    assert set(SaidToBeDone.__args__) == set(wording.CONFIRMATIONS)
    assert set(Variable.__args__) == set(wording.VARIABLES)


def test_why_no_better_rung() -> None:
    codes = "1:surface 2:missing:longwave_down,tmax 3:failed:wind_stuck 4:no_fit 6:no_neighbours"
    said = dict(wording.why_codes(codes))
    assert said[2] == "no downward longwave, maximum temperature"
    assert said[3] == wording.FLAGS["wind_stuck"]
    assert wording.why_not_rung(codes, 4) == "no fit of measured on modelled longwave yet"
    assert wording.why_codes("") == []
    for rung in LADDER:
        if rung.absent:
            assert rung.absent in wording.WHY_NOT


def test_flags_carry_their_figure() -> None:
    assert wording.flag_words("wind_low=0.31 rain_negative=-1") == [
        "wind is below 0.5 m/s (0.31)",
        "rain is below zero (−1)",
    ]


def test_unsure_says_which_station_and_how_old() -> None:
    said = wording.unsure("stale:lane:4 range:6", {"lane": "Sand Lane"}, date(2026, 7, 13))
    assert said[0] == "Sand Lane: last data Thu 9 Jul; check the soil."
    assert "6 days" in said[1]
    assert wording.unsure("stale:lane:9999", {}, date(2026, 7, 13)) == [
        "lane: has sent nothing yet; check the soil."
    ]
    assert wording.unsure("", {}, date(2026, 7, 13)) == []


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [
        (6570.4, 0, "6\u202f570"),
        (-3.26, 1, "\u22123.3"),
        (-0.04, 1, "0.0"),
        (float("nan"), 1, "–"),
        (None, 1, "–"),
        (0, 0, "0"),
        (1e7, 0, "10\u202f000\u202f000"),
    ],
)
def test_numbers(value: float | None, digits: int, text: str) -> None:
    assert wording.number(value, digits) == text


def test_depths_volumes_shares_and_changes() -> None:
    assert wording.depth(52.5) == "52"
    assert wording.depth(7.26) == "7.3"
    assert wording.depth(0.01) == "0"
    assert wording.volume(6573.0) == "6\u202f570"
    assert wording.volume(0.0) == "0"
    assert wording.share(0.5) == "50\u202f%"
    assert wording.signed(6.1) == "+6.1"
    assert wording.signed(-0.02) == "0.0"
    assert wording.signed(0.04) == "0.0"
    assert wording.blank(0.0) == ""
    assert wording.blank(2.4) == "2.4"
    assert wording.plain(7.5) == "7.5"


def test_days() -> None:
    assert wording.long_day(TODAY) == "Tuesday 14 July"
    assert wording.short_day(TODAY) == "Tue 14 Jul"
    near = [wording.near_day(TODAY + timedelta(days=step), TODAY) for step in (-1, 0, 1, 3, 9)]
    assert near == ["yesterday", "today", "tomorrow", "Friday", "23 Jul"]
    assert wording.days(1) == "1 day"
    assert wording.counted(2, "field", "fields") == "2 fields"
