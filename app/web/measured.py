"""Measured against modelled net radiation of station days: in MJ and in mm of reference ET."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from app.science import Floats
from app.science.energy.compare import (
    Comparison,
    Pairs,
    compare_by_month,
    compare_by_season,
    pairs,
)
from app.science.energy.compare import compare as compare_pairs

Row = Mapping[str, Any]
QUARTERS = {
    "DJF": "December to February",
    "MAM": "March to May",
    "JJA": "June to August",
    "SON": "September to November",
}


def pairs_of(days: Sequence[Row], elevation_m: float) -> Pairs:
    """Net radiation of station days both ways, and the reference ET either would give."""

    def column(name: str) -> Floats:
        return np.array([np.nan if d[name] is None else d[name] for d in days], dtype=np.float64)

    return pairs(
        np.array([day["day"] for day in days], dtype="datetime64[D]"),
        column("rn_measured"),
        column("rn_modelled"),
        column("tmax"),
        column("tmin"),
        column("vapour_pressure"),
        column("wind_2m"),
        elevation_m,
    )


def compare(days: Sequence[Row], elevation_m: float) -> Comparison | None:
    """Measured against modelled over station days; None where no day has both."""
    if not days:
        return None
    found = compare_pairs(pairs_of(days, elevation_m))
    return found if found.both else None


def by_month(days: Sequence[Row], elevation_m: float) -> list[tuple[str, Comparison]]:
    """The comparison for each month that has days with both."""
    if not days:
        return []
    return [(str(month), found) for month, found in compare_by_month(pairs_of(days, elevation_m))]


def by_season(days: Sequence[Row], elevation_m: float) -> list[tuple[str, Comparison]]:
    """The comparison for each quarter of the year that has days with both, named by its months."""
    if not days:
        return []
    return [
        (f"{QUARTERS[name[-3:]]} {name[:4]}", found)
        for name, found in compare_by_season(pairs_of(days, elevation_m))
    ]
