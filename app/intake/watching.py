"""The rows of days as the sensors' watch wants them: laid out as read, before any check."""

from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from app.intake.grid import Bools, form_vapour_pressure, lay_out_as_read
from app.intake.model import Floats, Rows
from app.intake.pack import SECONDS_A_DAY
from app.science.energy.day_checks import Finding
from app.science.energy.day_rows import day_rows
from app.science.energy.records import Site
from app.science.energy.watch import watch_rows

COARSEST_S = 3600
"""Rows further apart than this say too little of a morning to be watched."""
SHAPE = {"clear_level": "level", "clear_tilt_deg": "tilt_east", "clear_clock_min": "clock"}
"""What a clear day's curve says, under the names it is kept by."""


@dataclass(frozen=True)
class Watched:
    """What watching rows gave: the rows with covered longwave replaced, findings, the widening of
    net radiation [MJ m-2 d-1] (days,), and what clear days' curves say (days,), NaN elsewhere."""

    rows: Rows
    findings: tuple[Finding, ...]
    widening: NDArray[np.float64]
    shape: dict[str, Floats] = field(default_factory=dict)


def watched(
    rows: Rows,
    site: Site,
    days: NDArray[np.datetime64],
    surface: str | None = None,
    open_sky: Bools | None = None,
) -> Watched:
    """Watch a station's radiometers over `days` (consecutive), each day on its finest rows.

    `rows` as people have judged them; `surface` as declared; `open_sky` (days,) where neighbours
    saw that it was. Covered longwave of at most a quarter
    of a day is replaced by the model, more is taken out. Nothing is watched on rows further apart
    than an hour.
    """
    wanted = np.asarray(days, "datetime64[D]").astype(np.int64)
    none = {name: np.full(wanted.size, np.nan) for name in SHAPE}
    seen = Watched(rows, (), np.zeros(wanted.size), none)
    if not len(rows) or wanted.size == 0:
        return seen
    finest = _finest_of_day(rows, site)
    for step in np.unique(finest).tolist():
        if step <= COARSEST_S and SECONDS_A_DAY % step == 0:
            here = (rows.interval_s == step) & (finest == step)
            seen = _watch_step(seen, site, wanted, here, surface, open_sky)
    return seen


def _finest_of_day(rows: Rows, site: Site) -> NDArray[np.int64]:
    """The finest step [s] on the local standard day of each row, (rows,)."""
    middle = rows.instant + round(site.utc_offset_h * 3600) - rows.interval_s / 2
    _, place = np.unique(np.floor(middle / SECONDS_A_DAY), return_inverse=True)
    finest = np.full(place.max() + 1, SECONDS_A_DAY, np.int64)
    np.minimum.at(finest, place, rows.interval_s.astype(np.int64))
    return np.asarray(finest[place])


def _watch_step(
    seen: Watched,
    site: Site,
    wanted: NDArray[np.int64],
    here: NDArray[np.bool_],
    surface: str | None,
    open_sky: Bools | None,
) -> Watched:
    """What the rows of one step add to what was seen; other days have no such rows."""
    rows = seen.rows
    part = Rows(
        rows.instant[here],
        rows.line[here],
        rows.interval_s[here],
        {name: column[here] for name, column in rows.values.items()},
    )
    grid, place = lay_out_as_read(part, site, wanted)
    form_vapour_pressure(grid)
    laid = day_rows(site, grid.day.astype("datetime64[D]"), grid.night.shape[1])
    at = np.searchsorted(grid.day, wanted)
    seen_open = np.zeros(grid.day.size, np.bool_)
    if open_sky is not None:
        seen_open[at] = open_sky
    watch = watch_rows(site, laid, grid.values, surface=surface, open_by_neighbour=seen_open)
    findings = tuple(
        replace(found, where=found.where[at], figure=found.figure[at]) for found in watch.findings
    )
    shape = seen.shape
    if watch.shape is not None:
        told = {name: getattr(watch.shape, of)[at] for name, of in SHAPE.items()}
        shape = {name: np.where(np.isnan(told[name]), shape[name], told[name]) for name in SHAPE}
    if watch.replaced is not None and "longwave_down" in rows.values:
        column = rows.values["longwave_down"].copy()
        known = place >= 0
        given = np.flatnonzero(here)[known]
        longwave = watch.replaced.longwave_down.ravel()[place[known]]
        column[given] = np.where(np.isnan(column[given]), np.nan, longwave)
        rows = replace(rows, values={**rows.values, "longwave_down": column})
    widening = seen.widening + watch.rn_widening(grid.day.size)[at]
    return Watched(rows, (*seen.findings, *findings), widening, shape)
