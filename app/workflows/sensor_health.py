"""A station's sensors held against themselves over months, and against their neighbours.

Nothing is stored: it is told from the station days each time, for people to act on.
"""

from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np
from sqlalchemy.orm import Session

from app.science import Bools, Days, Floats
from app.science.energy.drift import Drift, bright_days, drift, expected_level
from app.science.energy.humidity import dew_point
from app.science.energy.neighbours import NeighbourCheck, against_neighbours
from app.science.energy.tilt import LEAST_DAYS
from app.storage.judgement import sensor_log
from app.storage.ledgers import every_station
from app.storage.series import read_columns
from app.workflows.neighbourhood import Neighbourhood

LOOK_BACK = timedelta(days=800)
"""Two seasons and more: past years' clear days tell what season does to the level."""
DRIFT_DAYS, RECENT_DAYS, NEIGHBOUR_DAYS = 200, 30, 120
RATIO_SPREAD, TEMPERATURE_SPREAD = 0.05, 0.7
"""Below these, agreement with neighbours says nothing: clear-sky ratio [-], temperature [K]."""
_OWN = (
    "rh_max",
    "tmin",
    "vapour_pressure",
    "clear_level",
    "clear_tilt_deg",
    "clear_clock_min",
    "rs",
    "rso",
    "shortwave_down",
)
_SHARED = ("rs", "rso", "tmax", "shortwave_down")


@dataclass(frozen=True)
class Lean:
    """Clear days of the last 30 against those before: `days` and `before` count them; medians of
    the lean to the east [degrees], the level [-] and the clock [minutes ahead], NaN if too few."""

    days: int
    before: int
    tilt: float
    usual_tilt: float
    level: float
    usual_level: float
    clock: float


@dataclass(frozen=True)
class Apart:
    """Days of the last 30 on which a station departed from its neighbours: the last such day, by
    how many robust spreads, and the difference from what is usual."""

    quantity: str
    days: int
    last: date
    spreads: float
    difference: float


@dataclass(frozen=True)
class Dryness:
    """Whether the air over the sensors is that of watered ground, over `days` of the last 30:
    medians of the highest relative humidity [%] and of the lowest temperature above the dew point
    [K]."""

    days: int
    rh_max: float
    above_dew_point: float


@dataclass(frozen=True)
class Health:
    """What months say of a station's sensors. `since`: the last levelling or calibration, which
    the past is looked at from; None for none."""

    drift: Drift | None
    lean: Lean | None
    apart: tuple[Apart, ...]
    neighbours: int
    since: date | None
    dryness: Dryness | None = None


def sensor_health(session: Session, station: int, today: date) -> Health:
    """Drift and lean of the pyranometer, and days apart from the neighbours, as of a morning."""
    yesterday = today - timedelta(days=1)
    days, own = read_columns(session, station, today - LOOK_BACK, yesterday, _OWN)
    put_right = [
        entry.day
        for entry in sensor_log(session, station)
        if entry.kind in ("levelling", "calibration", "moved") and entry.day <= today
    ]
    since = max(put_right, default=None)
    around = Neighbourhood(every_station(session))
    weights = around.of(station)
    return Health(
        drift=_drift(days, own, since, today),
        lean=_lean(days, own, since, today),
        apart=_apart(session, station, weights, today),
        neighbours=len(weights),
        since=since,
        dryness=_dryness(days, own, today),
    )


def _dryness(days: Days, own: dict[str, Floats], today: date) -> Dryness | None:
    late = days >= np.datetime64(today - timedelta(days=RECENT_DAYS))
    ea = np.where(own["vapour_pressure"] > 0.0, own["vapour_pressure"], np.nan)
    above = own["tmin"] - dew_point(ea)
    known = late & ~np.isnan(own["rh_max"]) & ~np.isnan(above)
    if known.sum() < LEAST_DAYS:
        return None
    return Dryness(
        int(known.sum()), float(np.median(own["rh_max"][known])), float(np.median(above[known]))
    )


def _drift(days: Days, own: dict[str, Floats], since: date | None, today: date) -> Drift | None:
    """Drift of the last 200 days, or since it was put right; None without a pyranometer."""
    if np.isnan(own["shortwave_down"]).all():
        return None
    clear, level = ~np.isnan(own["clear_level"]), own["clear_level"]
    if not clear.any():  # only daily sums: the brightest days serve
        level = own["rs"] / own["rso"]
        clear = bright_days(days, level)
    expected = expected_level(days, level, clear)
    begin = max(since or date.min, today - timedelta(days=DRIFT_DAYS))
    late = days >= np.datetime64(begin)
    known = late & clear & ~np.isnan(expected)
    if known.sum() >= (late & clear).sum() / 2 and known.any():
        return drift(days[late], level[late], known[late], expected[late])
    return drift(days[late], level[late], clear[late])


def _lean(days: Days, own: dict[str, Floats], since: date | None, today: date) -> Lean | None:
    clear: Bools = ~np.isnan(own["clear_tilt_deg"])
    if since is not None:
        clear &= days >= np.datetime64(since)
    late = clear & (days >= np.datetime64(today - timedelta(days=RECENT_DAYS)))
    before = clear & ~late
    if not clear.any():
        return None
    return Lean(
        days=int(late.sum()),
        before=int(before.sum()),
        tilt=_median(own["clear_tilt_deg"], late),
        usual_tilt=_median(own["clear_tilt_deg"], before),
        level=_median(own["clear_level"], late),
        usual_level=_median(own["clear_level"], before),
        clock=_median(own["clear_clock_min"], late),
    )


def _median(values: Floats, where: Bools) -> float:
    known = values[where & ~np.isnan(values)]
    return float(np.median(known)) if known.size >= LEAST_DAYS else float("nan")


def _apart(
    session: Session, station: int, weights: dict[int, float], today: date
) -> tuple[Apart, ...]:
    if not weights:
        return ()
    first, last = today - timedelta(days=NEIGHBOUR_DAYS), today - timedelta(days=1)
    axis = np.datetime64(first) + np.arange(NEIGHBOUR_DAYS)
    laid = {
        number: _laid(axis, *read_columns(session, number, first, last, _SHARED))
        for number in (station, *weights)
    }
    found = []
    for quantity, name, least in (
        ("shortwave_down", "ratio", RATIO_SPREAD),
        ("air_temperature_max", "tmax", TEMPERATURE_SPREAD),
    ):
        check = against_neighbours(
            laid[station][name],
            np.array([laid[number][name] for number in weights]),
            np.array(list(weights.values())),
            least,
        )
        if told := _told(quantity, axis, check):
            found.append(told)
    return tuple(found)


def _laid(axis: Days, days: Days, columns: dict[str, Floats]) -> dict[str, Floats]:
    """Clear-sky ratio and highest temperature on an unbroken axis of days."""
    place = (days - axis[0]).astype(np.int64)
    ratio, tmax = np.full(axis.size, np.nan), np.full(axis.size, np.nan)
    measured = ~np.isnan(columns["shortwave_down"])
    ratio[place] = np.where(measured, columns["rs"] / columns["rso"], np.nan)
    tmax[place] = columns["tmax"]
    return {"ratio": ratio, "tmax": tmax}


def _told(quantity: str, axis: Days, check: NeighbourCheck) -> Apart | None:
    late = np.flatnonzero(check.suspect[-RECENT_DAYS:]) + axis.size - RECENT_DAYS
    if not late.size:
        return None
    last = int(late[-1])
    return Apart(
        quantity,
        int(late.size),
        date.fromisoformat(str(axis[last])),
        float(check.spreads[last]),
        float(check.difference[last] - check.usual[last]),
    )
