"""The energy balance over a crop, on the pages of its station and field and through the API.

Record: BSRN station Payerne, June 2016; soil, sensible and latent heat are set by the test.
"""

import re
from datetime import date

import pytest

from app.book import Book
from app.storage.database import Database
from app.workflows.load_book import load_book
from tests.web.conftest import Browser
from tests.workflows import basin
from tests.workflows.test_hourly_step import PLACE
from tests.workflows.test_station_days import RECORD, TODAY, take

LATENT_HEAT = 1 / 0.408  # MJ/kg, FAO-56 eq 20
FIELD = {
    "key": "long-piece", "name": "Long Piece", "farm": "reed", "area_ha": 10, "station": "mast",
    "soil": "loam", "system": "pivot",
}  # fmt: skip


@pytest.fixture
def over_grass(empty_db: Database) -> Browser:
    book = {
        **{name: basin.BOOK[name] for name in ("soils", "systems", "farms")},
        "stations": [PLACE | {"key": "mast", "stands_in": "long-piece"}],
        "fields": [FIELD],
        "seasons": [{"field": "long-piece", "crop": "maize_grain", "planting": "2016-06-01"}],
    }
    with empty_db.write() as session:
        load_book(session, Book.model_validate(book), "admin")
    lines = RECORD.read_text().splitlines()
    rows = [lines[0] + ",soil heat flux (W/m2),H (W/m2),LE (W/m2)"]
    rows += [line + ",10,20,60" for line in lines[1:]]
    take(empty_db, "mast", "\n".join(rows) + "\n")
    return Browser(empty_db, today=TODAY)


def test_station_and_field_show_what_is_left_beside_what_the_ledger_has(
    over_grass: Browser,
) -> None:
    days = over_grass.get("/api/v1/stations/mast/days?first=2016-06-01").json()["days"]
    whole = [day for day in days if day["net_radiation"] is not None]
    fixed = (10 + 20) * 0.0864
    expected = sum((day["net_radiation"] - fixed) / LATENT_HEAT for day in whole)
    closure = sum((60 + 20) * 0.0864 for _ in whole) / sum(
        day["net_radiation"] - 10 * 0.0864 for day in whole
    )
    text = over_grass.get("/stations/mast").text
    assert f"<b>{expected:.1f} mm</b> of crop ET on {len(whole)} days" in text
    assert f"{100 * closure:.0f}" in re.sub(r"\s", " ", text)
    field = over_grass.get("/fields/long-piece").text
    assert "The energy balance over this crop leaves" in field
    assert f"on {len(whole)} days since planting; the ledger has" in field
    assert days[0]["et_by_residual"] == pytest.approx(
        (days[0]["net_radiation"] - fixed) / LATENT_HEAT
    )
    day = over_grass.get(f"/stations/mast/days/{date(2016, 6, 12)}").text
    assert "crop ET as what is left" in day


def test_a_station_elsewhere_says_nothing_of_the_crop(over_grass: Browser) -> None:
    with over_grass.db.write() as session:
        part = {"stations": [PLACE | {"key": "mast"}]}
        load_book(session, Book.model_validate(part), "admin")
    assert "The energy balance over this crop" not in over_grass.get("/fields/long-piece").text
