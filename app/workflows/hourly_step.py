"""Reference ET by the hour, for stations whose book asks for it."""

from dataclasses import dataclass
from datetime import date, timedelta
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy.orm import Session

from app.science import Bools, Floats
from app.science.energy.hourly import RATIO_DAYS, HourlyDays, et_by_hours
from app.storage.series import numbers, read_columns

BY_STEP = ("eto_daily", "etr_daily", "eto_hours", "etr_hours")


def hourly(details: dict[str, Any]) -> bool:
    """Whether a station's reference ET goes by the hour."""
    return bool(details.get("et_step") == "hourly")


@dataclass(frozen=True)
class Steps:
    """The days before, whose hours tell what an incomplete day is worth; all (days,)."""

    days: NDArray[np.datetime64]
    columns: dict[str, Floats]

    @classmethod
    def before(cls, session: Session, station: int, first: date) -> "Steps":
        """A station's stored days before `first`, as many as the ratio looks back on."""
        since = first - timedelta(days=RATIO_DAYS)
        days, columns = read_columns(session, station, since, first - timedelta(days=1), BY_STEP)
        return cls(days, columns)

    def stepped(self, rows: list[dict[str, Any]], hours: HourlyDays, inside: Bools) -> "Steps":
        """Put ET by hours into the rows of station days, in place; the days `inside` join these.

        What the daily equation gave is kept beside it, and the flag of an incomplete day stands
        with the day's others.
        """
        daily = {
            "eto_daily": _column(rows, "eto"),
            "etr_daily": _column(rows, "etr"),
            "eto_hours": np.where(hours.rung > 0, hours.eto_sum, np.nan),
            "etr_hours": np.where(hours.rung > 0, hours.etr_sum, np.nan),
        }
        joined = Steps(
            np.concatenate([self.days, hours.date[inside]]),
            {name: np.concatenate([self.columns[name], daily[name][inside]]) for name in BY_STEP},
        )
        told = et_by_hours(joined.days, *(joined.columns[n] for n in _ORDER))
        first = self.days.size
        places = np.flatnonzero(inside)
        eto, etr = numbers(told.eto[first:]), numbers(told.etr[first:])
        for n, place in enumerate(places.tolist()):
            row = rows[place]
            row["eto"], row["etr"] = eto[n], etr[n]
            row["flags"] = " ".join(filter(None, [row["flags"], told.flags[first + n]]))
            for name in BY_STEP:
                row[name] = numbers(daily[name][place : place + 1])[0]
        return joined


_ORDER = ("eto_hours", "etr_hours", "eto_daily", "etr_daily")


def _column(rows: list[dict[str, Any]], name: str) -> Floats:
    return np.array([np.nan if row[name] is None else row[name] for row in rows])
