"""Gather what a ledger rests on: for each block and season, a plan and its weather."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import date, timedelta
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy.orm import Session

from app.science.crop.season import CropSeason
from app.science.energy.ladder import USUAL
from app.science.energy.reference_et import eto_from_parts
from app.science.energy.sun import day_of_year, extraterrestrial_daily
from app.science.energy.usual import HALF_WINDOW, usual_for_date
from app.science.ledger import Ahead, BlockPlan, BlockWeather
from app.science.outlook.sequences import (
    MOST_YEARS,
    NEAR_DATE,
    RECENT_REACH,
    Sequences,
    past_sequences,
)
from app.science.outlook.usual import RECORD_DAYS, fill_gaps, usual_ahead
from app.storage.events import Standing, standing_events
from app.storage.ledgers import (
    BlockRow,
    SeasonRow,
    SourceRow,
    read_blocks,
    read_seasons,
    read_sources,
    station_details,
)
from app.storage.series import read_past_years, read_series
from app.workflows import agronomy
from app.workflows.crop import Seen, crop_season

Floats = NDArray[np.float64]
HORIZON = 14
"""Days ahead that advice looks at."""
HISTORY = 120
"""Days before a season that the usual for the date may look back on."""
TODAY = timedelta(days=1)
"""Ledgers close yesterday; water logged for today is already counted in the outlook."""


@dataclass(frozen=True)
class Subject:
    """A block's season at hand: what to compute on, and what its advice needs.

    plan and weather run from the ledger's start through `through` and `HORIZON` days on.
    """

    block: BlockRow
    season: SeasonRow
    crop: CropSeason
    plan: BlockPlan
    weather: BlockWeather
    past: int
    """How many of the plan's days are past; the rest is the outlook."""
    opening_unknown: bool
    """A ledger that starts after planting without a reading: anywhere in 0-100 % of RAW."""
    last_irrigation: date | None
    readings: tuple[Standing, ...]
    """Readings of soil water in the season, by day and hour."""
    keep_offs: tuple[tuple[date, date], ...]
    """Days on which somebody said that it must not be watered, both included."""
    ahead: Ahead
    """What the weather ahead may be; without a column where no past morning tells."""


@dataclass(frozen=True)
class Past:
    """What past years lend to the days ahead: the usual ETo [mm] of the last 60 days and the
    `HORIZON` ahead, and what may come."""

    usual: Floats
    sequences: Sequences


@dataclass(frozen=True)
class FieldWeather:
    """Weather of a set of sources on one axis of days, gaps filled by the usual."""

    first: date
    known_from: int
    """Place of the first day with reference ET; days before cannot be reckoned with."""
    eto: Floats
    rain: Floats
    u2: Floats
    rh_min: Floats
    tmax: Floats
    tmin: Floats
    rung: NDArray[np.int8]
    rn: Floats
    eto_ahead: Floats
    rain_ahead: Floats
    """What may come, (`HORIZON`, columns), a past morning each."""


def assemble(session: Session, since: Mapping[int, date], through: date) -> list[Subject]:
    """Subjects of blocks for every season that has days from the block's day of `since` on.

    Ledgers run to `through`. A season whose stations have no reference ET yet has no subject.
    """
    blocks = sorted(since)
    block_rows = {row.block_id: row for row in read_blocks(session, blocks)}
    chosen = [
        (row, crop)
        for row, crop in seasons_of(session, blocks)
        if _start(row) <= through and agronomy.as_date(crop.last_day) >= since[row.block_id]
    ]
    if not chosen:
        return []
    first = min(_start(row) for row, _ in chosen) - timedelta(days=HISTORY)
    sources = _sources(session, {row.field_id for row in block_rows.values()})
    weather = _Weather(session, sources, first, through)
    events: dict[int, list[Standing]] = {}
    for event in standing_events(session, blocks):
        events.setdefault(event.block_id, []).append(event)
    subjects = []
    for row, crop in chosen:
        block = block_rows[row.block_id]
        subject = _subject(
            block, row, crop, weather.of(block.field_id), events.get(block.block_id, []), through
        )
        if subject is not None:
            subjects.append(subject)
    return subjects


