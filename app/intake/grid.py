"""Rows of one step laid on a grid of days x intervals, and what is done there to single values."""

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from app.intake.model import Floats, Instants, Rows
from app.intake.pack import SECONDS_A_DAY
from app.science.energy.checks import row_checks
from app.science.energy.humidity import (
    atmospheric_pressure,
    saturation_vapour_pressure,
    vapour_pressure_psychrometer,
)
from app.science.energy.records import Site
from app.science.energy.soft_checks import soft_row_checks
from app.science.energy.sun import elevation_at_instants

Bools = NDArray[np.bool_]

LONGEST_GAP_S = 7200  # gaps of at most 2 h are interpolated (METHODS section 2, working value)
OFFSET_FROM = -2.0  # W m-2, night shortwave below it counts as offset (METHODS section 3)
_BETWEEN = (  # quantities that run on between two readings, so a gap can be bridged
    "air_temperature", "relative_humidity", "dew_point", "vapour_pressure", "wind_speed",
    "shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "net_radiation", "pressure",
    "wet_bulb", "soil_heat_flux", "sensible_heat", "latent_heat",
)  # fmt: skip


@dataclass
class Grid:
    """Values by day and interval, shape (days, n); `night` where the sun is down at mid-interval.

    `filled` marks interpolated values; `tally` holds ("what", quantity, reason) -> count per day.
    """

    day: Instants
    interval_s: float
    night: Bools
    values: dict[str, Floats]
    pressure_kpa: float
    filled: dict[str, Bools] = field(default_factory=dict)
    tally: dict[tuple[str, str, str], Floats] = field(default_factory=dict)


