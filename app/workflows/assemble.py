"""Gather what a ledger rests on: for each block and season, a plan and its weather."""

from collections.abc import Mapping, Sequence, Set
from dataclasses import dataclass
from datetime import date, timedelta
from typing import NamedTuple

import numpy as np
from sqlalchemy.orm import Session

from app.science import Floats
from app.science.crop.season import CropSeason
from app.science.ledger import Ahead, BlockPlan, BlockWeather
from app.storage.events import Standing, standing_events
from app.storage.ledgers import (
    BlockRow,
    SeasonRow,
    read_blocks,
    read_closes,
)
from app.workflows import agronomy
from app.workflows.field_weather import HORIZON, FieldsWeather, FieldWeather
from app.workflows.stretches import DAY, Close, Stretch, stretches_of

HISTORY = 120
"""Days before a season that the usual for the date may look back on."""
TODAY = timedelta(days=1)
"""Ledgers close yesterday; water logged for today is already counted in the outlook."""


@dataclass(frozen=True)
class Subject:
    """A stretch of a block's ledger at hand: what to compute on, and what its advice needs.

    plan and weather run from the stretch's start through `through` and, where a crop stands,
    `HORIZON` days on.
    """

    block: BlockRow
    season: SeasonRow
    stretch: Stretch
    close: Close | None
    """What the stored ledger closed with on the day before, for a stretch that carries over."""
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
    opening_width_mm: float = 0.0
    """From p10 to p90 of the opening depletion, where the stretch before tells it."""

    def follows(self, other: "Subject") -> bool:
        """Whether it begins on the day after the last of `other`, on the same block."""
        after = other.plan.start + other.plan.days
        return self.block.block_id == other.block.block_id and bool(after == self.plan.start)


def assemble(
    session: Session,
    since: Mapping[int, date],
    through: date,
    counted: Set[str] = agronomy.COUNTED,
) -> list[Subject]:
    """Subjects of blocks for every season that has days from the block's day of `since` on.

    Ledgers run to `through`; water counts whose confirmation is in `counted`. A season whose
    stations have no reference ET yet has no subject.
    """
    blocks = sorted(since)
    block_rows = {row.block_id: row for row in read_blocks(session, blocks)}
    chosen = [
        stretch
        for stretch in stretches_of(session, blocks)
        if stretch.start <= through
        and agronomy.as_date(stretch.crop.last_day) >= since[stretch.season.block_id]
    ]
    if not chosen:
        return []
    first = min(stretch.start for stretch in chosen) - timedelta(days=HISTORY)
    fields = {row.field_id for row in block_rows.values()}
    weather = FieldsWeather(session, fields, first, through)
    events: dict[int, list[Standing]] = {}
    for event in standing_events(session, blocks):
        events.setdefault(event.block_id, []).append(event)
    closes = _closes(session, chosen)
    subjects = []
    for stretch in chosen:
        block = block_rows[stretch.season.block_id]
        subject = _subject(
            block,
            stretch,
            closes.get((block.block_id, stretch.start)),
            weather.of(block.field_id),
            events.get(block.block_id, []),
            through,
            counted,
        )
        if subject is not None:
            subjects.append(subject)
    return subjects


def _closes(session: Session, chosen: Sequence[Stretch]) -> dict[tuple[int, date], Close]:
    """What stored ledgers closed with before the first of each block's chosen stretches, where
    that carries over; by block and the day after."""
    firsts: dict[int, Stretch] = {}
    for stretch in chosen:
        firsts.setdefault(stretch.season.block_id, stretch)
    eves = {block: one.start - DAY for block, one in firsts.items() if one.carries}
    return {
        (block, firsts[block].start): Close(*values)
        for block, values in read_closes(session, eves).items()
    }


