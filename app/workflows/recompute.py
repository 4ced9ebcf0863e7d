"""Bring derived rows up to date: station days from their readings, ledgers from station days.

Only what is dirty is touched, from its first dirty day, in the caller's transaction. A ledger is
also carried on to the last closed day when no new reading came: those days rest on the usual for
the date and are recomputed when the readings arrive.
"""

import zlib
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from datetime import date, timedelta
from typing import Any

import numpy as np
from sqlalchemy import select, update
from sqlalchemy.orm import Session

from app.intake import Clock, DayNote, aggregate
from app.science import Floats
from app.science.energy.day_checks import REACH_DAYS
from app.science.energy.station_day import DailyWeather, StationDays, station_days
from app.science.ledger import BlockLedger, block_ledgers, ensemble_depletion
from app.storage import book, judgement
from app.storage.ledgers import (
    clear_dirty,
    last_ledger_days,
    read_blocks,
    replace_ledger_days,
)
from app.storage.series import days_with_rows, replace_station_days
from app.storage.tables import LedgerDay, Station
from app.workflows import agronomy
from app.workflows.assemble import Subject, seasons_of
from app.workflows.compare import stored_rows
from app.workflows.judged import judged

MEMBERS = 200
REACH = timedelta(days=max(1, REACH_DAYS))
"""How far a change of readings is felt to either side: by checks, and by gaps over midnight."""
DAYS_AT_A_TIME = timedelta(days=62)
LEDGER_COLUMNS = tuple(
    column.name
    for column in LedgerDay.__table__.columns
    if column.name not in {"day", "block_id", "season_id"}
)
MEASURED = (
    "tmean",
    "rh_max",
    "rh_min",
    "shortwave_down",
    "shortwave_up",
    "longwave_down",
    "longwave_up",
)
COMPUTED = (
    "tmax",
    "tmin",
    "vapour_pressure",
    "wind_2m",
    "rain",
    "rs",
    "rso",
    "ra",
    "rn",
    "rn_uncertainty",
    "rn_measured",
    "rn_modelled",
    "rh_min_used",
    "eto",
    "etr",
    "eto_uncertainty",
)


def recompute_stations(session: Session) -> int:
    """Recompute the days of dirty stations and mark what hangs on them; returns station days."""
    written = 0
    stations = session.execute(
        select(Station.id, Station.details, Station.dirty_from)
        .where(Station.dirty_from.is_not(None))
        .order_by(Station.id)
        .with_for_update()
    ).all()
    for number, details, since in stations:
        first = max(since, book.BEGINNING + REACH) - REACH
        rows = _days(session, number, details, first)
        written += replace_station_days(session, number, first, rows)
        book.dirty_blocks(session, book.station_blocks(session, number), first)
        session.execute(update(Station).where(Station.id == number).values(dirty_from=None))
    return written


def _days(
    session: Session, station: int, details: dict[str, Any], since: date
) -> Iterator[dict[str, Any]]:
    """Rows of station_day from `since`, or the first readings after it, to the last readings."""
    span = days_with_rows(session, station, since)
    if span is None:
        return
    site, clock = agronomy.site(details), Clock(details["utc_offset_h"], details["time_zone"])
    marks, log = judgement.marks(session, station), judgement.sensor_log(session, station)
    first, last = span
    while first <= last:
        until = min(first + DAYS_AT_A_TIME, last)
        stored = stored_rows(session, station, first - 2 * REACH, until + 2 * REACH)
        one = judged(stored, marks, log, clock)
        days = np.datetime64(first - REACH) + np.arange((until - first + 2 * REACH).days + 1)
        weather, notes = aggregate(one.rows, site, days, one.good)
        computed = station_days(site, weather)
        for row in _station_rows(station, weather, computed, [*notes, *one.notes]):
            if first <= row["day"] <= until:
                yield row
        first = until + timedelta(days=1)


