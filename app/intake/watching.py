"""The rows of days as the sensors' watch wants them: laid out as read, before any check."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from app.intake.grid import form_vapour_pressure, lay_out_as_read
from app.intake.model import Rows
from app.intake.pack import SECONDS_A_DAY
from app.science.energy.day_checks import Finding
from app.science.energy.day_rows import day_rows
from app.science.energy.records import Site
from app.science.energy.watch import watch_rows

COARSEST_S = 3600
"""Rows further apart than this say too little of a morning to be watched."""


@dataclass(frozen=True)
class Watched:
    """What watching rows gave: the rows with covered longwave replaced, findings and the widening
    of net radiation [MJ m-2 d-1], (days,) each."""

    rows: Rows
    findings: tuple[Finding, ...]
    widening: NDArray[np.float64]


def watched(
    rows: Rows, site: Site, days: NDArray[np.datetime64], surface: str | None = None
) -> Watched:
    """Watch a station's radiometers over `days` (consecutive) on its finest rows.

    `rows` as people have judged them; `surface` as declared. Covered longwave of at most a quarter
    of a day is replaced by the model, more is taken out. Nothing is watched on rows further apart
    than an hour.
    """
    wanted = np.asarray(days, "datetime64[D]").astype(np.int64)
    nothing = Watched(rows, (), np.zeros(wanted.size))
    steps = np.unique(rows.interval_s) if len(rows) else np.array([SECONDS_A_DAY])
    step = int(steps[0])
    if step > COARSEST_S or SECONDS_A_DAY % step or wanted.size == 0:
        return nothing
    fine = rows.interval_s == step
    part = Rows(
        rows.instant[fine],
        rows.line[fine],
        rows.interval_s[fine],
        {name: column[fine] for name, column in rows.values.items()},
    )
    grid, place = lay_out_as_read(part, site, wanted)
    form_vapour_pressure(grid)
    laid = day_rows(site, grid.day.astype("datetime64[D]"), grid.night.shape[1])
    watch = watch_rows(site, laid, grid.values, surface=surface)
    at = np.searchsorted(grid.day, wanted)
    findings = tuple(
        replace(found, where=found.where[at], figure=found.figure[at]) for found in watch.findings
    )
    widening = watch.rn_widening(grid.day.size)[at]
    if watch.replaced is not None and "longwave_down" in rows.values:
        told = watch.replaced.longwave_down.ravel()
        column = rows.values["longwave_down"].copy()
        known = place >= 0
        given = np.flatnonzero(fine)[known]
        column[given] = np.where(np.isnan(column[given]), np.nan, told[place[known]])
        rows = replace(rows, values={**rows.values, "longwave_down": column})
    return Watched(rows, findings, widening)