def seasons_of(session: Session, blocks: Sequence[int]) -> list[tuple[SeasonRow, CropSeason]]:
    """Seasons of blocks by block and planting; one that the next overtakes ends the day before.

    What was seen of a crop belongs to the season it was seen in.
    """
    rows = read_seasons(session, blocks)
    seen: dict[int, list[Seen]] = {}
    for event in standing_events(session, blocks, ("stage", "cover", "cutting")):
        height = event.details.get("height_m", 0.0)
        seen.setdefault(event.block_id, []).append(
            Seen(event.day, event.kind, event.amount, height)
        )
    found = []
    for row, later in pairwise([*rows, None]):
        assert row is not None
        until = later.planting if later is not None and later.block_id == row.block_id else date.max
        own = [one for one in seen.get(row.block_id, []) if row.planting <= one.day < until]
        crop = crop_season(row.details, row.planting, own)
        if later is not None and later.block_id == row.block_id:
            eve = np.datetime64(_start(later), "D") - 1
            if crop.last_day > eve:
                crop = replace(crop, end=eve)
        found.append((row, crop))
    return found


def _start(season: SeasonRow) -> date:
    stated = season.details["ledger_start"]
    return date.fromisoformat(stated) if stated else season.planting


def _sources(session: Session, fields: set[int]) -> dict[int, tuple[SourceRow, ...]]:
    found: dict[int, list[SourceRow]] = {field: [] for field in fields}
    for row in read_sources(session, sorted(fields)):
        found[row.field_id].append(row)
    return {field: tuple(rows) for field, rows in found.items()}


class _Weather:
    """Weather by field, computed once for each distinct set of sources."""

    def __init__(
        self,
        session: Session,
        sources: dict[int, tuple[SourceRow, ...]],
        first: date,
        through: date,
    ) -> None:
        stations = sorted({row.station_id for rows in sources.values() for row in rows})
        self.sources = sources
        self.first, self.days = first, (through - first).days + 1
        self.series = read_series(session, stations, first, through)
        self.years = read_past_years(
            session,
            stations,
            through,
            years=MOST_YEARS,
            before=RECORD_DAYS + NEAR_DATE + HALF_WINDOW,
            after=NEAR_DATE + HORIZON + HALF_WINDOW,
            recent=RECENT_REACH + HORIZON + RECORD_DAYS,
        )
        self.details = station_details(session, stations)
        self.known: dict[tuple[Any, ...], FieldWeather] = {}

    def of(self, field: int) -> FieldWeather:
        rows = self.sources[field]
        key = tuple((row.variable, row.since, row.station_id) for row in rows)
        if key not in self.known:
            self.known[key] = self._weather(rows)
        return self.known[key]

    def _weather(self, rows: tuple[SourceRow, ...]) -> FieldWeather:
        station = {
            name: self._stations(rows, name) for name in ("energy", "temperature", "wind", "rain")
        }
        energy, air, wind = station["energy"], station["temperature"], station["wind"]
        rn = self._pick(energy, "rn")
        rung = np.zeros(self.days, np.int8)
        for number in np.unique(energy):
            rung = np.where(energy == number, self.series[int(number)].rung, rung)
        own = (energy == air) & (air == wind)
        eto = np.where(own, self._pick(energy, "eto"), np.nan)
        if not own.all():
            parts = eto_from_parts(
                self._pick(air, "tmax"),
                self._pick(air, "tmin"),
                self._pick(air, "vapour_pressure"),
                rn,
                self._pick(wind, "wind_2m"),
                self._place(air, "elevation_m"),
            )
            eto = np.where(own, eto, parts[0])
        axis = np.datetime64(self.first, "D") + np.arange(self.days + HORIZON)
        latitude = self._place(energy, "latitude_deg")
        ra = extraterrestrial_daily(
            np.r_[latitude, np.full(HORIZON, latitude[-1])], day_of_year(axis)
        )
        return _completed(
            self.first,
            eto,
            rn,
            rung,
            ra,
            self._pick(station["rain"], "rain"),
            self._pick(wind, "wind_2m"),
            self._pick(air, "rh_min_used"),
            (self._pick(air, "tmax"), self._pick(air, "tmin")),
            self._past(int(energy[-1]), int(station["rain"][-1])),
        )

    def _past(self, energy: int, rain: int) -> "Past":
        """What past years of the stations that feed a field this morning lend to its outlook."""
        years = self.years[energy]
        eto = years.values["eto"]
        date = np.datetime64(years.first, "D") + np.arange(eto.size)
        ra = extraterrestrial_daily(
            np.full(eto.size, float(self.details[energy]["latitude_deg"])), day_of_year(date)
        )
        today = date[-1] + 1
        near = today + np.arange(-RECORD_DAYS, HORIZON)
        return Past(
            usual_for_date(near, date, eto),
            past_sequences(today, date, eto, self.years[rain].values["rain"], ra, HORIZON),
        )

    def _stations(self, rows: tuple[SourceRow, ...], variable: str) -> NDArray[np.int64]:
        """Station number of each day for a variable."""
        numbers = np.zeros(self.days, np.int64)
        for row in rows:
            if row.variable == variable:
                numbers[max(0, (row.since - self.first).days) :] = row.station_id
        return numbers

    def _pick(self, stations: NDArray[np.int64], name: str) -> Floats:
        values = np.full(self.days, np.nan)
        for number in np.unique(stations):
            values = np.where(stations == number, self.series[int(number)].values[name], values)
        return values

    def _place(self, stations: NDArray[np.int64], name: str) -> Floats:
        return np.array([float(self.details[int(number)][name]) for number in stations])


