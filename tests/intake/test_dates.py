"""Dates of many layouts; what is no date is said to be none.

The expected instants are those of ISO 8601 (date and time of day, 24:00 as the end of the day).
"""

import numpy as np
import pytest

from app.intake.dates import NO_SUCH_DAY, NO_SUCH_TIME, NOT_A_DATE, OK, read_text, read_times
from app.intake.model import TimeColumn, TimeLayout

GOOD = [
    ("2016-06-01 00:15:00", "instant", None, "2016-06-01T00:15:00"),
    ("2016-06-01T00:15:00Z", "instant", None, "2016-06-01T00:15:00"),
    ("2016-06-01T00:15", "instant", None, "2016-06-01T00:15:00"),
    ("2016-06-01 00:15:00.500", "instant", None, "2016-06-01T00:15:00"),
    ("2016-06-01 24:00", "instant", None, "2016-06-02T00:00:00"),
    ("2016-12-31 24:00", "instant", None, "2017-01-01T00:00:00"),
    ("2016/6/1 7:05", "instant", None, "2016-06-01T07:05:00"),
    ("1/6/2016 9:05", "instant", "dmy", "2016-06-01T09:05:00"),
    ("1/6/2016 9:05", "instant", "mdy", "2016-01-06T09:05:00"),
    ("1/6/16 9:05", "instant", "dmy", "2016-06-01T09:05:00"),
    ("16/6/1 9:05", "instant", "ymd", "2016-06-01T09:05:00"),
    ("01.06.2016 09:05", "instant", "dmy", "2016-06-01T09:05:00"),
    ("1-6-2016 09:05", "instant", "dmy", "2016-06-01T09:05:00"),
    ("6/1/2016 12:05 AM", "instant", "mdy", "2016-06-01T00:05:00"),
    ("6/1/2016 12:05 PM", "instant", "mdy", "2016-06-01T12:05:00"),
    ("6/1/2016 1:05:09 p.m.", "instant", "mdy", "2016-06-01T13:05:09"),
    ("20160601 0905", "instant", None, "2016-06-01T09:05:00"),
    ("201606010905", "instant", None, "2016-06-01T09:05:00"),
    ("20160601090507", "instant", None, "2016-06-01T09:05:07"),
    ("20160601T090507Z", "instant", None, "2016-06-01T09:05:07"),
    ("1 Jun 2016 09:05", "instant", None, "2016-06-01T09:05:00"),
    ("01-Jun-2016 09:05", "instant", None, "2016-06-01T09:05:00"),
    ("June 1, 2016 09:05", "instant", None, "2016-06-01T09:05:00"),
    ("1 ago 2016", "date", None, "2016-08-01T00:00:00"),
    ("2016-02-29", "date", None, "2016-02-29T00:00:00"),
    ("1/6/70", "date", "dmy", "1970-06-01T00:00:00"),
    ("14:30", "time", None, "1970-01-01T14:30:00"),
    ("2:30 PM", "time", None, "1970-01-01T14:30:00"),
    ("24:00", "time", None, "1970-01-02T00:00:00"),
]
BAD = [
    ("2015-02-29", "date", None, NO_SUCH_DAY),
    ("31/06/2016 02:15", "instant", "dmy", NO_SUCH_DAY),
    ("2016-13-01", "date", None, NO_SUCH_DAY),
    ("2016-00-10", "date", None, NO_SUCH_DAY),
    ("2016-06-01 24:01", "instant", None, NO_SUCH_TIME),
    ("2016-06-01 12:60", "instant", None, NO_SUCH_TIME),
    ("6/1/2016 13:05 PM", "instant", "mdy", NO_SUCH_TIME),
    ("1/6/2016", "date", None, NOT_A_DATE),
    ("", "instant", None, NOT_A_DATE),
    ("NAN", "instant", None, NOT_A_DATE),
    ("2016-06", "instant", None, NOT_A_DATE),
    ("12.5", "date", None, NOT_A_DATE),
    ("1 Foo 2016", "date", None, NOT_A_DATE),
    ("2016-06-01 00:15 and more", "instant", None, NOT_A_DATE),
    ("\xff\xfe", "instant", None, NOT_A_DATE),
]


@pytest.mark.parametrize(("text", "role", "order", "expected"), GOOD)
def test_good_dates(text: str, role: str, order: str | None, expected: str) -> None:
    seconds, _, why = read_text(np.array([text.encode()]), role, order)
    assert why[0] == OK
    assert str(np.datetime64(int(seconds[0]), "s")) == expected