def lay_out(
    rows: Rows, site: Site, days: Instants, good: Mapping[str, Bools] | None = None
) -> Grid:
    """Rows of one common step (below a day) on the grid of `days` (sorted) and their neighbours.

    Values that fail a hard check are set aside, those that fail a soft one counted; night offsets
    and small negative shortwave become zero, humidity above 100 % becomes 100, vapour pressure is
    formed row by row, and short gaps are bridged. `good` (rows,) by quantity: values no check sets
    aside.
    """
    grid, place = _empty(rows, site, days)
    kept = place >= 0
    middle = rows.instant[kept] - rows.interval_s[kept] // 2
    values = {name: column[kept].copy() for name, column in rows.values.items()}
    place = place[kept]
    n = grid.night.shape[1]
    for check, failed in row_checks(site, middle, values).items():
        quantity, _, name = check.partition("/")
        if good and quantity in good:
            failed &= ~good[quantity][kept]
        if failed.any():
            grid.tally["set_aside", quantity, name] = _per_day(grid, place[failed] // n)
            values[quantity][failed] = np.nan
    for check, warns in soft_row_checks(site, middle, values).items():
        quantity, _, name = check.partition("/")
        if name != "offset" and warns.any():
            grid.tally["warned", quantity, name] = _per_day(grid, place[warns] // n)
    _place(grid, place, values)
    _zero_night(grid)
    _clip_humidity(grid)
    form_vapour_pressure(grid)
    for name in _BETWEEN:
        if name in grid.values:
            _bridge(grid, name)
    return grid


def lay_out_as_read(rows: Rows, site: Site, days: Instants) -> tuple[Grid, NDArray[np.int64]]:
    """Rows of one common step on the grid as they were read, and each row's place (-1: none)."""
    grid, place = _empty(rows, site, days)
    kept = place >= 0
    _place(grid, place[kept], {name: column[kept] for name, column in rows.values.items()})
    return grid, place


def _place(grid: Grid, place: NDArray[np.int64], values: Mapping[str, Floats]) -> None:
    for name, column in values.items():
        laid = np.full(grid.night.size, np.nan)
        given = ~np.isnan(column)
        laid[place[given]] = column[given]
        grid.values[name] = laid.reshape(grid.night.shape)


def _empty(rows: Rows, site: Site, days: Instants) -> tuple[Grid, NDArray[np.int64]]:
    """A grid without values, and each row's place on it (-1 where it is on none of the days)."""
    interval = int(rows.interval_s[0])
    n = max(round(SECONDS_A_DAY / interval), 1)
    width = SECONDS_A_DAY / n
    wanted = np.unique(np.concatenate([days - 1, days, days + 1]))
    # An empty day wherever the run of days breaks: no gap is ever bridged across it.
    day = np.unique(np.concatenate([wanted, wanted[:-1][np.diff(wanted) > 1] + 1]))
    offset = round(site.utc_offset_h * 3600)
    local_middle = rows.instant + offset - interval / 2
    row_day = np.floor(local_middle / SECONDS_A_DAY).astype(np.int64)
    slot = np.floor((local_middle - row_day * SECONDS_A_DAY) / width + 1e-9).astype(np.int64)
    at = np.minimum(np.searchsorted(day, row_day), day.size - 1)
    found = (day[at] == row_day) & np.isin(row_day, wanted)
    place = np.where(found, at * n + np.minimum(slot, n - 1), -1)
    starts = day * SECONDS_A_DAY - offset
    instants = starts[:, None] + np.rint((np.arange(n) + 0.5) * width).astype(np.int64)
    sine, _ = elevation_at_instants(site.latitude_deg, site.longitude_deg, instants)
    return Grid(day, width, sine <= 0.0, {}, float(atmospheric_pressure(site.elevation_m))), place


def _per_day(grid: Grid, day_place: NDArray[np.int64]) -> Floats:
    return np.bincount(day_place, minlength=grid.day.size).astype(np.float64)


def _zero_night(grid: Grid) -> None:
    """Negative shortwave to zero; at night below `OFFSET_FROM` it is counted as offset."""
    for name in ("shortwave_down", "shortwave_up"):
        values = grid.values.get(name)
        if values is None:
            continue
        offset = grid.night & (values < OFFSET_FROM)
        if offset.any():
            grid.tally["offset", name, "below -2 W/m2 at night"] = offset.sum(axis=1) * 1.0
        values[values < 0.0] = 0.0


def _clip_humidity(grid: Grid) -> None:
    for name in ("relative_humidity", "relative_humidity_max", "relative_humidity_min"):
        values = grid.values.get(name)
        if values is None:
            continue
        above = values > 100.0
        if above.any():
            grid.tally["clipped", name, "above 100 %"] = above.sum(axis=1) * 1.0
            values[above] = 100.0


def form_vapour_pressure(grid: Grid) -> None:
    """Vapour pressure of each interval: as read, from T and RH, from the dew point, from VPD."""
    values = grid.values
    air = values.get("air_temperature")
    ways = [values.get("vapour_pressure")]
    if air is not None and "relative_humidity" in values:
        ways.append(saturation_vapour_pressure(air) * values["relative_humidity"] / 100.0)
    if "dew_point" in values:
        ways.append(saturation_vapour_pressure(values["dew_point"]))
    if air is not None and "wet_bulb" in values:
        pressure = values.get("pressure", np.full(air.shape, np.nan))
        pressure = np.where(np.isnan(pressure), grid.pressure_kpa, pressure)
        told = vapour_pressure_psychrometer(air, values["wet_bulb"], pressure)
        ways.append(np.where(told > 0.0, told, np.nan))
    if air is not None and "vapour_pressure_deficit" in values:
        deficit = values["vapour_pressure_deficit"]
        ways.append(np.maximum(saturation_vapour_pressure(air) - deficit, 0.0))
    formed = np.full(grid.night.shape, np.nan)
    for way in ways:
        if way is not None:
            formed = np.where(np.isnan(formed), way, formed)
    if not np.isnan(formed).all():
        values["vapour_pressure"] = formed


def _bridge(grid: Grid, name: str) -> None:
    """Linear interpolation over gaps of at most `LONGEST_GAP_S`, in place."""
    flat = grid.values[name].ravel()
    known = np.flatnonzero(~np.isnan(flat))
    filled = np.zeros(flat.size, bool)
    if 0 < known.size < flat.size:
        longest = int(LONGEST_GAP_S / grid.interval_s + 1e-9)
        gap = np.diff(known) - 1
        short = np.flatnonzero((gap > 0) & (gap <= longest))
        before = np.repeat(known[short], gap[short])
        within = np.arange(before.size) - np.repeat(np.cumsum(gap[short]) - gap[short], gap[short])
        at = before + within + 1
        after = np.repeat(known[short + 1], gap[short])
        share = (at - before) / (after - before)
        flat[at] = flat[before] * (1.0 - share) + flat[after] * share
        filled[at] = True
    grid.values[name] = flat.reshape(grid.night.shape)
    grid.filled[name] = filled.reshape(grid.night.shape)