def _completed(
    first: date,
    eto: Floats,
    rn: Floats,
    rung: NDArray[np.int8],
    ra: Floats,
    rain: Floats,
    u2: Floats,
    rh_min: Floats,
    extremes: tuple[Floats, Floats],
    past: Past,
) -> FieldWeather:
    """Fill gaps by the usual for the date and go on `HORIZON` days beyond the last day."""
    days = eto.size
    filled, was_filled = fill_gaps(eto, ra[:days])
    energy, _ = fill_gaps(rn, ra[:days])
    known = np.flatnonzero(~np.isnan(filled))
    rung = np.where(was_filled, USUAL, rung).astype(np.int8)
    ahead = ra[days:]
    usual = np.r_[np.full(days, np.nan), past.usual][-days - HORIZON :]
    foretold = usual_ahead(filled, ra[:days], ahead, usual)
    return FieldWeather(
        first=first,
        known_from=int(known[0]) if known.size else days,
        eto=np.r_[filled, foretold],
        rain=np.r_[np.nan_to_num(rain), np.zeros(HORIZON)],
        u2=_steady(u2, 2.0),
        rh_min=_steady(rh_min, 45.0),
        tmax=_steady(extremes[0], 25.0),
        tmin=_steady(extremes[1], 10.0),
        rung=np.r_[rung, np.full(HORIZON, USUAL, np.int8)],
        rn=np.r_[energy, usual_ahead(energy, ra[:days], ahead)],
        eto_ahead=past.sequences.eto(foretold, ahead),
        rain_ahead=past.sequences.rain,
    )


def _steady(values: Floats, neutral: float, window: int = 30) -> Floats:
    """Fill gaps, and the days ahead, with the mean of the 30 days before; `neutral` without any.

    Only the climate adjustment of coefficients reads these, by their own 30-day mean, and degree
    days; the neutral values, 2 m/s and 45 %, are those of the handbook's tables.
    """
    steady: Floats = np.r_[values, np.full(HORIZON, np.nan)]
    for day in np.flatnonzero(np.isnan(steady)):
        before = steady[max(0, day - window) : day]
        steady[day] = before.mean() if before.size else neutral
    return steady


