"""What measured energy is worth on the fields that hang on a station, since planting.

On each day a measured rung served, the model of rung 5 would have given another reference ET; the
crop would have been asked for its coefficient of that day times the difference.
"""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from datetime import date

import numpy as np
from sqlalchemy.orm import Session

from app.science.energy.compare import acre_feet, volume_m3
from app.science.energy.reference_et import eto_from_parts
from app.storage.pages_field import station_days
from app.storage.saved import FedDay, fed_days
from app.storage.scope import Farms

MEASURED_RUNGS = (1, 2, 3)
NEEDS = ("tmax", "tmin", "vapour_pressure", "rn", "rn_modelled", "wind_2m")


@dataclass(frozen=True)
class FieldSaved:
    """One field: what the model would have asked for more [mm over its area, m3], and the days."""

    key: str
    name: str
    area_ha: float
    days: int
    mm: float
    m3: float


@dataclass(frozen=True)
class Saved:
    """All fields of a station, the largest volume first."""

    fields: tuple[FieldSaved, ...]

    @property
    def area_ha(self) -> float:
        """Area of the fields with a day that counts."""
        return sum(field.area_ha for field in self.fields)

    @property
    def m3(self) -> float:
        """What the model would have asked for more on all of them; negative for less."""
        return sum(field.m3 for field in self.fields)

    @property
    def acre_feet(self) -> float:
        """The same volume in acre-feet."""
        return float(acre_feet(self.m3))


def more_by_model(
    session: Session, station: int, elevation_m: float, first: date, last: date
) -> dict[date, float]:
    """ETo by the model less ETo as used [mm], all else the same, of days with a measured rung."""
    days = [
        day
        for day in station_days(session, [station], first, last)
        if day["rung"] in MEASURED_RUNGS and all(day[name] is not None for name in NEEDS)
    ]
    part = {name: np.array([day[name] for day in days], dtype=np.float64) for name in NEEDS}
    air = (part["tmax"], part["tmin"], part["vapour_pressure"])
    modelled = eto_from_parts(*air, part["rn_modelled"], part["wind_2m"], elevation_m)[0]
    used = eto_from_parts(*air, part["rn"], part["wind_2m"], elevation_m)[0]
    more = (modelled - used).tolist()
    return {day["day"]: by for day, by in zip(days, more, strict=True) if np.isfinite(by)}


def add_up(fed: Iterable[FedDay], more: Mapping[date, float]) -> Saved:
    """Sum of Kc as it was times the difference of ETo, by field; a field's mm is over its area.

    Arguments: `fed`, ledger days; `more`, ETo by the model less ETo used [mm] by day. Days without
    a difference count for nothing, fields without such a day are left out.
    """
    names: dict[str, str] = {}
    days: dict[str, set[date]] = {}
    areas: dict[str, dict[int, float]] = {}
    volumes: dict[str, float] = {}
    for row in fed:
        if row.day not in more:
            continue
        names[row.field_key] = row.field_name
        days.setdefault(row.field_key, set()).add(row.day)
        areas.setdefault(row.field_key, {})[row.block_id] = row.area_ha
        volume = float(volume_m3(row.kc_actual * more[row.day], row.area_ha))
        volumes[row.field_key] = volumes.get(row.field_key, 0.0) + volume
    fields = []
    for key, name in names.items():
        area = sum(areas[key].values())
        depth = volumes[key] / float(volume_m3(1.0, area)) if area else 0.0
        fields.append(FieldSaved(key, name, area, len(days[key]), depth, volumes[key]))
    return Saved(tuple(sorted(fields, key=lambda field: (-abs(field.m3), field.name))))


def measuring_saved(
    session: Session,
    station: int,
    elevation_m: float,
    today: date,
    farms: Farms = None,
    field: str | None = None,
) -> Saved:
    """What the model would have asked for more since planting, by field; of some farms, or one."""
    fed = fed_days(session, station, today, farms, field)
    if not fed:
        return Saved(())
    every = [row.day for row in fed]
    return add_up(fed, more_by_model(session, station, elevation_m, min(every), max(every)))
