"""One reading followed from its CSV line to the page, by the list that DEVELOPERS.md gives.

The record is real: Baseline Surface Radiation Network, station Payerne, June 2016 (see
tests/data/radiation/README.md). Longwave down at 12:00 UTC on 10 June is the reading.
"""

import csv
import importlib
import io
import re
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Any

import httpx
import numpy as np
import pytest
from sqlalchemy import select

from app.book import Book
from app.intake import unpack
from app.main import create_app
from app.science.energy.humidity import atmospheric_pressure
from app.science.energy.reference_et import reference_et_daily
from app.settings import Settings
from app.storage.database import Database
from app.storage.tables import Advice, Contribution, Intake, LedgerDay, StationDay
from app.workflows import take_in
from app.workflows.load_book import load_book

CLONE = Path(__file__).parents[2]
RECORD = CLONE / "tests" / "data" / "radiation" / "payerne_2016-06_15min.csv"
DAY = date(2016, 6, 10)
TODAY = date(2016, 6, 20)
NOON = datetime(2016, 6, 10, 12, tzinfo=UTC)
BOOK: dict[str, Any] = {
    "stations": [
        {"key": "payerne", "name": "Payerne", "latitude_deg": 46.815, "longitude_deg": 6.944,
         "elevation_m": 491, "utc_offset_h": 0, "reference_surface": True}
    ],
    "soils": [{"key": "loam", "name": "Loam", "layers": [{"bottom_m": 1.5, "texture": "loam"}]}],
    "systems": [
        {"key": "pivot", "name": "Pivot", "kind": "centre pivot", "efficiency": 0.85,
         "rate_mm_h": 5, "least_mm": 8, "most_mm": 30}
    ],
    "farms": [{"key": "mill", "name": "Mill Farm"}],
    "fields": [
        {"key": "mill-piece", "name": "Mill Piece", "farm": "mill", "area_ha": 5,
         "station": "payerne", "soil": "loam", "system": "pivot"}
    ],
    "seasons": [{"field": "mill-piece", "crop": "maize_grain", "planting": "2016-06-02"}],
}  # fmt: skip


def steps() -> list[tuple[str, str]]:
    """File and function of each step in DEVELOPERS.md."""
    text = (CLONE / "DEVELOPERS.md").read_text(encoding="utf-8")
    table = text.split("## One value's journey")[1].split("\n## ")[0]
    return re.findall(r"^\| \d+ \| `([\w/.]+):(\w+)`", table, re.MULTILINE)


def test_every_step_of_the_list_is_a_function_that_is_there() -> None:
    found = steps()
    assert len(found) >= 12
    for file, function in found:
        module = importlib.import_module(file.removesuffix(".py").replace("/", "."))
        assert callable(getattr(module, function)), f"{file}:{function}"


@pytest.fixture
def walked(sqlite_url: str) -> Database:
    """The book and the record taken in."""
    db = Database(sqlite_url)
    db.migrate()
    with db.write() as session:
        load_book(session, Book.model_validate(BOOK), "admin")
    number = take_in.receive(db, "payerne", RECORD.name, io.BytesIO(RECORD.read_bytes()), "admin")
    seen = take_in.preview_of(db, number)
    assert not [q for q in seen.questions if q["blocking"]], seen.questions
    take_in.apply(db, number, "admin", TODAY)
    return db


def test_one_reading_reaches_the_page(walked: Database) -> None:
    lines = RECORD.read_text().splitlines()
    names = lines[0].split(",")
    place = next(n for n, line in enumerate(lines) if line.startswith("2016-06-10 12:00:00"))
    reading = float(lines[place].split(",")[names.index("lw_in")])

    with walked.read() as session:
        # stored under its day, with its instant, its line and its value [W m-2]
        blob, intake = session.execute(
            select(Contribution.data, Intake.file_name)
            .join(Intake, Intake.id == Contribution.intake_id)
            .where(Contribution.day == DAY)
        ).one()
        rows = unpack(blob)
        here = int(np.flatnonzero(rows.instant == int(NOON.timestamp()))[0])
        assert rows.values["longwave_down"][here] == reading
        assert rows.line[here] == place + 1
        assert intake == RECORD.name

        # the station day is the mean of its intervals [MJ m-2]: 0.0864 MJ m-2 d-1 a W m-2
        day = session.scalars(select(StationDay).where(StationDay.day == DAY)).one()
        of_day = [
            row
            for row in csv.DictReader(lines)
            if "2016-06-10 00:00:00" < row["end"] <= "2016-06-11 00:00:00"
        ]
        assert len(of_day) == 96
        mean = {
            name: 0.0864 * np.mean([max(0.0, float(row[name])) for row in of_day])
            for name in ("sw_in", "sw_out", "lw_in", "lw_out")
        }
        assert day.longwave_down == pytest.approx(mean["lw_in"], rel=1e-9)
        # rung 1, four components over grass: SWd - SWu + LWd - LWu
        assert day.rung == 1
        net = mean["sw_in"] - mean["sw_out"] + mean["lw_in"] - mean["lw_out"]
        assert day.rn == pytest.approx(net, rel=1e-9)
        # reference ET by the standardized equation; no wind there, 2 m/s assumed
        assert day.wind_rung == 3
        eto = reference_et_daily(
            day.tmax, day.tmin, day.vapour_pressure, day.rn, 2.0, atmospheric_pressure(491.0)
        )
        assert day.eto == pytest.approx(float(eto), rel=1e-9)

        ledger = session.scalars(
            select(LedgerDay).where(LedgerDay.day >= DAY).order_by(LedgerDay.day)
        ).all()
        assert ledger[0].eto_mm == day.eto
        assert ledger[0].rung == 1
        advice = session.scalars(select(Advice)).one()
        assert advice.depletion_mm == ledger[-1].depletion_mm
        shown = f"{advice.depletion_mm:.0f}"

    page = get(walked, "/")
    assert "Mill Piece" in page
    assert re.search(rf"<b>{shown}(</b>|\s| )", page)
    assert "four components" in page


def get(db: Database, path: str) -> str:
    """A page of the real application."""
    app = create_app(Settings(database=db.url, today=TODAY), db)

    async def fetch() -> str:
        transport = httpx.ASGITransport(app=app)
        async with httpx.AsyncClient(transport=transport, base_url="http://127.0.0.1") as client:
            answer = await client.get(path)
            assert answer.status_code == 200
            return answer.text

    import asyncio

    return asyncio.run(fetch())