def _subject(
    block: BlockRow,
    season: SeasonRow,
    crop: CropSeason,
    weather: FieldWeather,
    events: list[Standing],
    through: date,
) -> Subject | None:
    start = max(_start(season), weather.first + timedelta(days=weather.known_from))
    last = min(agronomy.as_date(crop.last_day), through + timedelta(days=HORIZON))
    days = (last - start).days + 1
    if start > through or days <= 0:
        return None
    here = slice((start - weather.first).days, (start - weather.first).days + days)
    gross, net = np.zeros(days), np.zeros(days)
    wetted, rain = np.full(days, np.nan), weather.rain[here].copy()
    gauge: dict[int, float] = {}
    fraction = agronomy.wetted_fraction(block.system)
    last_irrigation: date | None = None
    for event in events:
        place = (event.day - start).days
        if event.day > through + TODAY or event.confirmation not in agronomy.COUNTED:
            continue
        if event.kind == "irrigation" and (last_irrigation is None or event.day > last_irrigation):
            last_irrigation = event.day
        if not 0 <= place < days:
            continue
        if event.kind != "irrigation":
            if event.kind != "rain":
                continue
            gauge[place] = gauge.get(place, 0.0) + event.amount
            continue
        g, n = agronomy.gross_and_net(
            event.amount, event.unit, event.purpose, block.system, block.area_ha
        )
        share = event.details.get("area_share", 1.0)
        gross[place] += share * g
        net[place] += share * n
        wetted[place] = fraction
    for place, amount in gauge.items():
        rain[place] = amount
    details = season.details
    dates = np.datetime64(start, "D") + np.arange(days)
    table = agronomy.water_table(block.field, dates)
    past = min(days, (through - start).days + 1)
    return Subject(
        block=block,
        season=season,
        crop=crop,
        plan=BlockPlan(
            season=crop,
            profile=agronomy.profile(block.soil),
            start=np.datetime64(start, "D"),
            days=days,
            irrigation_gross=gross,
            irrigation_net=net,
            irrigation_fw=wetted,
            same_day=block.system.get("same_day", "irrigation"),
            salt_factor=agronomy.salt_factor(block.field, details),
            water_table_m=table,
            rising_soil=None if table is None else agronomy.rising_soil(block.soil),
            degree_days_before=_warmth_before(crop, start, weather),
            under_canopy=block.system["under_canopy"],
            root_wetted_fraction=block.system["root_wetted_fraction"],
            initial_depletion_mm=details["initial_depletion_mm"],
            initial_depletion_fraction=details["initial_depletion_fraction"] or 0.0,
            initial_subsoil_depletion_fraction=details["initial_subsoil_depletion_fraction"],
            initial_evaporation_depletion_mm=details["initial_evaporation_depletion_mm"],
        ),
        weather=BlockWeather(
            eto=weather.eto[here],
            rain=rain,
            u2=weather.u2[here],
            rh_min=weather.rh_min[here],
            rung=weather.rung[here],
            rn=weather.rn[here],
            tmax=weather.tmax[here],
            tmin=weather.tmin[here],
        ),
        past=past,
        opening_unknown=(
            start > season.planting
            and details["initial_depletion_mm"] is None
            and details["initial_depletion_fraction"] is None
        ),
        last_irrigation=last_irrigation,
        readings=_readings(events, start, through),
        keep_offs=tuple(
            (event.day, date.fromisoformat(event.details["last"]))
            for event in events
            if event.kind == "keep_off"
        ),
        ahead=Ahead(past, weather.eto_ahead[: days - past], weather.rain_ahead[: days - past]),
    )


def _readings(events: list[Standing], start: date, through: date) -> tuple[Standing, ...]:
    last = through + TODAY
    found = [one for one in events if one.kind == "reading" and start <= one.day <= last]
    return tuple(sorted(found, key=lambda one: (one.day, one.details["hour"], one.event_id)))


def _warmth_before(crop: CropSeason, start: date, weather: FieldWeather) -> float:
    """Degree days before a ledger's first day, from planting or what was last seen before it, as
    far back as the weather goes."""
    if crop.degree_days is None:
        return 0.0
    since = agronomy.as_date(crop.planting)
    for day, _, _ in crop.anchors:
        if agronomy.as_date(day) < start:
            since = agronomy.as_date(day)
    before = slice(max((since - weather.first).days, 0), max((start - weather.first).days, 0))
    return float(crop.degree_days.daily(weather.tmax[before], weather.tmin[before]).sum())
