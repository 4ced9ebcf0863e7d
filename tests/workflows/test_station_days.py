"""Station days lean on their own past and on neighbours, and are the same however they came."""

import io
from datetime import date
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import delete, select, update

from app.book import Book
from app.storage.database import Database
from app.storage.tables import Station, StationDay
from app.workflows import take_in
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.judge import mark_span
from app.workflows.load_book import load_book
from app.workflows.neighbourhood import kilometres
from tests.workflows import basin

RECORD = Path(__file__).parents[1] / "data" / "radiation" / "payerne_2016-06_15min.csv"
TODAY = date(2016, 7, 1)


def days_of(db: Database, key: str) -> dict[date, StationDay]:
    with db.read() as session:
        rows = session.scalars(
            select(StationDay)
            .join(Station, Station.id == StationDay.station_id)
            .where(Station.key == key)
        ).all()
        session.expunge_all()
    return {row.day: row for row in rows}


def rebuilt(db: Database, today: date) -> list[tuple[Any, ...]]:
    with db.write() as session:
        session.execute(delete(StationDay))
        session.execute(update(Station).values(dirty_from=date(1900, 1, 1)))
    bring_up_to_date(db, today)
    return basin.derived(db)


@pytest.fixture
def payerne(db: Database) -> Database:
    """A month of four components (BSRN, station Payerne, June 2016), and two stations beside it."""
    place = {"latitude_deg": 46.815, "longitude_deg": 6.944, "elevation_m": 491, "utc_offset_h": 0}
    book = Book.model_validate(
        {
            "stations": [
                {"key": "mast", "name": "Mast", **place, "reference_surface": True},
                {"key": "pupil", "name": "Pupil", **place, "teacher": "mast"},
                {"key": "far", "name": "Far", **place, "latitude_deg": 48.5},
            ]
        }
    )
    with db.write() as session:
        load_book(session, book, "admin")
    take(db, "mast", RECORD.read_text())
    return db


def take(db: Database, station: str, text: str) -> int:
    number = take_in.receive(
        db, station, "record.csv", io.BytesIO(text.encode()), "admin", today=TODAY
    )
    seen = take_in.preview_of(db, number)
    assert seen.message == ""
    assert not [q for q in seen.questions if q["blocking"]], seen.questions
    take_in.apply(db, number, "admin", TODAY)
    return number


def columns(*names: str) -> str:
    """The record with some of its columns only."""
    lines = [line.split(",") for line in RECORD.read_text().splitlines()]
    chosen = [lines[0].index(name) for name in ("end", *names)]
    return "\n".join(",".join(line[place] for place in chosen) for line in lines) + "\n"


def test_measured_days_teach_the_model_for_days_without_longwave(payerne: Database) -> None:
    """After 20 good days the taught model serves where longwave fails, and errs less."""
    before = days_of(payerne, "mast")
    marked = [date(2016, 6, day) for day in range(24, 30)]
    for quantity in ("longwave_down", "net_radiation"):
        mark_span(
            payerne, "mast", quantity, marked[0], marked[-1], "bad", "window scratched",
            "advisor", quantity, TODAY,
        )  # fmt: skip
    now = days_of(payerne, "mast")
    taught = [day for day in marked if now[day].rung == 4]
    assert len(taught) >= 3  # the others lie outside what was taught
    measured = {day: before[day].rn or 0.0 for day in taught}
    error = sum(abs((now[day].rn or 0.0) - measured[day]) for day in taught)
    untaught = sum(abs((now[day].rn_modelled or 0.0) - measured[day]) for day in taught)
    assert error < 0.6 * untaught
    assert all(now[day].rung == 1 for day in now if day < marked[0])
    state = basin.derived(payerne)
    assert rebuilt(payerne, TODAY) == state


def test_a_teacher_station_teaches_its_pupil(payerne: Database) -> None:
    take(payerne, "pupil", columns("sw_in", "t", "rh"))
    pupil, mast = days_of(payerne, "pupil"), days_of(payerne, "mast")
    taught = [day for day in pupil if pupil[day].rung == 4]
    assert len(taught) >= 5
    assert min(taught) > date(2016, 6, 20)
    error = sum(abs((pupil[day].rn or 0.0) - (mast[day].rn or 0.0)) for day in taught)
    untaught = sum(abs((pupil[day].rn_modelled or 0.0) - (mast[day].rn or 0.0)) for day in taught)
    assert error < 0.6 * untaught
    state = basin.derived(payerne)
    assert rebuilt(payerne, TODAY) == state


