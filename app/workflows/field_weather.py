"""The weather of fields: each variable from the station that feeds it, on one axis of days."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy.orm import Session

from app.science import Floats
from app.science.energy.ladder import USUAL
from app.science.energy.reference_et import eto_from_parts
from app.science.energy.sun import day_of_year, extraterrestrial_daily
from app.science.energy.usual import HALF_WINDOW, usual_for_date
from app.science.outlook.sequences import (
    MOST_YEARS,
    NEAR_DATE,
    RECENT_REACH,
    Sequences,
    past_sequences,
)
from app.science.outlook.usual import RECORD_DAYS, fill_gaps, usual_ahead
from app.storage.ledgers import SourceRow, read_sources, station_details
from app.storage.series import read_past_years, read_series

HORIZON = 14
"""Days ahead that advice looks at."""


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


class FieldsWeather:
    """Weather by field, computed once for each distinct set of sources."""

    def __init__(
        self,
        session: Session,
        fields: Iterable[int],
        first: date,
        through: date,
    ) -> None:
        sources = _sources(session, set(fields))
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
        """The weather of a field, by number, from `first` through `HORIZON` days ahead."""
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

    def _past(self, energy: int, rain: int) -> Past:
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


def _sources(session: Session, fields: set[int]) -> dict[int, tuple[SourceRow, ...]]:
    found: dict[int, list[SourceRow]] = {field: [] for field in fields}
    for row in read_sources(session, sorted(fields)):
        found[row.field_id].append(row)
    return {field: tuple(rows) for field, rows in found.items()}


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
