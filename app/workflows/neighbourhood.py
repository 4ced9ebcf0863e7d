"""Which stations stand near which, and what they measured."""

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy.orm import Session

from app.science import Floats
from app.science.energy.neighbours import neighbour_mean, neighbour_ratio, neighbour_weights
from app.storage.records import read_record

EARTH_KM = 6371.0


class Neighbourhood:
    """The stations of the book by number, and the weight each has for another."""

    def __init__(self, details: dict[int, dict[str, Any]]) -> None:
        self.details = details
        self.numbers = {part["key"]: number for number, part in details.items()}

    def of(self, station: int) -> dict[int, float]:
        """Weight of each neighbour that speaks for a station, by number."""
        here = self.details[station]
        others = [number for number in self.details if number != station]
        away = [kilometres(here, self.details[number]) for number in others]
        higher = [self.details[n]["elevation_m"] - here["elevation_m"] for n in others]
        weights = neighbour_weights(away, higher)
        return {
            number: float(weight)
            for number, weight in zip(others, weights, strict=True)
            if weight > 0
        }

    def teacher(self, station: int) -> int | None:
        """The station whose measured days teach this one's model, as the book names it."""
        key = self.details[station].get("teacher")
        return None if key is None else self.numbers.get(key)

    def measured(
        self, session: Session, station: int, days: NDArray[np.datetime64]
    ) -> tuple[Floats, Floats]:
        """Clear-sky ratio [-] and wind at 2 m [m s-1] as neighbours measured them, (days,)."""
        weights = self.of(station)
        none = np.full(days.size, np.nan)
        if not weights:
            return none, none
        first = days[0].astype("datetime64[D]").item()
        last = (days[-1] + 1).astype("datetime64[D]").item()
        records = [read_record(session, number, first, last) for number in weights]
        heavy = np.array(list(weights.values()))
        ratios = np.array([record.on(days, record.clear_sky_ratio) for record in records])
        winds = np.array([record.on(days, record.measured_wind) for record in records])
        return neighbour_ratio(ratios, heavy)[0], neighbour_mean(winds, heavy)


def kilometres(here: dict[str, Any], there: dict[str, Any]) -> float:
    """Great-circle distance of two stations (haversine formula) [km]."""
    a, b = math.radians(here["latitude_deg"]), math.radians(there["latitude_deg"])
    east = math.radians(there["longitude_deg"] - here["longitude_deg"])
    h = math.sin((b - a) / 2) ** 2 + math.cos(a) * math.cos(b) * math.sin(east / 2) ** 2
    return 2 * EARTH_KM * math.asin(math.sqrt(h))