def test_a_neighbour_gives_its_clear_sky_ratio_and_only_when_near(payerne: Database) -> None:
    air = columns("t", "rh")
    take(payerne, "pupil", air)
    take(payerne, "far", air)
    pupil, far, mast = (days_of(payerne, key) for key in ("pupil", "far", "mast"))
    day = date(2016, 6, 12)
    assert {row.rung for row in pupil.values()} <= {4, 6}
    assert {row.rung for row in far.values()} == {8}  # 187 km off: temperatures alone
    assert pupil[day].rs == pytest.approx(mast[day].shortwave_down, rel=1e-9)


def test_what_a_neighbour_measures_later_reaches_those_that_lean_on_it(db: Database) -> None:
    basin.fill(db)
    mark_span(
        db, "meadow", "shortwave_down", date(2026, 6, 10), date(2026, 6, 12), "bad", "cow",
        "advisor", "f1", basin.TODAY,
    )  # fmt: skip
    leaning = days_of(db, "meadow")[date(2026, 6, 11)]
    assert leaning.rung == 6
    basin.take(
        db, "bench", basin.daily_csv(date(2026, 6, 11), date(2026, 6, 11)).replace(b",2", b",1")
    )
    moved = days_of(db, "meadow")[date(2026, 6, 11)]
    assert moved.rung == 6
    assert moved.rs != leaning.rs
    assert days_of(db, "meadow")[date(2026, 6, 20)].rung == 5
    state = basin.derived(db)
    assert rebuilt(db, basin.TODAY) == state


def test_a_gap_before_late_readings_has_its_rows_as_after_a_rebuild(db: Database) -> None:
    basin.fill(db, date(2026, 6, 10))
    for station in ("bench", "meadow"):
        basin.take(db, station, basin.daily_csv(date(2026, 6, 25), date(2026, 6, 30)))
    gap = days_of(db, "bench")[date(2026, 6, 15)]
    assert gap.eto is None
    state = basin.derived(db)
    assert rebuilt(db, basin.TODAY) == state


def test_distances_on_the_globe() -> None:
    """A degree of latitude is 111.2 km on a sphere of 6,371 km (definition)."""
    here = {"latitude_deg": 46.0, "longitude_deg": 7.0}
    assert kilometres(here, {"latitude_deg": 47.0, "longitude_deg": 7.0}) == pytest.approx(
        111.19, abs=0.01
    )
    assert kilometres(here, here) == 0.0


def test_a_neighbour_that_saw_an_open_sky_tells_a_covered_window(payerne: Database) -> None:
    """A window like a black body from two to five, and no sun measured here to prove the sky open:
    undecidable, until a neighbour's clear day comes in."""
    take(payerne, "pupil", columns("sw_in", "t", "rh"))
    pupil = days_of(payerne, "pupil")
    day = max(pupil, key=lambda d: (pupil[d].rs or 0.0) / (pupil[d].rso or 1.0))
    assert (pupil[day].rs or 0.0) / (pupil[day].rso or 1.0) > 0.85
    lines = [line.split(",") for line in RECORD.read_text().splitlines()]
    at = {name: place for place, name in enumerate(lines[0])}
    frosted = []
    for cells in lines[1:]:
        if cells[0].startswith(str(day)):
            cells = list(cells)
            for name in ("sw_in", "sw_out"):
                cells[at[name]] = ""
            if "02:00" < cells[0][11:16] <= "05:00":
                black = 5.67e-8 * (float(cells[at["t"]]) + 273.15) ** 4
                cells[at["lw_in"]] = f"{black - 2.0:.2f}"
        frosted.append(",".join(cells))
    mark_span(
        payerne, "mast", "shortwave_down", day, day, "bad", "shaded by a ladder", "advisor", "m1",
        TODAY,
    )  # fmt: skip
    take(payerne, "mast", "\n".join([",".join(lines[0]), *frosted]) + "\n")
    assert "window_hours" in days_of(payerne, "mast")[day].flags
    mark_span(payerne, "pupil", "shortwave_down", day, day, "bad", "a bird", "advisor", "m2", TODAY)
    assert "window_undecidable" in days_of(payerne, "mast")[day].flags
    state = basin.derived(payerne)
    assert rebuilt(payerne, TODAY) == state
