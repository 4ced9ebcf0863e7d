"""A small invented basin for the workflow tests: two stations, two fields, a daily record."""

import io
import math
from datetime import date, timedelta
from typing import Any

from sqlalchemy import select

from app.book import Book
from app.storage.database import Database
from app.storage.tables import Advice, LedgerDay, StationDay
from app.workflows import take_in
from app.workflows.load_book import load_book

TODAY = date(2026, 7, 1)
FIRST = date(2026, 3, 1)

BOOK: dict[str, Any] = {
    "stations": [
        {
            "key": key,
            "name": key.title(),
            "latitude_deg": 44.2,
            "longitude_deg": -117.5,
            "elevation_m": 700,
            "utc_offset_h": -7,
        }
        for key in ("bench", "meadow")
    ],
    "soils": [
        {"key": "loam", "name": "Loam", "layers": [{"bottom_m": 1.5, "texture": "loam"}]},
        {
            "key": "lab",
            "name": "Sampled",
            "layers": [{"bottom_m": 2.0, "field_capacity": 0.3, "wilting_point": 0.14}],
            "rew_mm": 9,
        },
    ],
    "systems": [
        {
            "key": "pivot",
            "name": "Pivot",
            "kind": "centre pivot",
            "efficiency": 0.8,
            "rate_mm_h": 6,
            "least_mm": 6,
            "most_mm": 40,
        }
    ],
    "farms": [{"key": "reed", "name": "Reed Farm", "grower": "A. Reed"}],
    "fields": [
        {
            "key": "long-piece",
            "name": "Long Piece",
            "farm": "reed",
            "area_ha": 10,
            "station": "bench",
            "soil": "loam",
            "system": "pivot",
        },
        {
            "key": "two-halves",
            "name": "Two Halves",
            "farm": "reed",
            "area_ha": 20,
            "station": "bench",
            "soil": "loam",
            "system": "pivot",
            "sources": [{"variable": "rain", "station": "meadow"}],
            "blocks": [
                {"key": "upper", "name": "Upper", "area_ha": 5},
                {"key": "lower", "name": "Lower", "area_ha": 15, "soil": "lab"},
            ],
        },
    ],
    "seasons": [
        {"field": "long-piece", "crop": "maize_grain", "planting": "2026-04-20"},
        {"field": "two-halves", "crop": "potato", "planting": "2026-04-25"},
    ],
    "irrigations": [
        {"field": "long-piece", "day": "2026-06-05", "gross_mm": 25},
        {"field": "two-halves", "day": "2026-06-06", "volume_m3": 6000},
    ],
    "rain": [{"field": "two-halves", "day": "2026-06-10", "rain_mm": 7}],
}


def daily_csv(
    first: date = FIRST, last: date = TODAY - timedelta(days=1), warmer: float = 0
) -> bytes:
    """A believable daily record, a pure function of the date."""
    lines = ["date,tmax (degC),tmin (degC),rhmax (%),rhmin (%),wind (m/s),solar (MJ/m2),rain (mm)"]
    for step in range((last - first).days + 1):
        day = first + timedelta(days=step)
        n = (day - FIRST).days
        wave = math.sin(2 * math.pi * (day.timetuple().tm_yday - 105) / 365)
        wobble = math.sin(n * 1.7) + 0.5 * math.sin(n * 0.6)
        rain = 6.5 if n % 11 == 3 else 0.0
        lines.append(
            f"{day},{18 + 12 * wave + 2 * wobble + warmer:.1f},{4 + 8 * wave + wobble:.1f},"
            f"{82 - 3 * wobble:.0f},{34 - 4 * wobble:.0f},{2.1 + 0.3 * wobble:.1f},"
            f"{19 + 8 * wave + 1.2 * wobble:.2f},{rain}"
        )
    return ("\n".join(lines) + "\n").encode()


def fill(db: Database, today: date = TODAY) -> None:
    """Load the book and both stations' records."""
    with db.write() as session:
        load_book(session, Book.model_validate(BOOK), "admin")
    for station in ("bench", "meadow"):
        take(db, station, daily_csv(last=today - timedelta(days=1)), today)


def take(
    db: Database, station: str, data: bytes, today: date = TODAY
) -> tuple[int, take_in.Applied]:
    """Take a file in; its number and what it did."""
    number = take_in.receive(db, station, "daily.csv", io.BytesIO(data), "admin", today=today)
    preview = take_in.preview_of(db, number)
    assert preview.message == ""
    assert not [q for q in preview.questions if q["blocking"]], preview.questions
    return number, take_in.apply(db, number, "admin", today)


def derived(db: Database) -> list[tuple[Any, ...]]:
    """Every derived row, exactly."""
    with db.read() as session:
        days = session.execute(
            select(*StationDay.__table__.columns).order_by(StationDay.station_id, StationDay.day)
        ).all()
        ledger = session.execute(
            select(*LedgerDay.__table__.columns).order_by(LedgerDay.block_id, LedgerDay.day)
        ).all()
    return [tuple(row) for row in (*days, *ledger)]


def standing_advice(db: Database, on: date = TODAY) -> dict[int, Advice]:
    """The advice that stands for a morning, by block."""
    with db.read() as session:
        rows = session.scalars(
            select(Advice).where(Advice.issued_on == on, Advice.stands.is_(True))
        ).all()
        session.expunge_all()
    return {row.block_id: row for row in rows}
