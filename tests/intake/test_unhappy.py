"""Bad files and bad cells: a clear message or a listed problem, and nothing else is lost."""

import gzip
import io
import zipfile

import numpy as np
import pytest

from app.intake import IntakeError, answer, read
from tests.intake.helpers import CLOCK, DATA, instants, look, take

HEAD = b"date,temp (degC),RH (%)\n"
ROWS = b"".join(b"2025-05-13 %02d:00,%d.5,%d\n" % (h, 5 + h, 90 - h) for h in range(24))


def a_zip() -> bytes:
    held = io.BytesIO()
    with zipfile.ZipFile(held, "w") as archive:
        archive.writestr("x.csv", HEAD + ROWS)
    return held.getvalue()


NO_TABLE = {
    "empty": (b"", "empty"),
    "blanks": (b" \n\r\n  \n", "nothing but blanks"),
    "zip": (a_zip(), "zip archive"),
    "gzip": (gzip.compress(HEAD + ROWS, mtime=0), "gzip"),
    "picture": (b"\x89PNG\r\n\x1a\n" + bytes(range(256)) * 20, "picture"),
    "jpeg": (b"\xff\xd8\xff\xe0" + bytes(range(256)) * 20, "picture"),
    "pdf": (b"%PDF-1.7\n" + bytes(range(256)) * 9, "PDF"),
    "old workbook": (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(500), "workbook"),
    "web page": (b"<!DOCTYPE html>\n<html><body>Sign in</body></html>", "web page"),
    "xml": (b"<?xml version='1.0'?>\n<rows><row/></rows>", "XML"),
    "json": (b'{"rows": [1, 2, 3]}', "JSON"),
    "noise": (bytes(np.random.default_rng(3).integers(0, 256, 50_000, np.uint8)), "binary"),
    "zero bytes": (bytes(40_000), "blanks|binary"),
    "one endless line": (b"1.5," * 200_000, "endless line"),
    "header only": (HEAD, "header|columns|figures"),
    "header and units only": (HEAD + b"yyyy,degC,%\n", "figures|when"),
    "prose": (b"Dear all,\n\nthe station was fine.\nYours, the warden\n", "column|rows|when"),
    "no dates": (b"temp,rh\n1.5,90\n1.6,91\n1.7,92\n", "says when"),
    "months": (b"date,rain (mm)\n2024-01-01,50\n2024-02-01,40\n2024-03-01,31\n2024-04-01,10\n"
               b"2024-05-01,9\n2024-06-01,3\n2024-07-01,5\n2024-08-01,0\n", "days apart"),
    "weeks": (b"date,rain (mm)\n2024-01-01,50\n2024-01-08,40\n2024-01-15,31\n2024-01-22,10\n"
              b"2024-01-29,9\n", "7 days apart"),
    "decimal commas between commas": (
        b"date,temp (degC),RH (%),wind (m/s)\n"
        + b"".join(b"2025-05-13 %02d:00,11,5,90,2,1,4\n" % h for h in range(24)), "semicolons"),
}  # fmt: skip


@pytest.mark.parametrize("name", NO_TABLE)
def test_what_is_no_table_is_named_with_a_remedy(name: str) -> None:
    data, said = NO_TABLE[name]
    with pytest.raises(IntakeError, match=said) as caught:
        look(data)
    assert len(str(caught.value)) > 40  # says what to do as well


def test_an_endless_line_further_down_is_refused_while_streaming() -> None:
    data = HEAD + ROWS * 30_000
    found = look(HEAD + ROWS)
    with pytest.raises(IntakeError, match=r"Line \d+ is longer"):
        read(io.BytesIO(data + b"7" * 6_000_000), found.mapping, CLOCK)


