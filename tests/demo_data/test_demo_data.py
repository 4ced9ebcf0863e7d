"""The demo basin: made again byte for byte, a valid book, believable weather, files that go in.

Figures without a source are regression figures of our own or working values, as marked.
"""

import json
import subprocess
import sys
from collections import Counter
from datetime import date, timedelta
from functools import cache
from itertools import pairwise
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest

from app import handbook
from app.book import read_book
from app.book.references import Known, reference_problems
from app.book.schema import Book
from app.intake import Clock, Counts, Mapping, answer, read, sniff

FOLDER = Path(__file__).resolve().parents[2] / "demo_data"
TODAY = date(2026, 7, 14)


@pytest.fixture(scope="module")
def book() -> Book:
    return read_book(FOLDER / "book.json")


@cache
def script(name: str) -> ModuleType:
    """A module of the generator."""
    sys.path.insert(0, str(FOLDER))
    try:
        return __import__(name)
    finally:
        sys.path.remove(str(FOLDER))


@cache
def station_weather() -> list[Any]:
    demo = script("make_demo")
    return list(script("make_weather").make(demo.PLACES, demo.KNOBS["weather"]))


def days_of(weather: Any, name: str) -> np.ndarray:
    """A station's true values, one row a day, from 1 March 2025 on."""
    width = script("make_weather").PER_DAY
    first = int((np.datetime64("2025-03-01") - weather.end[0]) / np.timedelta64(1, "D") + 0.5)
    values = weather[name][first * width :]
    return values[: len(values) // width * width].reshape(-1, width)


def test_the_script_writes_the_committed_files_again(tmp_path: Path) -> None:
    command = [sys.executable, str(FOLDER / "make_demo.py"), "--out", str(tmp_path)]
    subprocess.run(command, check=True, capture_output=True, timeout=120)
    made = {path.name: path.read_bytes() for path in tmp_path.iterdir()}
    kept = {path.name: path.read_bytes() for path in FOLDER.iterdir() if path.suffix != ".py"}
    kept = {name: data for name, data in kept.items() if (FOLDER / name).is_file()}
    assert sorted(made) == sorted(kept)
    assert [name for name in made if made[name] != kept[name]] == []


def test_every_name_in_the_book_leads_somewhere(book: Book) -> None:
    known = Known(
        crops=frozenset(handbook.crops()),
        textures=frozenset(handbook.soil_textures()),
        wettings=frozenset(handbook.wettings()),
    )
    assert reference_problems(book, known) == []


def test_the_basin_is_as_large_and_as_mixed_as_asked(book: Book) -> None:
    assert len(book.stations) == 3
    assert len(book.farms) == 6
    assert len(book.fields) == 40
    assert len(book.soils) >= 8
    assert len({system.kind for system in book.systems}) >= 5
    assert len({system.kind for system in book.systems} & {"centre pivot", "furrow", "drip"}) == 3
    assert len({season.crop for season in book.seasons}) >= 8
    assert {season.coefficients for season in book.seasons} == {"dual", "single"}
    assert sum(len(field.blocks) > 1 for field in book.fields) == 2
    assert any(field.sources for field in book.fields)
    used = {soil.soil for soil in book.fields} | {b.soil for f in book.fields for b in f.blocks}
    assert {soil.key for soil in book.soils} <= used
    assert {system.key for system in book.systems} == {field.system for field in book.fields}
    years = Counter(season.planting.year for season in book.seasons)
    assert years[2025] >= 40
    assert years[2026] >= 30


def test_water_is_entered_in_every_way_within_its_season(book: Book) -> None:
    entered = Counter(
        name
        for event in book.irrigations
        for name in ("gross_mm", "net_mm", "hours", "volume_m3")
        if getattr(event, name) is not None
    )
    assert min(entered[name] for name in ("gross_mm", "net_mm", "hours", "volume_m3")) > 20
    for event in book.irrigations:
        assert event.day < TODAY
        assert any(
            season.field == event.field
            and season.planting
            <= event.day
            < season.planting + timedelta(sum(season.stage_days or ()))
            for season in book.seasons
        ), f"{event.field} {event.day}: no crop stood there"


def test_no_field_is_watered_in_a_keep_off_or_sooner_than_its_system_comes_back(book: Book) -> None:
    systems = {system.key: system for system in book.systems}
    for field in book.fields:
        days = sorted(
            e.day for e in book.irrigations if e.field == field.key and e.purpose == "crop"
        )
        shut = [(k.first, k.last) for k in field.keep_offs]
        assert not [day for day in days for first, last in shut if first <= day <= last]
        gaps = [(b - a).days for a, b in pairwise(days)]
        assert min(gaps) >= systems[field.system].interval_days


def test_season_water_is_what_a_semi_arid_valley_uses(book: Book) -> None:
    """Working values: a maize or beet season takes 400-1100 mm gross here, alfalfa 500-1500."""
    systems = {system.key: system for system in book.systems}
    for field in book.fields:
        system = systems[field.system]
        gross = 0.0
        for event in book.irrigations:
            if event.field == field.key and event.day.year == 2025:
                gross += event.gross_mm or 0
                gross += (event.net_mm or 0) / system.efficiency
                gross += (event.hours or 0) * system.rate_mm_h
                gross += (event.volume_m3 or 0) / field.area_ha / 10
        assert 150 < gross < 1500, f"{field.key}: {gross:.0f} mm in 2025"


@pytest.mark.parametrize("number", [0, 1, 2])
def test_weather_stays_within_physical_bounds(number: int) -> None:
    """Bounds: Global Network recommended QC tests V2.0, physically possible limits."""
    w = station_weather()[number]
    assert w["t"].min() > -30
    assert w["t"].max() < 42
    assert w["rh"].max() <= 100
    assert w["rh"].min() > 3
    assert (w["dew"] <= w["t"]).all()
    mu = np.maximum(w["height"], 0)
    top = np.divide(w["above"], mu, out=np.full_like(mu, 1361.0), where=mu > 0)
    assert (w["sw_down"] <= 1.5 * top * mu**1.2 + 100).all()
    assert (w["sw_down"] >= 0).all()
    assert (w["sw_up"] <= w["sw_down"]).all()
    black = 5.67e-8 * (w["t"] + 273.15) ** 4
    assert (w["lw_down"] > 0.4 * black).all()
    assert (w["lw_down"] < black + 25).all()
    assert (w["lw_up"] < 5.67e-8 * (w["t"] + 273.15 + 25) ** 4).all()
    assert (w["lw_up"] > 5.67e-8 * (w["t"] + 273.15 - 15) ** 4).all()
    assert (w["rain"] >= 0).all()


@pytest.mark.parametrize("number", [0, 1, 2])
def test_a_year_of_weather_is_that_of_a_semi_arid_valley(number: int) -> None:
    """Working values for about 44 degrees north, 700-900 m."""
    w = station_weather()[number]
    rain = days_of(w, "rain").sum(axis=1)[:365]
    assert 230 < rain.sum() < 350
    assert 40 < (rain > 0.2).sum() < 90
    assert (days_of(w, "rh")[:365].mean(axis=1) > 25).mean() > 0.95
    wet = w["rain"] > 0.5
    assert np.median(w["rh"][wet]) > 90
    july = slice(122, 153)  # days since 1 March
    high, low = days_of(w, "t").max(axis=1)[july], days_of(w, "t").min(axis=1)[july]
    assert 29 < high.mean() < 35
    assert 13 < (high - low).mean() < 22
    wind = days_of(w, "wind").mean(axis=1)
    assert 1.3 < wind.mean() < 3.2
    after, before = days_of(w, "wind")[:, 28:36].mean(), days_of(w, "wind")[:, 4:12].mean()
    assert after > 1.3 * before  # the afternoon breeze


@pytest.mark.parametrize("number", [0, 1, 2])
def test_net_radiation_and_reference_et_are_of_the_right_size(number: int) -> None:
    """Clear July: Rs 28-32 MJ m-2 (FAO-56 eq 37 gives 31.6 here), Rn/Rs about half, ETo 6-9."""
    w = station_weather()[number]
    water = script("make_water").station_days(w, "four components")
    start = water.at(date(2025, 3, 1))
    rs = days_of(w, "sw_down").mean(axis=1) * 0.0864
    ra = days_of(w, "above").mean(axis=1) * 0.0864
    clear_sky = (0.75 + 2e-5 * w.place.elevation) * ra
    july = np.zeros(len(rs), dtype=bool)
    july[122:153] = True
    clear = july & (rs > 0.95 * clear_sky)
    assert clear.sum() >= 10
    assert 28 < rs[clear].mean() < 32
    assert (rs < 1.06 * clear_sky).all()
    rn, eto = water.rn[start : start + len(rs)], water.eto[start : start + len(rs)]
    assert 0.48 < rn[clear].sum() / rs[clear].sum() < 0.6
    assert 6 < eto[clear].mean() < 9
    assert 950 < eto[:365].sum() < 1400


def test_the_model_is_biased_high_against_the_measurement_as_records_show() -> None:
    """Measured against FAO-56 eq 39: +4 to +17 % in eleven real summers (METHODS section 4)."""
    w = station_weather()[0]
    water = script("make_water")
    measured, modelled = water.station_days(w, "four components"), water.station_days(w, "solar")
    summer = slice(measured.at(date(2025, 4, 1)), measured.at(date(2025, 10, 1)))
    ratio = modelled.rn[summer].sum() / measured.rn[summer].sum()
    assert 1.04 < ratio < 1.12


def test_stations_feel_the_same_weather() -> None:
    one, two, three = station_weather()
    assert np.corrcoef(one["t"], two["t"])[0, 1] > 0.97
    assert np.corrcoef(one["sw_down"], three["sw_down"])[0, 1] > 0.98
    rain = [days_of(w, "rain").sum(axis=1) for w in (one, two, three)]
    assert np.corrcoef(rain[0], rain[1])[0, 1] > 0.6
    assert one["t"].mean() > two["t"].mean()  # the bench is higher


def test_every_file_goes_in_with_the_answers_given(book: Book) -> None:
    """Files in their order of arrival, each station's mapping remembered from one to the next."""
    stations = {station.key: station for station in book.stations}
    remembered: dict[str, Mapping] = {}
    counts: dict[str, Counts] = {}
    covered: dict[str, set[int]] = {}
    quantities: dict[str, set[str]] = {}
    for entry in json.loads((FOLDER / "intakes.json").read_text(encoding="utf-8")):
        station = stations[entry["station"]]
        clock = Clock(utc_offset_h=station.utc_offset_h, time_zone=station.time_zone)
        with (FOLDER / entry["file"]).open("rb") as source:
            sniffed = sniff(source, clock, remembered.get(station.key))
            given = entry["answers"]
            left = {q.field for q in sniffed.questions if q.blocking} - set(given)
            assert left == set(), f"{entry['file']}: {left}"
            mapping = answer(sniffed.mapping, given)
            reading = read(source, mapping, clock)
        remembered[station.key] = mapping
        counts[entry["file"]] = reading.counts
        rows = reading.rows
        covered.setdefault(station.key, set()).update(rows.instant.tolist())
        quantities.setdefault(station.key, set()).update(
            name for name, values in rows.values.items() if np.isfinite(values).any()
        )
    assert quantities["tarrow-north"] >= {
        "shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "air_temperature",
        "relative_humidity", "wind_speed", "rain", "pressure",
    }  # fmt: skip
    assert quantities["ferrin-bench"] >= {
        "shortwave_down", "air_temperature", "relative_humidity", "wind_speed", "rain",
    }  # fmt: skip
    assert quantities["sand-lane"] == {"air_temperature_max", "air_temperature_min", "rain"}
    assert counts["tarrow-north-2026-summer.csv"].rows_refused == 1  # its cut last line
    assert counts["tarrow-north-june-found.csv"].out_of_order >= 4
    assert counts["tarrow-north-2025.csv"].repeated_headers >= 2
    assert counts["tarrow-north-2025.csv"].duplicates_same > 0
    assert sum(c.rows_refused for c in counts.values()) == 1
    half_hours = (TODAY - date(2025, 3, 1)).days * 48
    assert len(covered["tarrow-north"]) > 0.985 * half_hours
    assert len(covered["ferrin-bench"]) > 0.985 * half_hours / 2


def test_the_third_station_is_three_days_behind() -> None:
    last = (FOLDER / "sand-lane-july.csv").read_text(encoding="ascii").strip().splitlines()[-1]
    assert last.startswith("7/11/2026")


def test_files_stay_small() -> None:
    total = sum(path.stat().st_size for path in FOLDER.glob("*.csv"))
    assert total < 4_000_000
