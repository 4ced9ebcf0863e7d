"""A day's working: each equation on the page gives its figure, the data behind it is the ledger's,
and every reading stands on the line it names."""

import copy
import math
import random
import re
from datetime import date, timedelta
from typing import Any

import pytest
from sqlalchemy import select

from app.book import Book
from app.storage.database import Database
from app.storage.tables import Block, Field, LedgerDay
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book
from app.workflows.log_event import log_irrigation
from app.workflows.log_seen import log_seen
from tests.web.conftest import Browser
from tests.workflows import basin

FILE = basin.daily_csv()
FIELDS: dict[str, tuple[dict[str, Any], dict[str, Any], str, str]] = {
    # key: what the field, its season say; its soil and system
    "plain": ({}, {}, "loam", "pivot"),
    "single": ({}, {"coefficients": "single"}, "loam", "pivot"),
    "stages": ({}, {"mad": 0.5, "mad_by_stage": [0.3, None, 0.55, 0.8]}, "lab", "pivot"),
    "saline": ({"water_ec_ds_m": 3.0}, {"mad": 0.4}, "loam", "pivot"),
    "trickle": ({}, {"mulch": {"kind": "plastic", "cover": 0.4, "reduction": 0.1}}, "loam", "drip"),
    "damp": ({"water_table": [{"since": "2026-04-01", "depth_m": 1.4}]}, {}, "silty", "pivot"),
    "runoff": ({}, {}, "sealed", "furrow"),
}


@pytest.fixture(scope="module")
def browse(tmp_path_factory: pytest.TempPathFactory) -> Browser:
    """A basin whose fields differ in all that a day's working has to open."""
    db = Database(f"sqlite:///{tmp_path_factory.mktemp('working') / 'basin.sqlite'}")
    db.migrate()
    book = copy.deepcopy(basin.BOOK)
    book["soils"] += [
        {"key": "silty", "name": "Silty", "layers": [
            {"bottom_m": 0.4, "texture": "loam"},
            {"bottom_m": 2.0, "sand": 25, "clay": 20, "organic_matter": 1.0, "gravel": 0}]},
        {"key": "sealed", "name": "Sealed", "curve_number": 88, "drainage_days": 2, "layers": [
            {"bottom_m": 0.3, "texture": "loam"}, {"bottom_m": 2.0, "texture": "clay_loam"}]},
    ]  # fmt: skip
    pivot = book["systems"][0]
    book["systems"] += [
        pivot | {"key": "drip", "name": "Drip", "kind": "drip", "efficiency": 0.9, "rate_mm_h": 2,
                 "wetting": "trickle", "wetted_fraction": 0.35, "root_wetted_fraction": 0.5,
                 "under_canopy": True},
        pivot | {"key": "furrow", "name": "Furrow", "kind": "furrow", "efficiency": 0.6,
                 "wetting": "furrow_alternate", "most_mm": 120},
    ]  # fmt: skip
    plain, season = book["fields"][0], book["seasons"][0]
    book["fields"] = [
        plain | {"key": key, "name": key.title(), "soil": soil, "system": system} | field
        for key, (field, _, soil, system) in FIELDS.items()
    ]
    book["seasons"] = [season | {"field": key} | part[1] for key, part in FIELDS.items()]
    book["irrigations"] = [
        {"field": key, "day": f"2026-0{month}-{day:02}", **amount, "purpose": purpose}
        for key in FIELDS
        for month, day, amount, purpose in (
            (5, 1, {"gross_mm": 20}, "germination"),
            (5, 5, {"hours": 3}, "frost"),
            (5, 20, {"net_mm": 25}, "crop"),
            (6, 8, {"hours": 6.5}, "crop"),
            (6, 20, {"volume_m3": 2400}, "crop"),
            (6, 22, {"gross_mm": 60}, "leaching"),
        )
    ]
    book["rain"] = [
        {"field": key, "day": "2026-06-10", "rain_mm": 21} for key in ("plain", "runoff")
    ]
    with db.write() as session:
        load_book(session, Book.model_validate(book), "admin")
    for station in ("bench", "meadow"):
        basin.take(db, station, FILE)
    bring_up_to_date(db, basin.TODAY)
    return Browser(db, today=basin.TODAY)


def evaluated(text: str) -> float:
    """A printed equation in figures, worked out; only figures, + − × / ( ) min and max."""
    plain = text.replace("−", "-").replace("×", "*").replace("\u202f", "")
    assert re.fullmatch(r"(?:[-0-9.+*/(), ]|min|max)+", plain), text
    return float(eval(plain, {"__builtins__": {}}, {"min": min, "max": max}))


def days_of(key: str, lots: random.Random, many: int) -> list[date]:
    """Random days of the season, and those with water."""
    first = date(2026, 4, 20)
    wet = [date(2026, 5, 1), date(2026, 5, 5), date(2026, 5, 20), date(2026, 6, 8),
           date(2026, 6, 10),
           date(2026, 6, 20), date(2026, 6, 22), date(2026, 6, 23)]  # fmt: skip
    span = (basin.TODAY - first).days
    return sorted(
        {first, *wet, *(first + timedelta(days=lots.randrange(span)) for _ in range(many))}
    )


