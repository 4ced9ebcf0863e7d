"""Station days as arrays on one unbroken axis of days, and the statements that keep them."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date, timedelta
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import case, delete, func, insert, or_, select
from sqlalchemy.orm import Session

from app.science.energy.ladder import USUAL
from app.storage.tables import Contribution, Intake, StationDay

Floats = NDArray[np.float64]
NUMBERS = (
    "tmax",
    "tmin",
    "vapour_pressure",
    "rh_min_used",
    "wind_2m",
    "rain",
    "rn",
    "ra",
    "eto",
)


@dataclass(frozen=True)
class Series:
    """A station's days from `first` on: arrays (days,), NaN and rung 0 where there is no row."""

    first: date
    rung: NDArray[np.int8]
    values: dict[str, Floats]


def read_series(
    session: Session, stations: Sequence[int], first: date, last: date
) -> dict[int, Series]:
    """Series of each station over first..last, both included."""
    days = (last - first).days + 1
    found = {
        station: Series(
            first, np.zeros(days, np.int8), {name: np.full(days, np.nan) for name in NUMBERS}
        )
        for station in stations
    }
    columns = [getattr(StationDay, name) for name in NUMBERS]
    rows = session.execute(
        select(StationDay.station_id, StationDay.day, StationDay.rung, *columns)
        .where(StationDay.station_id.in_(stations))
        .where(StationDay.day.between(first, last))
    )
    for station, day, rung, *numbers in rows:
        series, place = found[station], (day - first).days
        series.rung[place] = rung
        for name, number in zip(NUMBERS, numbers, strict=True):
            if number is not None:
                series.values[name][place] = number
    return found


def read_columns(
    session: Session, station: int, first: date, last: date, names: Sequence[str]
) -> tuple[NDArray[np.datetime64], dict[str, Floats]]:
    """Columns of a station's stored days over first..last in time order, NaN for none."""
    rows = session.execute(
        select(StationDay.day, *(getattr(StationDay, name) for name in names))
        .where(StationDay.station_id == station, StationDay.day.between(first, last))
        .order_by(StationDay.day)
    ).all()
    table = np.array([tuple(row)[1:] for row in rows], dtype=np.float64).reshape(-1, len(names))
    return (
        np.array([row.day for row in rows], dtype="datetime64[D]"),
        {name: table[:, place] for place, name in enumerate(names)},
    )


PAST_YEARS = ("eto", "rain")


def read_past_years(
    session: Session,
    stations: Sequence[int],
    until: date,
    *,
    years: int,
    before: int,
    after: int,
    recent: int,
) -> dict[int, Series]:
    """What each station had around the date in past years, on one axis of days up to `until`.

    Only days from `before` days before each anniversary of `until` to `after` days after it are
    read, and the last `recent` days; the others are NaN, and so is reference ET that itself
    rests on the usual for the date. `rung` stays 0.
    """
    anniversaries = [_years_before(until, back) for back in range(1, years + 1)]
    first = anniversaries[-1] - timedelta(days=before)
    days = (until - first).days + 1
    found = {
        station: Series(
            first, np.zeros(days, np.int8), {name: np.full(days, np.nan) for name in PAST_YEARS}
        )
        for station in stations
    }
    near = [
        StationDay.day.between(day - timedelta(days=before), day + timedelta(days=after))
        for day in anniversaries
    ]
    near.append(StationDay.day.between(until - timedelta(days=recent), until))
    eto = case((StationDay.rung != USUAL, StationDay.eto))
    rows = session.execute(
        select(StationDay.station_id, StationDay.day, eto, StationDay.rain)
        .where(StationDay.station_id.in_(stations))
        .where(or_(*near))
    )
    for station, day, *numbers in rows:
        place = (day - first).days
        for name, number in zip(PAST_YEARS, numbers, strict=True):
            if number is not None:
                found[station].values[name][place] = number
    return found


def _years_before(day: date, years: int) -> date:
    """The same date in an earlier year; 29 February becomes the 28th."""
    try:
        return day.replace(year=day.year - years)
    except ValueError:
        return day.replace(year=day.year - years, day=28)


def last_days(session: Session, on: date) -> dict[int, date]:
    """The last day up to `on` each station has sent rows for; a logger's clock may run ahead."""
    return {
        station: day
        for station, day in session.execute(
            select(Contribution.station_id, func.max(Contribution.day))
            .join(Intake, Intake.id == Contribution.intake_id)
            .where(Intake.state == "applied", Contribution.day <= on)
            .group_by(Contribution.station_id)
        )
    }


def applied_packs(
    session: Session, station: int, first: date, last: date, leaving_out: int | None = None
) -> list[bytes]:
    """Packed rows of a station's applied intakes over first..last, in the order of applying."""
    wanted = (
        select(Contribution.data)
        .join(Intake, Intake.id == Contribution.intake_id)
        .where(Contribution.station_id == station, Contribution.day.between(first, last))
        .where(Intake.state == "applied")
        .order_by(Intake.applied_order, Contribution.day)
    )
    if leaving_out is not None:
        wanted = wanted.where(Intake.id != leaving_out)
    return list(session.scalars(wanted))


def days_with_rows(session: Session, station: int, since: date) -> tuple[date, date] | None:
    """First and last day to compute from `since` on: the last with readings, and the first with
    readings, or the day after the last one kept, so that a gap between them has its rows."""
    first, last = session.execute(
        select(func.min(Contribution.day), func.max(Contribution.day))
        .join(Intake, Intake.id == Contribution.intake_id)
        .where(Contribution.station_id == station, Contribution.day >= since)
        .where(Intake.state == "applied")
    ).one()
    if first is None:
        return None
    kept = session.scalar(
        select(func.max(StationDay.day)).where(
            StationDay.station_id == station, StationDay.day < since
        )
    )
    return (first if kept is None else min(first, kept + timedelta(days=1))), last


def replace_station_days(
    session: Session, station: int, since: date, rows: Iterable[dict[str, Any]]
) -> int:
    """Put a station's days from `since` on in place of what was there; returns how many."""
    session.execute(
        delete(StationDay).where(StationDay.station_id == station, StationDay.day >= since)
    )
    many = list(rows)
    if many:
        session.execute(insert(StationDay), many)
    return len(many)


def day_range(first: date, days: int) -> list[date]:
    """`days` dates from `first` on."""
    return [first + timedelta(days=step) for step in range(days)]


def numbers(values: Any) -> list[float | None]:
    """Floats for the database: None for NaN."""
    return [None if value != value else value for value in np.asarray(values, float).tolist()]
