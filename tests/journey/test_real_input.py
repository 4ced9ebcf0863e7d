"""The whole main job, from a station's CSV to the morning's advice, on real public records."""

import csv
import io
from datetime import date, timedelta
from importlib.resources import files
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from sqlalchemy import select

from app.book import Book
from app.intake import answer
from app.storage.database import Database
from app.storage.tables import Advice, LedgerDay, Station, StationDay
from app.workflows import take_in
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book

YEAR = 2025
WIND = {"columns.4.unit": "m/s"}
"""The unit of wind in that record: its header says none, and the values fit several."""


def book(station: dict[str, Any], planting: date, crop: str = "maize_grain") -> Book:
    """One field of silt loam under a pivot, with one season of a crop."""
    return Book.model_validate(
        {
            "stations": [station],
            "soils": [
                {"key": "silt-loam", "name": "Silt loam",
                 "layers": [{"bottom_m": 1.5, "texture": "silt_loam"}]}
            ],
            "systems": [
                {"key": "pivot", "name": "Pivot", "kind": "centre pivot", "efficiency": 0.85,
                 "rate_mm_h": 5, "least_mm": 8, "most_mm": 30}
            ],
            "farms": [{"key": "hollow", "name": "Hollow Farm"}],
            "fields": [
                {"key": "long-piece", "name": "Long Piece", "farm": "hollow", "area_ha": 12.5,
                 "station": station["key"], "soil": "silt-loam", "system": "pivot"}
            ],
            "seasons": [{"field": "long-piece", "crop": crop, "planting": planting}],
        }
    )  # fmt: skip


def take(
    db: Database,
    station: str,
    name: str,
    data: bytes,
    today: date,
    answers: dict[str, str] | None = None,
) -> take_in.Applied:
    """Take a file in as the Intake page does."""
    number = take_in.receive(db, station, name, io.BytesIO(data), "admin")
    preview = take_in.preview_of(db, number)
    assert preview.message == ""
    if answers:
        assert preview.mapping is not None
        take_in.remap(db, number, answer(preview.mapping, answers), "admin")
        preview = take_in.preview_of(db, number)
    assert not [q for q in preview.questions if q["blocking"]], preview.questions
    return take_in.apply(db, number, "admin", today)


def typical_year_as_logger_csv() -> bytes:
    """The hourly typical year 723170 (NREL TMY3 user's manual, data set of the pvlib wheel) as a
    logger would write it: semicolons, decimal commas, day first, 24:00 at the day's end."""
    path = Path(str(files("pvlib"))) / "data" / "723170TYA.CSV"
    out = io.StringIO()
    out.write("Logger 14;program 3\nDate;Time;Global (W/m2);Air temp (°C);RH (%);Wind (m/s);")
    out.write("Pressure (hPa);Rain (mm)\n")
    with path.open(newline="") as source:
        next(source)
        for row in csv.DictReader(source):
            month, day, _ = row["Date (MM/DD/YYYY)"].split("/")
            # tenths of a millimetre whatever the header says: the year adds up to 8345
            rain = 0.1 * max(0.0, float(row["Lprecip depth (mm)"]))
            cells = [
                f"{day}.{month}.{YEAR}",
                row["Time (HH:MM)"],
                row["GHI (W/m^2)"],
                row["Dry-bulb (C)"],
                row["RHum (%)"],
                row["Wspd (m/s)"],
                row["Pressure (mbar)"],
                f"{rain:.1f}",
            ]
            out.write(
                ";".join(cell.replace(".", ",") if i else cell for i, cell in enumerate(cells))
            )
            out.write("\n")
    return out.getvalue().encode("latin-1")


def test_an_hourly_typical_year_becomes_advice_for_maize(db: Database) -> None:
    today = date(YEAR, 7, 21)
    station = {
        "key": "airfield", "name": "Airfield", "latitude_deg": 36.1, "longitude_deg": -79.95,
        "elevation_m": 273, "utc_offset_h": -5, "wind_height_m": 10,
    }  # fmt: skip
    with db.write() as session:
        load_book(session, book(station, date(YEAR, 4, 20)), "admin")
    applied = take(db, "airfield", "airfield.csv", typical_year_as_logger_csv(), today)
    assert applied.rows == 8760
    assert applied.days_changed == 365

    with db.read() as session:
        days = session.execute(
            select(StationDay.day, StationDay.rung, StationDay.eto, StationDay.rs).order_by(
                StationDay.day
            )
        ).all()
        july = [row for row in days if row.day.month == 7]
        # shortwave, temperature and humidity are measured, longwave is not: model from solar
        assert {row.rung for row in july} == {5}
        # FAO-56 Table 2: humid and subhumid, mean daily temperature above 20 degC: 5-7 mm a day
        # in the warm season, moderate to warm; a July mean within 4 to 7 is believed.
        assert 4.0 < np.mean([row.eto for row in july]) < 7.0
        # energy conservation: a year's shortwave is the sum of its hours
        ledger = session.scalars(
            select(LedgerDay).where(LedgerDay.day < today).order_by(LedgerDay.day)
        ).all()
        assert [row.day for row in ledger] == [
            date(YEAR, 4, 20) + timedelta(days=n) for n in range((today - date(YEAR, 4, 20)).days)
        ]
        by_day = {row.day: row.eto for row in days}
        assert all(row.eto_mm == by_day[row.day] for row in ledger)
        advice = session.scalars(select(Advice)).one()
    # the advice follows from its own outlook: watered at the latest on the day the limit is passed
    ahead = advice.outlook
    passed = [
        day
        for day, depletion, limit in zip(
            ahead["date"], ahead["depletion"], ahead["limit"], strict=True
        )
        if depletion > limit
    ]
    assert str(advice.limit_day) == passed[0]
    assert advice.day is not None
    assert today <= advice.day <= advice.limit_day
    assert advice.issued_on == today
    assert not advice.unsure.startswith("stale")
    assert advice.net_mm == pytest.approx(advice.gross_mm * 0.85)
    assert advice.hours == pytest.approx(advice.gross_mm / 5)
    assert advice.volume_m3 == pytest.approx(advice.gross_mm * 12.5 * 10)


