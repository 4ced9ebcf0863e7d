"""A station's stored days as a record to learn from, and what its neighbours measured."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import select
from sqlalchemy.orm import Session

from app.storage.tables import StationDay

Floats = NDArray[np.float64]
COLUMNS = (
    "shortwave_down",
    "shortwave_up",
    "tmax",
    "tmin",
    "vapour_pressure",
    "rn_measured",
    "rn_modelled",
    "rs",
    "rso",
    "wind_2m",
)
MEASURED_SHORTWAVE = (1, 2, 4, 5)
"""Rungs on which `rs` is the station's own, passed measurement."""


@dataclass(frozen=True)
class Record:
    """Days in time order with their columns, NaN for none, and rungs; all (days,)."""

    date: NDArray[np.datetime64]
    rung: NDArray[np.int8]
    wind_rung: NDArray[np.int8]
    values: dict[str, Floats]

    @property
    def clear_sky_ratio(self) -> Floats:
        """Measured Rs/Rso [-], NaN where shortwave was not measured or not believed."""
        own = np.isin(self.rung, MEASURED_SHORTWAVE)
        return np.where(own, self.values["rs"] / self.values["rso"], np.nan)

    @property
    def measured_wind(self) -> Floats:
        """Measured wind at 2 m [m s-1], NaN where it was assumed or taken from elsewhere."""
        return np.where(self.wind_rung == 1, self.values["wind_2m"], np.nan)

    def joined(self, later: "Record") -> "Record":
        """This record and a later one, one after the other."""
        return Record(
            np.concatenate([self.date, later.date]),
            np.concatenate([self.rung, later.rung]),
            np.concatenate([self.wind_rung, later.wind_rung]),
            {
                name: np.concatenate([values, later.values[name]])
                for name, values in self.values.items()
            },
        )

    def on(self, days: NDArray[np.datetime64], values: Floats) -> Floats:
        """Values of the record on given days, NaN where it has no such day."""
        found = np.full(days.size, np.nan)
        if self.date.size:
            place = np.minimum(np.searchsorted(self.date, days), self.date.size - 1)
            there = self.date[place] == days
            found[there] = values[place[there]]
        return found


def read_record(
    session: Session, station: int, first: date | None = None, before: date | None = None
) -> Record:
    """A station's stored days from `first` on and before `before`."""
    wanted = select(
        StationDay.day,
        StationDay.rung,
        StationDay.wind_rung,
        *(getattr(StationDay, name) for name in COLUMNS),
    ).where(StationDay.station_id == station)
    if first is not None:
        wanted = wanted.where(StationDay.day >= first)
    if before is not None:
        wanted = wanted.where(StationDay.day < before)
    rows = [tuple(row) for row in session.execute(wanted.order_by(StationDay.day))]
    table = np.array([row[1:] for row in rows], dtype=np.float64).reshape(-1, len(COLUMNS) + 2)
    return Record(
        np.array([row[0] for row in rows], dtype="datetime64[D]"),
        table[:, 0].astype(np.int8),
        table[:, 1].astype(np.int8),
        {name: table[:, place + 2] for place, name in enumerate(COLUMNS)},
    )


def needs_neighbours(session: Session, stations: Sequence[int], since: date) -> set[int]:
    """Stations with a day, from `since` on, on which shortwave or wind was not measured, or the
    longwave window may have been covered: there they lean on what neighbours saw."""
    return set(
        session.scalars(
            select(StationDay.station_id)
            .where(StationDay.station_id.in_(stations), StationDay.day >= since)
            .where(
                StationDay.rung.not_in(MEASURED_SHORTWAVE)
                | (StationDay.wind_rung != 1)
                | StationDay.flags.contains("window_")
            )
            .distinct()
        )
    )
