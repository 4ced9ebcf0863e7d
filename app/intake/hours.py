"""Rows of at most an hour as the hours of station days, for reference ET by the hour."""

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from app.intake.grid import lay_out
from app.intake.model import Rows
from app.science.energy.hourly import HourlyWeather, hours_from_rows
from app.science.energy.records import Site

HOUR_S = 3600


def hours_of(
    rows: Rows,
    site: Site,
    days: NDArray[np.datetime64],
    good: Mapping[str, NDArray[np.bool_]] | None = None,
) -> HourlyWeather:
    """Hourly weather of `days` (consecutive): what row checks set aside is NaN, gaps of at most
    two hours are bridged. Steps that make up hours are taken apart, the finest first; `good`
    (rows,) by quantity as for `aggregate`."""
    weather = HourlyWeather.missing(np.asarray(days, "datetime64[D]"))
    wanted = weather.date.astype(np.int64)
    for step in np.unique(rows.interval_s).tolist():
        if step > HOUR_S or HOUR_S % step or wanted.size == 0:
            continue
        here = rows.interval_s == step
        part = Rows(
            rows.instant[here],
            rows.line[here],
            rows.interval_s[here],
            {name: column[here] for name, column in rows.values.items()},
        )
        trusted = {name: mask[here] for name, mask in (good or {}).items()}
        grid = lay_out(part, site, wanted, trusted)
        at = np.searchsorted(grid.day, wanted)
        finer = hours_from_rows(weather.date, {n: v[at] for n, v in grid.values.items()})
        weather = weather.or_else(finer)
    return weather
