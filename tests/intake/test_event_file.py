"""Files of events as people make them: columns, units, dates, and what is wrong by line."""

from datetime import date

import pytest

from app.intake.errors import IntakeError
from app.intake.event_file import FileEvent, LineProblem, read_events


def read(text: str, order: str | None = None) -> list[FileEvent]:
    events, problems = read_events(text.encode(), order)
    assert problems == []
    return events


def wrong(text: str, order: str | None = None) -> list[LineProblem]:
    return read_events(text.encode(), order)[1]


@pytest.mark.parametrize(
    ("amount", "unit", "kept", "ours"),
    [
        ("8", "hours", 8, "hours"), ("90", "min", 1.5, "hours"),
        ("1", "gross in", 25.4, "gross_mm"),
        ("20", "mm net", 20, "net_mm"), ("2", "ML", 2000, "volume_m3"),
        # NIST SP 811 (2008), appendix B.8: acre-foot 1233.482 m3 (an acre-inch its twelfth),
        # US gallon 3.785412e-3 m3
        ("12", "acre-in", 1233.482, "volume_m3"), ("1", "acre-ft", 1233.482, "volume_m3"),
        ("1000", "gal", 3.785412, "volume_m3"),
    ],
)  # fmt: skip
def test_units_of_water(amount: str, unit: str, kept: float, ours: str) -> None:
    (event,) = read(f"field,day,what,amount,unit\nx,2026-07-01,irrigation,{amount},{unit}\n")
    assert event.unit == ours
    assert event.amount == pytest.approx(kept, rel=1e-6)


def test_a_spanish_sheet_with_semicolons_and_decimal_commas() -> None:
    text = "Campo;Fecha;Lámina bruta (mm);Lluvia mm;Nota\nAlto;13/07/2026;7,5;;\nAlto;14/7/2026;;3;"
    first, second = read(text)
    assert (first.kind, first.amount, first.unit, first.day) == (
        "irrigation", 7.5, "gross_mm", date(2026, 7, 13),
    )  # fmt: skip
    assert (second.kind, second.amount) == ("rain", 3.0)


def test_a_sheet_in_utf_16_with_tabs_and_a_mark_at_its_start() -> None:
    text = "field\tday\twhat\tnote\r\nx\t2026-07-01\tnote\taphids; gate\r\n"
    events, problems = read_events(text.encode("utf-16"))
    assert not problems
    assert events[0].note == "aphids; gate"


def test_what_was_seen() -> None:
    text = (
        "field,day,what,amount,unit,height cm,last\n"
        "x,2026-07-01,stage,mid season,,,\nx,2026-07-02,cover,60,%,45,\n"
        "x,2026-07-03,cut,,,,\nx,2026-07-04,keep off,,,,2026-07-09\n"
    )
    stage, cover, cut, keep = read(text)
    assert (stage.kind, stage.amount) == ("stage", 3)
    assert (cover.amount, cover.details["height_m"]) == (pytest.approx(0.6), pytest.approx(0.45))
    assert cut.kind == "cutting"
    assert keep.details == {"last": date(2026, 7, 9)}


def test_readings_are_put_together_by_place_and_time() -> None:
    text = (
        'field,day,hour,"depth, in",value,unit\n'
        "x,2026-07-01,6:30,12,21,% vol\nx,2026-07-01,6:30,24,24,% vol\nx,2026-07-01,7,12,55,kPa\n"
    )
    first, second = read(text)
    assert first.lines == (2, 3)
    assert first.details["method"] == "volumetric"
    assert first.details["hour"] == 6.5
    assert first.details["depths"][1] == {
        "depth_m": pytest.approx(0.6096), "value": pytest.approx(0.24), "error": None,
    }  # fmt: skip
    assert second.details["method"] == "tension"


def test_day_and_month_are_asked_for_only_where_they_can_be_taken_for_each_other() -> None:
    text = "field,day,what,note\nx,3/4/2026,note,a\nx,5/6/2026,note,b\n"
    (problem,) = wrong(text)
    assert (problem.line, problem.value) == (2, "3/4/2026")
    assert "Choose the order" in problem.remedy
    assert read(text, "dmy")[0].day == date(2026, 4, 3)
    assert read(text, "mdy")[0].day == date(2026, 3, 4)
    assert read(text + "x,25/6/2026,note,c\n")[0].day == date(2026, 4, 3)


@pytest.mark.parametrize(
    ("row", "column", "value", "says"),
    [
        ("x,2026-07-01,irrigation,8,mm,", "unit", "mm", "gross or net"),
        ("x,2026-07-01,irrigation,8,,", "unit", "", "its unit is not stated"),
        ("x,2026-07-01,irrigation,8,buckets,", "unit", "buckets", "not known"),
        ("x,2026-07-01,irrigation,much,hours,", "amount", "much", "no number"),
        ('x,2026-07-01,irrigation,"1,200",m3,', "amount", "1,200", "thousands or as decimals"),
        ("x,2026-07-01,irrigation,,hours,", "amount", "", "there is no amount"),
        ("x,2026-07-01,rain,8,hours,", "amount", "8", "no amount of rain"),
        ("x,2026-07-01,dance,8,hours,", "what", "dance", "not known"),
        ("x,31 June 2026,irrigation,8,hours,", "day", "31 June 2026", "no date"),
        ("x,,irrigation,8,hours,", "day", "", "there is no date"),
        (",2026-07-01,irrigation,8,hours,", "field", "", "no field is named"),
        ("x,2026-07-01,stage,ripe,,", "amount", "ripe", "no stage"),
        ("x,2026-07-01,irrigation,8,hours,1.5", "area share", "1.5", "no part of an area"),
        ("x,2026-07-01,cover,60,,", "amount", "60", "fraction of the ground"),
    ],
)
def test_what_is_wrong_is_told_by_line_column_and_value(
    row: str, column: str, value: str, says: str
) -> None:
    text = f"field,day,what,amount,unit,area share\nx,2026-06-30,irrigation,5,hours,\n{row}\n"
    (problem,) = wrong(text)
    assert (problem.line, problem.column, problem.value) == (3, column, value)
    assert says in problem.why
    assert problem.remedy


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (b"", "empty"), (b"PK\x03\x04zip", "workbook"), (b"field,day\n", "no rows"),
        (b"field,day,colour\nx,2026-07-01,red\n", "no column is called 'colour'"),
        (b"day,what\n2026-07-01,cut\n", "no column is called 'field'"),
        (b"field,day,date\nx,1,2\n", "stands twice"),
        (b"field,day\n" + b"x,2026-07-01\n" * 5001, "more than 5000"),
    ],
)  # fmt: skip
def test_what_is_no_table_of_events_is_refused(data: bytes, says: str) -> None:
    with pytest.raises(IntakeError, match=says):
        read_events(data)
