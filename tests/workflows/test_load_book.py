"""A book loads whole or not at all; twice changes nothing; a change changes what differs."""

import copy
import json
from datetime import date
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import func, select

from app import handbook
from app.book import Book, BookError, read_book
from app.book.season import SeasonPart
from app.storage.database import Database
from app.storage.tables import Block, BookChange, Event, LedgerDay, Season, Source
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.crop import crop_season
from app.workflows.load_book import load_book
from app.workflows.log_event import void_event
from tests.workflows import basin


def load(db: Database, raw: dict[str, Any]) -> Any:
    with db.write() as session:
        return load_book(session, Book.model_validate(raw), "admin")


def test_loading_twice_changes_nothing(db: Database) -> None:
    first = load(db, basin.BOOK)
    assert first.added["fields"] == 2
    assert first.added["events"] == 5  # the second field has two blocks
    again = load(db, basin.BOOK)
    assert again.added == {}
    assert again.changed == {}
    with db.read() as session:
        assert session.scalar(select(func.count()).select_from(Block)) == 3
        assert session.scalar(select(func.count()).select_from(Season)) == 3
        assert session.scalar(select(func.count()).select_from(Source)) == 8


def test_a_change_is_kept_with_before_and_after(db: Database) -> None:
    basin.fill(db)
    raw = copy.deepcopy(basin.BOOK)
    raw["systems"][0]["efficiency"] = 0.7
    changed = load(db, raw)
    assert changed.changed == {"irrigation_system": 1}
    with db.read() as session:
        note = session.scalars(select(BookChange).order_by(BookChange.id.desc())).first()
        assert note is not None
        assert (note.before or {})["efficiency"] == 0.8
        assert (note.after or {})["efficiency"] == 0.7
        assert set(session.scalars(select(Block.dirty_from))) == {date(1900, 1, 1)}


@pytest.mark.parametrize("day", ["2026-04-10", "2026-05-10"])
def test_a_corrected_planting_date_moves_the_season(db: Database, day: str) -> None:
    basin.fill(db)
    raw = copy.deepcopy(basin.BOOK)
    was = raw["seasons"][0]["planting"]
    raw["seasons"][0]["planting"] = day
    loaded = load(db, raw)
    assert loaded.added == {}
    assert loaded.changed == {"seasons": 1}
    bring_up_to_date(db, basin.TODAY)
    with db.read() as session:
        season = session.scalars(select(Season).order_by(Season.id)).first()
        assert season is not None
        assert str(season.planting) == day != was
        days = session.scalars(select(LedgerDay.day).where(LedgerDay.season_id == season.id)).all()
        assert str(min(days)) == day
        note = session.scalars(select(BookChange).order_by(BookChange.id.desc())).first()
        assert note is not None
        assert (note.before or {})["planting"] == was


def test_a_changed_irrigation_supersedes_and_a_deleted_one_stays_deleted(db: Database) -> None:
    basin.fill(db)
    raw = copy.deepcopy(basin.BOOK)
    raw["irrigations"][0]["gross_mm"] = 30
    assert load(db, raw).changed == {"events": 1}
    with db.read() as session:
        last = session.scalars(select(Event).order_by(Event.id.desc())).first()
        assert last is not None
        assert last.amount == 30
        assert last.supersedes is not None
        number = last.id
    void_event(db, number, "advisor", "x", basin.TODAY)
    assert load(db, raw).changed == {}


def test_every_name_that_leads_nowhere_is_told_at_once(db: Database) -> None:
    raw = copy.deepcopy(basin.BOOK)
    raw["fields"][0]["station"] = "bemch"
    raw["seasons"][0]["crop"] = "maze_grain"
    raw["seasons"][1]["crop"] = "alfalfa"
    raw["soils"][0]["layers"][0]["texture"] = "loom"
    raw["fields"][1]["blocks"][0]["area_ha"] = 9
    with pytest.raises(BookError) as caught:
        load(db, raw)
    text = str(caught.value)
    assert "no station 'bemch'; near: bench" in text
    assert "no crop in the handbook 'maze_grain'; near: maize_grain" in text
    assert "alfalfa_hay_averaged, alfalfa_hay_cycles" in text
    assert "no texture in the handbook 'loom'; near: loam" in text
    assert "their areas add to 24 ha, the field has 20 ha" in text
    with db.read() as session:
        assert session.scalar(select(func.count()).select_from(Block)) == 0


def test_what_the_handbook_leaves_blank_must_be_given(db: Database) -> None:
    raw = copy.deepcopy(basin.BOOK)
    raw["soils"][1]["rew_mm"] = 19.9
    raw["soils"][1]["tew_mm"] = 8
    raw["systems"][0]["least_mm"] = 30
    raw["systems"][0]["hours_per_day"] = 2
    with pytest.raises(BookError) as caught:
        load(db, raw)
    assert "systems pivot: the hours allow only 12.0 mm" in str(caught.value)
    assert "soils lab: rew_mm is 19.9; it must be less than" in str(caught.value)


@pytest.mark.parametrize(
    ("change", "says"),
    [
        (
            lambda raw: raw["stations"][0].update(latitude_deg=95),
            "stations 1 (bench), latitude_deg",
        ),
        (lambda raw: raw["fields"][0].update(area_ha="wide"), "fields 1 (long-piece), area_ha"),
        (lambda raw: raw.update(stattions=[]), "stattions: there is no such name here"),
        (lambda raw: raw["farms"][0].update(key="Mill Farm"), "small letters and digits, parted"),
        (lambda raw: raw.update(fields={}), "fields: must be a list in brackets"),
        (lambda raw: raw["seasons"][0].update(planting="2026-4-20"), "a date such as 2026-07-14"),
        (lambda raw: raw["fields"][0].pop("farm"), "fields 1 (long-piece), farm: is missing"),
        (lambda raw: raw["irrigations"][0].update(hours=2), "exactly one of gross_mm"),
        (lambda raw: raw["soils"][1]["layers"][0].update(wilting_point=0.4), "must be above"),
        (lambda raw: raw["seasons"][0].update(end="2026-01-01"), "is not after planting"),
        (lambda raw: raw["seasons"][0].update(kc_reference="tall"), "seasons 1 (long-piece)"),
    ],
)
def test_a_wrong_value_is_named_by_place(tmp_path: Path, change: Any, says: str) -> None:
    raw = copy.deepcopy(basin.BOOK)
    change(raw)
    path = tmp_path / "book.json"
    path.write_text(json.dumps(raw))
    with pytest.raises(BookError) as caught:
        read_book(path)
    assert says in str(caught.value)


def test_what_is_not_json_is_told_by_line(tmp_path: Path) -> None:
    path = tmp_path / "book.json"
    path.write_text('{\n "stations": [,]\n}')
    with pytest.raises(BookError, match="line 2, column 15"):
        read_book(path)
    path.write_bytes(b"\xff\xfe{}")
    with pytest.raises(BookError, match="UTF-8"):
        read_book(path)
    with pytest.raises(BookError, match="cannot be read"):
        read_book(tmp_path / "none.json")


@pytest.mark.parametrize("kind", ["dual", "single"])
def test_every_crop_of_the_handbook_makes_a_season_by_its_name_alone(kind: str) -> None:
    """119 crops; what the tables leave blank stands as a working value (FAO-56 Tables 11 to 22)."""
    assert len(handbook.crops()) == 119
    for key in handbook.crops():
        part = SeasonPart(field="a", crop=key, planting=date(2026, 4, 1), coefficients=kind)
        season = crop_season(part.model_dump(mode="json"), part.planting)
        assert sum(season.stage_days) > 30
        assert season.k_mid > 0.0