@pytest.mark.parametrize("key", FIELDS)
def test_every_equation_gives_its_figure(browse: Browser, key: str) -> None:
    seen: set[str] = set()
    for day in days_of(key, random.Random(key), 12):
        answer = browse.get(f"/api/v1/fields/{key}/days/{day}")
        assert answer.status_code == 200, answer.text
        page = browse.get(f"/fields/{key}/days/{day}").text
        for term in answer.json()["terms"]:
            if not term["sum"]:
                continue
            digits = len(term["value"].partition(".")[2])
            printed = float(term["value"].replace("−", "-").replace("\u202f", ""))
            close = pytest.approx(printed, abs=1.01 * 10**-digits)
            assert evaluated(term["sum"]) == close, (day, term["name"], term["sum"])
            assert f"= {term['sum']}</span>" in page
            seen.add(term["name"])
    told = {
        "reference ET, ETo", "in reach of the roots, TAW", "crop ET without stress, ETc",
        "fraction readily drawn, p", "readily available, RAW",
        "depletion after the day’s water, Dr", "stress, Ks", "crop ET", "actual coefficient",
        "limit", "depletion at the close",
        "its net depth",
    }  # fmt: skip
    assert told <= seen
    if key != "single":
        assert {"soil evaporation, Ke", "reduction of evaporation, Kr"} <= seen
    own = {"runoff": "runoff", "damp": "capillary rise", "trickle": "rain outside the roots"}
    assert own.get(key, "limit") in seen


def test_each_figure_is_the_ledgers(browse: Browser) -> None:
    lots = random.Random(7)
    with browse.db.read() as session:
        rows = session.execute(
            select(Field.key, LedgerDay)
            .join(Field.blocks)
            .join(LedgerDay, LedgerDay.block_id == Block.id)
        ).all()
        session.expunge_all()
    for key, row in lots.sample(list(rows), 60):
        day = browse.get(f"/api/v1/fields/{key}/days/{row.day}").json()
        figures, ledger = day["figures"], day["ledger"]
        for name, column in (
            ("depletion", "depletion_mm"), ("taw", "taw_mm"), ("raw", "raw_mm"), ("ks", "ks"),
            ("et", "et_actual_mm"), ("etc", "etc_potential_mm"), ("rain", "rain_mm"),
            ("irrigation", "irrigation_net_mm"), ("percolation", "deep_percolation_mm"),
            ("runoff", "runoff_mm"), ("growth", "root_growth_depletion_mm"),
            ("subsoil", "subsoil_depletion_mm"), ("eto", "eto_mm"),
        ):  # fmt: skip
            assert figures[name] == pytest.approx(getattr(row, column), abs=1e-9), (key, name)
            assert ledger[column] == getattr(row, column)


def test_the_root_zone_can_be_worked_out_from_the_data_alone(browse: Browser) -> None:
    """FAO-56 eq 71, 74, 80, 84 and 85, from nothing but the figures of the answer."""
    lots = random.Random(11)
    for key in FIELDS:
        for day in days_of(key, lots, 6):
            f = browse.get(f"/api/v1/fields/{key}/days/{day}").json()["figures"]
            came = (f["rain"] - f["runoff"]) * f["roots"] + f["irrigation"] + f["given_rise"]
            wet = f["opening"] + f["growth"] - came - f["rise"]
            p = min(max(f["p_table"] + 0.04 * (5 - (f["k"] + f["ke"]) * f["eto"]), 0.1), 0.8)
            left = max(f["taw"] - wet, 0.0)
            ks = min(left / (f["taw"] * (1 - p)), 1.0) * f["salt"]
            evaporation = min(f["ke"] * f["eto"], left)
            et = evaporation + min(ks * f["k"] * f["eto"], left - evaporation)
            close = wet + et + f["percolation"] - f["correction"]
            assert close == pytest.approx(f["depletion"], abs=1e-9), (key, day)


def test_each_reading_stands_on_the_line_it_names(browse: Browser) -> None:
    lines = FILE.decode().splitlines()
    answer = browse.get("/api/v1/fields/plain/days/2026-06-11").json()
    assert {one["station"] for one in answer["readings"]} == {"bench"}
    (reading,) = answer["readings"]
    assert reading["file"] == "daily.csv"
    cells = lines[reading["line"] - 1].split(",")
    assert cells[0] == "2026-06-11"
    told = sorted(value for value in reading["values"].values() if value is not None)
    assert len(told) == len(cells) - 1
    for value in (float(cells[1]), float(cells[2]), float(cells[5])):
        assert any(math.isclose(value, one, abs_tol=0.02) for one in told), (value, told)


def test_a_correction_by_a_reading_is_opened_too(browse: Browser) -> None:
    part = {"method": "volumetric", "hour": 12, "depths": [{"depth_m": 0.2, "value": 0.2}]}
    day = date(2026, 6, 25)
    log_seen(
        browse.db,
        "plain",
        None,
        "reading",
        day,
        "a",
        "r1",
        basin.TODAY,
        details=part,
    )
    figures = browse.get(f"/api/v1/fields/plain/days/{day}").json()["figures"]
    assert figures["correction"] != 0


def test_no_other_day_and_no_other_field(browse: Browser) -> None:
    for path in ("plain/days/2020-01-01", "plain/days/9999-12-31", "none/days/2026-06-11"):
        assert browse.get(f"/api/v1/fields/{path}").status_code == 404
        assert browse.get(f"/fields/{path}").status_code == 404


def test_part_of_a_block_watered_counts_for_that_part(browse: Browser) -> None:
    log_irrigation(
        browse.db, "single", None, date(2026, 6, 27), 20, "gross_mm", "a", "t", basin.TODAY
    )
    terms = browse.get("/api/v1/fields/single/days/2026-06-27").json()["terms"]
    assert [t["value"] for t in terms if t["name"] == "its net depth"] == ["16.00"]