def _subject(
    block: BlockRow,
    stretch: Stretch,
    close: Close | None,
    weather: FieldWeather,
    events: list[Standing],
    through: date,
    counted: Set[str],
) -> Subject | None:
    season, profile = stretch.season, agronomy.profile(block.soil)
    crop = agronomy.initial_wetting(stretch.crop, season.details, profile, block.system)
    start = max(stretch.start, weather.first + timedelta(days=weather.known_from))
    ahead = timedelta(days=0 if stretch.bare else HORIZON)
    last = min(agronomy.as_date(crop.last_day), through + ahead)
    days = (last - start).days + 1
    if start > through or days <= 0:
        return None
    here = slice((start - weather.first).days, (start - weather.first).days + days)
    done = [
        event for event in events if event.day <= through + TODAY and event.confirmation in counted
    ]
    water = _water(block, done, start, weather.rain[here])
    details = season.details
    dates = np.datetime64(start, "D") + np.arange(days)
    table = agronomy.water_table(block.field, dates)
    past = min(days, (through - start).days + 1)
    return Subject(
        block=block,
        season=season,
        stretch=stretch,
        close=close if start == stretch.start else None,
        crop=crop,
        plan=BlockPlan(
            season=crop,
            profile=profile,
            start=np.datetime64(start, "D"),
            days=days,
            irrigation_gross=water.gross,
            irrigation_net=water.net,
            irrigation_fw=water.wetted,
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
            rain=water.rain,
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
            and not stretch.bare
            and details["initial_depletion_mm"] is None
            and details["initial_depletion_fraction"] is None
        ),
        last_irrigation=max((e.day for e in done if e.kind == "irrigation"), default=None),
        readings=_readings(events, start, through),
        keep_offs=tuple(
            (event.day, date.fromisoformat(event.details["last"]))
            for event in events
            if event.kind == "keep_off"
        ),
        ahead=Ahead(past, weather.eto_ahead[: days - past], weather.rain_ahead[: days - past]),
    )


class Water(NamedTuple):
    """What came on a block by day (days,) [mm]: gross and net irrigation with the fraction it
    wetted, NaN without, and rain, the field's own gauge before the station's. Applications to parts
    of a block on one day are taken as to different parts (working value)."""

    gross: Floats
    net: Floats
    wetted: Floats
    rain: Floats


def _water(block: BlockRow, events: list[Standing], start: date, rain: Floats) -> Water:
    water = Water(np.zeros(rain.size), np.zeros(rain.size), np.full(rain.size, np.nan), rain.copy())
    fraction = agronomy.wetted_fraction(block.system)
    gauge: dict[int, float] = {}
    for event in events:
        place = (event.day - start).days
        if not 0 <= place < rain.size:
            continue
        if event.kind == "rain":
            gauge[place] = gauge.get(place, 0.0) + event.amount
        elif event.kind == "irrigation":
            share = event.details.get("area_share", 1.0)
            gross, net = agronomy.gross_and_net(
                event.amount, event.unit, event.purpose, block.system, block.area_ha, share
            )
            water.gross[place] += gross
            water.net[place] += net
            own = event.details.get("wetted_fraction", fraction)
            before = np.nan_to_num(water.wetted[place])
            water.wetted[place] = min(before + share * own, max(before, own))
    for place, amount in gauge.items():
        water.rain[place] = amount
    return water


def _readings(events: list[Standing], start: date, through: date) -> tuple[Standing, ...]:
    last = through + TODAY
    found = [one for one in events if one.kind == "reading" and start <= one.day <= last]
    return tuple(sorted(found, key=lambda one: (one.day, one.details["hour"], one.event_id)))


def _warmth_before(crop: CropSeason, start: date, weather: FieldWeather) -> float:
    """Degree days before a ledger's first day, from planting or what was last seen before it, at
    most `HISTORY` days back."""
    if crop.degree_days is None:
        return 0.0
    since = agronomy.as_date(crop.planting)
    for day, _, _ in crop.anchors:
        if agronomy.as_date(day) < start:
            since = agronomy.as_date(day)
    since = max(since, start - timedelta(days=HISTORY))
    before = slice(max((since - weather.first).days, 0), max((start - weather.first).days, 0))
    return float(crop.degree_days.daily(weather.tmax[before], weather.tmin[before]).sum())