def test_shortwave_of_the_typical_year_keeps_its_energy(db: Database) -> None:
    """Intake and aggregation neither lose nor make energy: the year's sum equals the record's."""
    station = {
        "key": "airfield", "name": "Airfield", "latitude_deg": 36.1, "longitude_deg": -79.95,
        "elevation_m": 273, "utc_offset_h": -5, "wind_height_m": 10,
    }  # fmt: skip
    with db.write() as session:
        load_book(session, Book.model_validate({"stations": [station]}), "admin")
    take(db, "airfield", "airfield.csv", typical_year_as_logger_csv(), date(YEAR, 7, 21))
    path = Path(str(files("pvlib"))) / "data" / "723170TYA.CSV"
    with path.open(newline="") as source:
        next(source)
        total = sum(float(row["GHI (W/m^2)"]) for row in csv.DictReader(source)) * 0.0036
    with db.read() as session:
        stored = session.scalars(select(StationDay.shortwave_down)).all()
    assert len(stored) == 365
    assert sum(value for value in stored if value is not None) == pytest.approx(total, rel=1e-6)


def test_a_daily_record_without_radiation_falls_to_the_temperature_range(db: Database) -> None:
    """NOAA daily summaries 2012-2015 as carried in vega_datasets: temperatures, wind and rain."""
    data = (Path(str(files("vega_datasets"))) / "_data" / "seattle-weather.csv").read_bytes()
    today = date(2015, 8, 1)
    station = {
        "key": "shore", "name": "Shore", "latitude_deg": 47.45, "longitude_deg": -122.31,
        "elevation_m": 130, "utc_offset_h": -8, "wind_height_m": 10, "coastal": True,
    }  # fmt: skip
    with db.write() as session:
        load_book(session, book(station, date(2015, 5, 1), "potato"), "admin")
    applied = take(db, "shore", "seattle-weather.csv", data, today, WIND)
    assert applied.rows == 1461
    with db.read() as session:
        assert set(session.scalars(select(StationDay.rung))) == {8}
        rain = {day: mm for day, mm in session.execute(select(StationDay.day, StationDay.rain))}
        assert rain[date(2012, 1, 2)] == pytest.approx(10.9)
        wind = {d: v for d, v in session.execute(select(StationDay.day, StationDay.wind_2m))}
        # FAO-56 Example 14: the factor from 10 m to 2 m is 0.748
        assert wind[date(2012, 1, 2)] == pytest.approx(4.5 * 0.748, abs=0.005)
        advice = session.scalars(select(Advice)).one()
        assert advice.rung == 8
    # a dry west-coast July without irrigation leaves potatoes past their limit
    assert advice.standing == "late"


def test_the_same_file_again_changes_nothing_and_undo_restores(db: Database) -> None:
    today = date(2015, 8, 1)
    data = (Path(str(files("vega_datasets"))) / "_data" / "seattle-weather.csv").read_bytes()
    half = data[: data.index(b"2014/07/02")]
    station = {
        "key": "shore", "name": "Shore", "latitude_deg": 47.45, "longitude_deg": -122.31,
        "elevation_m": 130, "utc_offset_h": -8, "wind_height_m": 10,
    }  # fmt: skip
    with db.write() as session:
        load_book(session, book(station, date(2014, 5, 1), "potato"), "admin")
    take(db, "shore", "half.csv", half, today, WIND)
    before = everything(db)
    number = take_in.receive(db, "shore", "whole.csv", io.BytesIO(data), "admin")
    whole = take_in.apply(db, number, "admin", today)
    assert whole.days_changed == 548  # 2014-07-02 to 2015-12-31
    after = everything(db)
    assert after != before
    assert take(db, "shore", "whole-again.csv", data, today).already_here
    assert everything(db) == after
    take_in.undo(db, number, "admin", today)
    assert everything(db) == before


def everything(db: Database) -> list[tuple[Any, ...]]:
    """Every derived row, exactly."""
    bring_up_to_date(db, date(2015, 8, 1))
    with db.read() as session:
        days = session.execute(
            select(*StationDay.__table__.columns).order_by(StationDay.station_id, StationDay.day)
        )
        ledger = session.execute(
            select(*LedgerDay.__table__.columns).order_by(LedgerDay.block_id, LedgerDay.day)
        )
        stations = session.execute(select(Station.key, Station.dirty_from))
        return [tuple(row) for rows in (days, ledger, stations) for row in rows]
