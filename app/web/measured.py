"""Measured against modelled net radiation: in MJ and in mm of reference ET."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from app.science import Floats
from app.science.energy.reference_et import eto_from_parts

NEEDS = ("tmax", "tmin", "vapour_pressure", "wind_2m", "rn_measured", "rn_modelled")


@dataclass(frozen=True)
class Comparison:
    """Sums over the days that have both; `eto_mm` is what the model alone would add to ETo."""

    days: int
    both: int
    measured_mj: float
    modelled_mj: float
    more: float
    bias_mj: float
    rmse_mj: float
    eto_mm: float


def compare(days: Sequence[Mapping[str, Any]], elevation_m: float) -> Comparison | None:
    """Measured against modelled over station days; None where no day has both."""
    rows = [day for day in days if all(day[name] is not None for name in NEEDS)]
    if not rows:
        return None
    values = {name: np.array([row[name] for row in rows], dtype=np.float64) for name in NEEDS}
    measured, modelled = values["rn_measured"], values["rn_modelled"]

    def eto(rn: Floats) -> Floats:
        return eto_from_parts(
            values["tmax"],
            values["tmin"],
            values["vapour_pressure"],
            rn,
            values["wind_2m"],
            elevation_m,
        )[0]

    total = float(measured.sum())
    return Comparison(
        days=len(days),
        both=len(rows),
        measured_mj=total,
        modelled_mj=float(modelled.sum()),
        more=float(modelled.sum()) / total - 1.0 if total else 0.0,
        bias_mj=float((modelled - measured).mean()),
        rmse_mj=float(np.sqrt(((modelled - measured) ** 2).mean())),
        eto_mm=float(np.nansum(eto(modelled) - eto(measured))),
    )


def by_month(days: Sequence[Mapping[str, Any]], elevation_m: float) -> list[tuple[str, Comparison]]:
    """The comparison for each month that has days with both."""
    months = sorted({(day["day"].year, day["day"].month) for day in days})
    found = []
    for year, month in months:
        of_month = [d for d in days if (d["day"].year, d["day"].month) == (year, month)]
        comparison = compare(of_month, elevation_m)
        if comparison is not None:
            found.append((f"{year}-{month:02d}", comparison))
    return found