def test_ambiguous_day_and_month_are_asked_and_never_guessed() -> None:
    data = b"date,temp (degC)\n" + b"".join(
        b"%02d/05/2025 %02d:00,9.5\n" % (d, h) for d in (3, 4, 5) for h in range(24)
    )
    found = look(data)
    question = next(q for q in found.questions if q.field == "time.order")
    assert question.blocking
    assert question.suggested == "dmy"  # the rows then follow each other evenly
    assert {choice.value for choice in question.choices} == {"dmy", "mdy"}
    with pytest.raises(IntakeError, match="order are the dates"):
        read(io.BytesIO(data), found.mapping, CLOCK)
    by_day = take(data, {"time.order": "dmy"}).rows.instant
    by_month = take(data, {"time.order": "mdy"}).rows.instant
    assert by_day[0] == instants("2025-05-03T00:00")[0] - 7200
    assert by_month[0] == instants("2025-03-05T00:00")[0] - 7200


def test_one_date_far_down_settles_day_and_month() -> None:
    early = b"".join(b"0%d/02/2025 %02d:%02d,9.5\n" % (d, h, m) for d in range(1, 10)
                     for h in range(24) for m in range(60))  # fmt: skip
    data = b"date,temp (degC)\n" + early * 8 + b"13/02/2025 00:00,9.5\n"
    assert len(data) > 2_000_000
    found = look(data)
    assert found.mapping.time.order == "dmy"
    assert "line 103682 (13/02/2025) settles day before month" in found.why[0]


def test_dates_that_only_month_first_allows() -> None:
    data = b"date,temp (degC)\n05/12/2025,9.5\n05/13/2025,9.5\n05/14/2025,9.1\n"
    assert look(data).mapping.time.order == "mdy"


def test_an_unknown_unit_is_asked() -> None:
    data = b"date,wind speed [furlongs]\n2025-05-13 00:00,2\n2025-05-13 01:00,3\n"
    found = look(data)
    question = next(q for q in found.questions if q.field == "columns.1.unit")
    assert "furlongs" in question.why
    with pytest.raises(IntakeError, match="Which unit"):
        read(io.BytesIO(data), found.mapping, CLOCK)
    rows = take(data, {"columns.1.unit": "knot"}).rows
    np.testing.assert_allclose(rows.values["wind_speed"], [2 * 1852 / 3600, 3 * 1852 / 3600])
    with pytest.raises(IntakeError, match="No column is taken for a weather quantity"):
        take(data, {"columns.1.unit": "leave out"})


def test_a_percent_sign_over_fractions_is_asked() -> None:
    data = b"date,RH (%)\n" + b"".join(
        b"2025-05-13 %02d:00,0.%d\n" % (h, 30 + h) for h in range(24)
    )
    question = next(q for q in look(data).questions if q.field == "columns.1.unit")
    assert question.suggested == "fraction"


def test_longwave_without_its_body_term() -> None:
    data = b"date,LW in (W/m2),body temp (degC)\n" + b"".join(
        b"2025-05-13 %02d:00,-%d.0,15.0\n" % (h, 60 + h) for h in range(24)
    )
    question = next(q for q in look(data).questions if "body" in q.field)
    assert question.suggested == "2"
    rows = take(data, {question.field: "2"}).rows
    black_body = 5.670374419e-8 * 288.15**4  # CODATA 2018, Stefan-Boltzmann constant
    np.testing.assert_allclose(rows.values["longwave_down"], black_body - 60 - np.arange(24))


def test_daily_rows_at_midnight_are_asked_which_day_they_mean() -> None:
    data = b"date,rain (mm)\n" + b"".join(b"2025-05-%02d 00:00:00,1.5\n" % d for d in range(1, 20))
    data_answered = {
        side: take(data, {"row_time": side}).rows.instant[0] for side in ("start", "end")
    }
    assert [q.field for q in look(data).questions] == ["row_time"]
    assert data_answered["start"] - data_answered["end"] == 86400


