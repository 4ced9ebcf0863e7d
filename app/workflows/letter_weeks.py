"""When a recipient's letter of a week is due, and for which days it is."""

from datetime import UTC, date, datetime, time, timedelta, timezone, tzinfo
from typing import Any
from zoneinfo import ZoneInfo

NOON = 12
"""A letter before this hour speaks of its own day on, a later one of the next day on."""


def monday(day: date) -> date:
    """The Monday of a day's week."""
    return day - timedelta(days=day.weekday())


def zone_of(farm: dict[str, Any], offset_h: float) -> tzinfo:
    """A farm's time zone: its own, else the fixed offset [h] of its station."""
    name = farm.get("time_zone")
    return ZoneInfo(name) if name else timezone(timedelta(hours=offset_h))


def first_day_of(week: date, weekday: int, hour: int) -> date:
    """The first day the letter of a week (by its Monday) advises on."""
    return week + timedelta(days=weekday if hour < NOON else (weekday + 1) % 7)


def due_at(week: date, weekday: int, hour: int, zone: tzinfo) -> datetime:
    """When the letter of a week is due, UTC. One after noon on Sunday is for the week to come."""
    first = first_day_of(week, weekday, hour)
    day = first if hour < NOON else first - timedelta(days=1)
    return datetime.combine(day, time(hour), zone).astimezone(UTC)
