"""When letters are due by the clock of the farm, summer time and all."""

from datetime import UTC, date, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as some

from app.workflows.letter_weeks import due_at, first_day_of, monday, zone_of

WEEK = date(2026, 7, 13)
DENVER = ZoneInfo("America/Denver")


@pytest.mark.parametrize(
    ("weekday", "hour", "due", "first_day"),
    [
        (6, 18, "2026-07-12T18:00", date(2026, 7, 13)),  # Sunday evening, for the week to come
        (0, 5, "2026-07-13T05:00", date(2026, 7, 13)),
        (0, 18, "2026-07-13T18:00", date(2026, 7, 14)),
        (6, 6, "2026-07-19T06:00", date(2026, 7, 19)),
    ],
)
def test_days_and_hours(weekday: int, hour: int, due: str, first_day: date) -> None:
    at = due_at(WEEK, weekday, hour, DENVER)
    assert at == datetime.fromisoformat(due).replace(tzinfo=DENVER)
    assert first_day_of(WEEK, weekday, hour) == first_day


def test_the_hour_stays_when_the_clocks_change() -> None:
    winter = due_at(date(2026, 3, 2), 6, 18, DENVER)  # Sunday 1 March
    summer = due_at(date(2026, 3, 16), 6, 18, DENVER)  # Sunday 15 March; clocks changed on the 8th
    assert (winter.astimezone(DENVER).hour, summer.astimezone(DENVER).hour) == (18, 18)
    assert summer - winter == timedelta(days=14) - timedelta(hours=1)


@given(some.dates(date(2020, 1, 1), date(2040, 1, 1)), some.integers(0, 6), some.integers(0, 23))
def test_every_week_has_one_letter_whose_days_begin_in_it(
    day: date, weekday: int, hour: int
) -> None:
    week = monday(day)
    first = first_day_of(week, weekday, hour)
    assert week <= first < week + timedelta(days=7)
    due = due_at(week, weekday, hour, UTC)
    assert due.weekday() == weekday
    assert due.hour == hour
    assert 0 <= (first - due.date()).days <= 1
    assert due_at(week + timedelta(days=7), weekday, hour, UTC) - due == timedelta(days=7)


def test_a_farm_without_a_zone_keeps_the_offset_of_its_station() -> None:
    assert due_at(WEEK, 0, 5, zone_of({}, -7.0)) == datetime(2026, 7, 13, 12, tzinfo=UTC)
    assert zone_of({"time_zone": "America/Denver"}, -7.0) == DENVER
