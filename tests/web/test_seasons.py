"""A season planted and changed on the page: the ledger follows, a replanted stand is a new one."""

from datetime import date
from typing import Any

import pytest
from sqlalchemy import select

from app.storage.database import Database
from app.storage.tables import BookChange, LedgerDay, Season
from tests.web.conftest import Browser
from tests.workflows import basin

PATH = "/fields/long-piece/seasons"


@pytest.fixture
def browse(tmp_path: Any) -> Browser:
    db = Database(f"sqlite:///{tmp_path / 'basin.sqlite'}")
    db.migrate()
    basin.fill(db)
    return Browser(db, today=basin.TODAY)


def seasons(browse: Browser) -> list[Season]:
    with browse.db.read() as session:
        rows = list(
            session.scalars(
                select(Season).where(Season.block_id == 1).order_by(Season.planting)
            ).all()
        )
        session.expunge_all()
    return rows


def put(browse: Browser, **form: str) -> Any:
    return browse.request("POST", PATH, data={"coefficients": "dual"} | form)


def test_hail_and_a_new_stand_of_the_same_crop(browse: Browser) -> None:
    page = browse.get(f"{PATH}?planting=2026-04-20").text
    assert 'value="2026-04-20"' in page
    assert page.count("<option") > 119
    answer = put(browse, crop="maize_grain", planting="2026-05-10", note="hail on 8 May")
    assert answer.status_code == 303, answer.text
    first, second = seasons(browse)
    assert (first.planting, second.planting) == (date(2026, 4, 20), date(2026, 5, 10))
    with browse.db.read() as session:
        by_season = {
            day: number
            for day, number in session.execute(
                select(LedgerDay.day, LedgerDay.season_id).where(LedgerDay.block_id == 1)
            )
        }
    assert by_season[date(2026, 5, 9)] == first.id
    assert by_season[date(2026, 5, 10)] == second.id
    assert max(by_season) == date(2026, 6, 30)


def test_a_change_keeps_what_the_form_does_not_show(browse: Browser) -> None:
    before = seasons(browse)[0]
    answer = put(
        browse, was="2026-04-20", crop="maize_sweet", planting="2026-04-22", mad="45 %",
        mad_by_stage="30 - 50; 70", stage_days="20 30 40 20", end="2026-08-30",
        initial_depletion_fraction="12,5",
    )  # fmt: skip
    assert answer.status_code == 303, answer.text
    (row,) = seasons(browse)
    assert row.id == before.id
    assert (row.crop, row.planting) == ("maize_sweet", date(2026, 4, 22))
    assert row.details["mad"] == pytest.approx(0.45)
    assert row.details["mad_by_stage"] == [0.3, None, 0.5, 0.7]
    assert row.details["initial_depletion_fraction"] == pytest.approx(0.125)
    assert row.details["climate_adjustment"] == before.details["climate_adjustment"]
    page = browse.get(f"{PATH}?planting=2026-04-22").text
    assert 'value="30 - 50 70"' in page
    assert 'value="12.5"' in page
    with browse.db.read() as session:
        change = session.scalars(select(BookChange).order_by(BookChange.id.desc())).first()
        assert change is not None
        assert (change.kind, change.before["crop"]) == ("season", "maize_grain")


@pytest.mark.parametrize(
    ("form", "says"),
    [
        ({"crop": "maze", "planting": "2026-05-10"}, "no crop"),
        ({"crop": "", "planting": "2026-05-10"}, "no crop"),
        ({"crop": "potato", "planting": ""}, "no date"),
        ({"crop": "potato", "planting": "2026-05-10", "end": "2026-05-01"}, "is not after"),
        ({"crop": "potato", "planting": "2026-05-10", "stage_days": "10 20"}, "has 2 figures"),
        ({"crop": "potato", "planting": "2026-05-10", "mad": "x"}, "is no number"),
        ({"crop": "potato", "planting": "2026-05-10", "mad": "450"}, "mad"),
        ({"crop": "potato", "planting": "2026-04-20", "was": "2020-01-01"}, "othing was planted"),
        ({"crop": "potato", "planting": "2026-05-10", "block": "nope"}, "no such block"),
    ],
)
def test_what_cannot_grow_is_refused_and_stays_in_the_form(
    browse: Browser, form: dict[str, str], says: str
) -> None:
    answer = put(browse, **form)
    assert answer.status_code in (404, 422)
    assert says in answer.text
    assert len(seasons(browse)) == 1