def _station_rows(
    station: int, weather: DailyWeather, days: StationDays, notes: list[DayNote]
) -> Iterator[dict[str, Any]]:
    columns = {name: _numbers(getattr(weather, name)) for name in MEASURED}
    columns |= {name: _numbers(getattr(days, name)) for name in COMPUTED}
    words: dict[date, list[str]] = {}
    for note in notes:
        words.setdefault(note.day, []).append(
            f"{note.quantity}:{note.what}:{note.figure:g}:{note.reason}"
        )
    for place, day in enumerate(days.date.tolist()):
        yield {
            "station_id": station,
            "day": day,
            "rung": int(days.rung[place]),
            "why_not": str(days.why_not[place]),
            "humidity_rung": int(days.humidity_rung[place]),
            "wind_rung": int(days.wind_rung[place]),
            "flags": str(days.flags[place]),
            "notes": "\n".join(words.get(day, [])),
            **{name: values[place] for name, values in columns.items()},
        }


def _numbers(values: Any) -> list[float | None]:
    """Floats for the database: None for NaN."""
    return [None if value != value else value for value in np.asarray(values, float).tolist()]


def due_ledgers(session: Session, through: date) -> dict[int, date]:
    """Blocks whose ledger is dirty or stops before it should, and the day to write from."""
    due: dict[int, date] = {}
    blocks = read_blocks(session)
    dirty = {row.block_id: row.dirty_from for row in blocks if row.dirty_from is not None}
    last = last_ledger_days(session)
    for season, crop in seasons_of(session, [row.block_id for row in blocks]):
        until = min(through, agronomy.as_date(crop.last_day))
        if season.season_id in last and last[season.season_id] < until:
            due[season.block_id] = last[season.season_id] + timedelta(days=1)
        elif season.season_id not in last and season.planting <= until:
            due[season.block_id] = min(season.planting, due.get(season.block_id, season.planting))
    for block, since in dirty.items():
        due[block] = min(since, due.get(block, since))
    return due


@dataclass(frozen=True)
class Computed:
    """A subject with its ledger and the p10 and p90 of its depletion, outlook included."""

    subject: Subject
    ledger: BlockLedger
    p10: Floats
    p90: Floats


def compute(subjects: list[Subject]) -> list[Computed]:
    """The ledgers of subjects and their ranges."""
    ledgers = block_ledgers(
        [subject.plan for subject in subjects], [subject.weather for subject in subjects]
    )
    return [
        Computed(subject, ledger, *_range(subject))
        for subject, ledger in zip(subjects, ledgers, strict=True)
    ]


def _range(subject: Subject) -> tuple[Floats, Floats]:
    """The seed is of the block and its season, so that the same inputs give the same bytes and a
    new day does not stir the days before."""
    name = f"{subject.block.field_key}/{subject.block.block_key}/{subject.season.planting}"
    seed = zlib.crc32(name.encode())
    return ensemble_depletion(
        subject.plan,
        subject.weather,
        seed=seed,
        members=MEMBERS,
        initial_unknown=subject.opening_unknown,
    )


def write_ledgers(session: Session, computed: Iterable[Computed], since: Mapping[int, date]) -> int:
    """Write ledger rows from each block's day of `since` on; returns how many."""
    rows: list[dict[str, Any]] = []
    for one in computed:
        first = since.get(one.subject.block.block_id)
        if first is not None:
            rows.extend(_ledger_rows(one, first))
    written = replace_ledger_days(session, since, rows)
    clear_dirty(session, sorted(since))
    return written


def _ledger_rows(computed: Computed, since: date) -> Iterator[dict[str, Any]]:
    subject, ledger = computed.subject, computed.ledger
    columns: dict[str, list[Any]] = {}
    for name in LEDGER_COLUMNS:
        values = getattr(ledger, name)
        if name in {"rung", "standing"}:
            columns[name] = values.tolist()
        else:
            columns[name] = _numbers(values)
    columns["depletion_p10_mm"] = _numbers(computed.p10)
    columns["depletion_p90_mm"] = _numbers(computed.p90)
    for place in range(subject.past):
        day = agronomy.as_date(ledger.date[place])
        if day >= since:
            yield {
                "day": day,
                "block_id": subject.block.block_id,
                "season_id": subject.season.season_id,
                **{name: values[place] for name, values in columns.items()},
            }