@pytest.mark.parametrize(("text", "role", "order", "expected"), BAD)
def test_bad_dates(text: str, role: str, order: str | None, expected: int) -> None:
    values = np.array([text.encode("latin-1") or b" "], "S")
    assert read_text(values, role, order)[2][0] == expected


@pytest.mark.parametrize(
    ("text", "offset"),
    [("2016-06-01T00:15:00+02:00", 7200), ("2016-06-01 00:15:00-0730", -27000),
     ("2016-06-01T00:15Z", 0), ("2016-06-01 00:15 UTC", 0), ("2016-06-01 00:15+05", 18000)],
)  # fmt: skip
def test_stated_offsets(text: str, offset: int) -> None:
    seconds, stated, why = read_text(np.array([text.encode()]), "instant", None)
    assert why[0] == OK
    assert stated[0] == offset
    assert str(np.datetime64(int(seconds[0]), "s")) == "2016-06-01T00:15:00"


def test_every_day_of_two_centuries_in_every_order() -> None:
    days = np.arange("1900-01-01", "2199-12-31", dtype="datetime64[D]")
    iso = days.astype("S10")
    parts = np.array([text.split(b"-") for text in iso.tolist()])
    for order, places in (("ymd", (0, 1, 2)), ("dmy", (2, 1, 0)), ("mdy", (1, 2, 0))):
        texts = np.array([b"/".join(row[list(places)]) for row in parts], "S")
        seconds, _, why = read_text(texts, "date", order)
        assert not why.any()
        np.testing.assert_array_equal(seconds, days.astype(np.int64) * 86400)


def _numbers(*roles: str) -> TimeLayout:
    columns = [TimeColumn(position=i, role=role) for i, role in enumerate(roles)]  # type: ignore[arg-type]
    return TimeLayout(columns=columns)


@pytest.mark.parametrize(
    ("roles", "values", "expected"),
    [
        (("year", "day_of_year"), (2016, 366), "2016-12-31T00:00:00"),
        (("year", "day_of_year", "hhmm"), (2015, 132, 2400), "2015-05-13T00:00:00"),
        (("year", "day_of_year"), (2015, 132.5), "2015-05-12T12:00:00"),
        (("year", "month", "day", "hour"), (2016, 2, 29, 24), "2016-03-01T00:00:00"),
        (("year", "month", "day", "hour", "minute"), (16, 2, 29, 7, 45), "2016-02-29T07:45:00"),
        (("year", "month", "day", "hhmm"), (2016, 2, 29, 745), "2016-02-29T07:45:00"),
        # Day numbers of spreadsheets: 43831 is 1 January 2020 (common practice, no source).
        (("serial",), (43831,), "2020-01-01T00:00:00"),
        (("serial",), (43831.010416667,), "2020-01-01T00:15:00"),
        (("serial",), (43831.0104,), "2020-01-01T00:15:00"),
        # IEEE 1003.1: 1577836800 s since the Epoch is 2020-01-01T00:00:00Z.
        (("epoch",), (1577836800,), "2020-01-01T00:00:00"),
        (("epoch",), (1577836800500,), "2020-01-01T00:00:00"),
    ],
)
def test_dates_from_numbers(
    roles: tuple[str, ...], values: tuple[float, ...], expected: str
) -> None:
    columns = {i: np.array([float(value)]) for i, value in enumerate(values)}
    times = read_times(_numbers(*roles), columns, 1)
    assert times.why[0] == OK
    assert str(np.datetime64(int(times.local[0]), "s")) == expected


@pytest.mark.parametrize(
    ("roles", "values"),
    [
        (("year", "day_of_year"), (2015, 367)),
        (("year", "day_of_year"), (2015, 0)),
        (("year", "month", "day"), (2015, 2, 29)),
        (("year", "month", "day"), (2015, 2, 2.5)),
        (("year", "month", "day", "hour"), (2015, 2, 2, 25)),
        (("year", "day_of_year", "hhmm"), (2015, 2, 1275)),
        (("serial",), (np.nan,)),
        (("epoch",), (1e300,)),
    ],
)
def test_no_dates_from_numbers(roles: tuple[str, ...], values: tuple[float, ...]) -> None:
    columns = {i: np.array([float(value)]) for i, value in enumerate(values)}
    assert read_times(_numbers(*roles), columns, 1).why[0] != OK


def test_ten_thousand_shapes_of_garbage_are_refused() -> None:
    rng = np.random.default_rng(11)
    texts = np.array([bytes(rng.integers(33, 126, 12, np.uint8)) for _ in range(10_000)])
    assert np.count_nonzero(read_text(texts, "instant", "dmy")[2] == OK) == 0