def test_bad_cells_and_rows_are_listed_and_the_rest_is_taken() -> None:
    data = HEAD + (
        b"2025-05-13 00:00,1.5,90\n"
        b"2025-05-13 01:00,abc,91\n"  # line 3: junk cell, RH kept
        b"2025-05-13 02:00,85,92\n"  # line 4: impossible, RH kept
        b"2025-02-30 03:00,1.5,93\n"  # line 5: no such day
        b"2025-05-13 27:00,1.5,93\n"  # line 6: no such time
        b"2025-05-13 04:00,1.5\n"  # line 7: too few
        b"2025-05-13 05:00,1.5,94,7\n"  # line 8: too many
        b"not a date,1.5,95\n"  # line 9
        b"2025-05-13 06:00,NAN,-9999.00\n"  # line 10: both missing
        b"2025-05-13 07:00,2.5,96\n"
        b"2025-05-13 07:00,2.5,96\n"  # line 12: the same again
        b"2025-05-13 08:00,2.5,96\n"
        b"2025-05-13 08:00,3.5,\n"  # line 14: differs
        b"\n"
        b"2025-05-13 09:00,3.5,97\n"
    )  # fmt: skip
    reading = take(data)
    *_, run = (p for p in reading.problems if (p.why, p.count) == ("no value", 3))
    assert (run.line, run.last_line, run.column) == (3, 10, "temp (degC)")
    by_line = {p.line: p for p in reading.problems if p != run}
    assert set(by_line) == {3, 4, 5, 6, 7, 8, 9, 13}
    assert (by_line[3].column, by_line[3].value) == ("temp (degC)", "abc")
    assert "missing" in by_line[3].remedy
    assert "impossible" in by_line[4].why
    assert by_line[4].value == "85"
    assert by_line[5].why == "there is no such day"
    assert by_line[6].why == "there is no such time of day"
    assert "too few fields: 2 where the table has 3" in by_line[7].why
    assert "too many fields" in by_line[8].why
    assert "no date" in by_line[9].why
    assert by_line[13].severity == "warning"
    assert all(problem.remedy for problem in reading.problems)
    counts = reading.counts
    assert (counts.rows, counts.rows_refused, counts.cells_refused) == (7, 5, 2)
    assert (counts.duplicates_same, counts.duplicates_differing, counts.blank_lines) == (1, 1, 1)
    assert counts.missing == {"temp (degC)": 1, "RH (%)": 2}
    rows = reading.rows.values
    np.testing.assert_array_equal(
        rows["air_temperature"], [1.5, np.nan, np.nan, np.nan, 2.5, 3.5, 3.5]
    )
    np.testing.assert_array_equal(rows["relative_humidity"], [90, 91, 92, np.nan, 96, 96, 97])


@pytest.mark.parametrize(
    ("end", "taken"),
    [
        (b"2025-05-14 00:00,7.5,80", 25),  # whole, only the line end is missing
        (b"2025-05-14 00:00,7.5,80\n", 25),
        (b"2025-05-14 00:00,7.5", 24),
        (b"2025-05-14 00:00,7.5,", 24),
        (b"2025-05-14 00:0", 24),
    ],
)
def test_a_cut_last_line_is_refused_with_its_remedy(end: bytes, taken: int) -> None:
    reading = take(HEAD + ROWS + end)
    assert len(reading.rows) == taken
    if taken == 24:
        (problem,) = reading.problems
        assert problem.line == 26
        assert "cut off" in problem.why
        assert "Send the file again" in problem.remedy


def test_a_last_figure_with_fewer_decimals_than_all_others_is_cut() -> None:
    rows = b"".join(b"2025-05-13 %02d:00,%d.25\n" % (h, h) for h in range(20))
    assert len(take(b"date,temp (degC)\n" + rows + b"2025-05-13 20:00,1.2").rows) == 20
    assert len(take(b"date,temp (degC)\n" + rows + b"2025-05-13 20:00,1.25").rows) == 21


def test_rows_out_of_order_are_sorted_and_said() -> None:
    data = HEAD + b"2025-05-13 02:00,3,90\n2025-05-13 00:00,1,90\n2025-05-13 01:00,2,90\n"
    reading = take(data)
    np.testing.assert_array_equal(reading.rows.values["air_temperature"], [1, 2, 3])
    np.testing.assert_array_equal(reading.rows.line, [3, 4, 2])
    assert reading.counts.out_of_order == 1


