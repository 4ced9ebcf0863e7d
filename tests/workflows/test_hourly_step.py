"""Reference ET by the hour, a net sensor's certificate, and heat fluxes, from file to station day.

Record: BSRN station Payerne, June 2016, four components, temperature and humidity by 15 minutes.
"""

from datetime import date, timedelta
from typing import Any

import numpy as np
import pytest

from app.book import Book
from app.science.energy.net_sensor import WindFactor
from app.storage.database import Database
from app.workflows.load_book import load_book
from tests.workflows import basin
from tests.workflows.test_station_days import RECORD, TODAY, columns, days_of, rebuilt, take

PLACE: dict[str, Any] = {
    "name": "Mast", "latitude_deg": 46.815, "longitude_deg": 6.944, "elevation_m": 491,
    "utc_offset_h": 0,
}  # fmt: skip


def stations(db: Database, *parts: dict[str, Any]) -> None:
    with db.write() as session:
        load_book(session, Book.model_validate({"stations": [PLACE | p for p in parts]}), "admin")


def test_et_by_the_hour_sums_to_about_the_days_and_serves_in_its_place(db: Database) -> None:
    """ASCE-EWRI (2005), comparison of sums of hours with daily values: within a few per cent over a
    season. An incomplete day takes the day's own value times the usual ratio, flagged."""
    stations(db, {"key": "mast", "reference_surface": True, "et_step": "hourly"})
    text = RECORD.read_text()
    whole = take(db, "mast", text)
    days = days_of(db, "mast")
    sums = [row for row in days.values() if row.eto_hours is not None]
    assert len(sums) >= 28
    ratio = sum(row.eto_hours or 0 for row in sums) / sum(row.eto_daily or 0 for row in sums)
    assert 0.92 < ratio < 1.06
    assert all(row.eto == row.eto_hours and row.etr == row.etr_hours for row in sums)
    assert all((row.etr or 0) > (row.eto or 0) for row in sums if (row.eto or 0) > 2)
    assert whole
    state = basin.derived(db)
    assert rebuilt(db, TODAY) == state


def test_a_day_without_all_its_hours_takes_the_usual_ratio(db: Database) -> None:
    stations(db, {"key": "mast", "reference_surface": True, "et_step": "hourly"})
    # three hours of wind-less humidity at night are missing: the day stands, its hours do not
    lines = RECORD.read_text().splitlines()
    head = lines[0].split(",")
    place = head.index("rh")
    gap = []
    for line in lines:
        cells = line.split(",")
        if "2016-06-20 01:00" <= cells[0] < "2016-06-20 03:16":
            cells[place] = ""
        gap.append(",".join(cells))
    assert gap != lines
    take(db, "mast", "\n".join(gap) + "\n")
    days = days_of(db, "mast")
    odd = days[date(2016, 6, 20)]
    assert odd.eto_hours is None
    before = [days[date(2016, 6, 1) + timedelta(days=n)] for n in range(19)]
    usual = np.median([row.eto_hours / row.eto_daily for row in before if row.eto_hours])
    assert odd.eto == pytest.approx((odd.eto_daily or 0) * usual)
    assert f"hourly_incomplete={usual:.3g}" in odd.flags
    early = days[date(2016, 6, 1)]
    assert early.eto_hours is not None or "hourly_without_ratio" in early.flags
    state = basin.derived(db)
    assert rebuilt(db, TODAY) == state


def test_a_net_sensor_is_corrected_for_wind_by_its_certificate(db: Database) -> None:
    """Without an anemometer 2 m/s is assumed: factor 1 + k a u / (k + a u)."""
    certificate = {"positive": {"form": "saturating", "k": 0.07, "a": 0.012}}
    stations(
        db,
        {"key": "plain", "reference_surface": True},
        {"key": "sure", "reference_surface": True, "net_wind": certificate},
    )
    text = columns("rn4", "t", "rh")
    text = text.replace("rn4", "net radiation (W/m2)", 1)
    for key in ("plain", "sure"):
        take(db, key, text)
    plain, sure = days_of(db, "plain"), days_of(db, "sure")
    day = date(2016, 6, 12)
    assert (plain[day].rung, sure[day].rung) == (3, 3)
    factor = float(WindFactor("saturating", 0.07, 0.012).at(2.0))
    assert 1.0 < (sure[day].net_radiation or 0) / (plain[day].net_radiation or 1) < factor * 1.05
    assert sure[day].rn == sure[day].net_radiation


def test_heat_fluxes_are_kept_by_the_day(db: Database) -> None:
    stations(db, {"key": "mast"})
    lines = RECORD.read_text().splitlines()
    rows = [lines[0] + ",soil heat flux (W/m2),H (W/m2),LE (W/m2)"]
    rows += [line + ",30,50,120" for line in lines[1:]]
    take(db, "mast", "\n".join(rows) + "\n")
    row = days_of(db, "mast")[date(2016, 6, 12)]
    assert row.soil_heat_flux == pytest.approx(2.592)
    assert row.sensible_heat == pytest.approx(4.32)
    assert row.latent_heat == pytest.approx(10.368)
    parts = (row.shortwave_down, row.shortwave_up, row.longwave_down, row.longwave_up)
    down, up, sky, ground = (part or 0.0 for part in parts)
    assert row.net_radiation == pytest.approx(down - up + sky - ground)