@pytest.mark.parametrize("code", ["-9999", "NAN", "NaN", "7999", "-6999", "M", "---", "", "#N/A",
                                  "-9999.0", "null", "N/A"])  # fmt: skip
def test_missing_codes(code: str) -> None:
    data = HEAD + ROWS + f"2025-05-14 00:00,{code},80\n2025-05-14 01:00,7.5,{code}\n".encode()
    reading = take(data)
    assert reading.problems == ()
    assert np.isnan(reading.rows.values["air_temperature"][24])
    assert np.isnan(reading.rows.values["relative_humidity"][25])
    assert reading.counts.missing == {"temp (degC)": 1, "RH (%)": 1}


def test_a_missing_code_that_may_be_a_reading_is_a_reading() -> None:
    """7999 Wh/m2 is a sunny day, 7999 degC is not."""
    data = b"date,Rs (Wh/m2),tmax (degC)\n" + b"".join(
        b"2025-05-%02d,%d,21.0\n" % (d, 5000 + 100 * d) for d in range(1, 20)
    )
    rows = take(data + b"2025-05-20,7999,7999\n").rows.values
    assert rows["shortwave_down"][-1] == pytest.approx(7999 / 24)
    assert np.isnan(rows["air_temperature_max"][-1])


def test_a_mapping_that_contradicts_itself_is_refused() -> None:
    mapping = look(HEAD + ROWS).mapping
    for field, value, said in (
        ("columns.1.quantity", "dew", "no quantity known"),
        ("columns.1.unit", "mm", "does not measure"),
        ("columns.2.quantity", "air_temperature", "both mapped|does not measure"),
    ):
        with pytest.raises(IntakeError, match=said):
            read(io.BytesIO(HEAD + ROWS), answer(mapping, {field: value}), CLOCK)
    for field, value in (("time.order", "sideways"), ("time_zone", "Mars/Olympus"), ("rows", "1"),
                         ("columns.77.unit", "mm"), ("interval_s", "soon")):  # fmt: skip
        with pytest.raises(IntakeError):
            answer(mapping, {field: value})


def test_a_wrong_step_in_the_mapping_is_warned_of() -> None:
    mapping = answer(look(HEAD + ROWS).mapping, {"interval_s": "900"})
    reading = read(io.BytesIO(HEAD + ROWS), mapping, CLOCK)
    assert "3600 s apart" in reading.problems[0].why


def test_progress_is_reported_in_bytes() -> None:
    data = (DATA / "iso_comma.csv").read_bytes()
    seen: list[tuple[int, int]] = []
    mapping = look(data).mapping
    read(io.BytesIO(data), mapping, CLOCK, lambda done, of: seen.append((done, of)))
    assert seen[-1] == (len(data), len(data))


def test_a_hundred_thousand_rows_with_junk_here_and_there() -> None:
    """Several blocks, fast and slow ways mixed: every good row is read, every bad cell listed."""
    steps = np.arange(100_000)
    texts = (np.datetime64("2020-01-01T00:00") + steps).astype(str)
    lines = [
        f"{t.replace('T', ' ')},{10 + i % 90 / 10:.1f},{50 + i % 40}" for i, t in enumerate(texts)
    ]
    junk = [7, 60_000, 99_998]
    for at in junk:
        lines[at] = lines[at].rsplit(",", 1)[0] + ",junk"
    lines[30_000] = "a;broken;line"
    reading = take(HEAD + "\n".join(lines).encode() + b"\n")
    assert len(reading.rows) == 99_999
    assert [p.line for p in reading.problems if p.value == "junk"] == [at + 2 for at in junk]
    assert int(np.isnan(reading.rows.values["relative_humidity"]).sum()) == 3
    assert reading.counts.cells_refused == 3
