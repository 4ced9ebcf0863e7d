"""From rows to station days (METHODS section 2)."""

import datetime as dt
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app.intake.complete import (
    Figure,
    extreme_of_day,
    mean_of_day,
    sum_of_day,
    sun_mean_of_day,
)
from app.intake.grid import Grid, lay_out
from app.intake.model import DayNote, Floats, Instants, Rows
from app.intake.pack import SECONDS_A_DAY
from app.science.energy.humidity import mean_saturation_vapour_pressure
from app.science.energy.records import DailyWeather, Site

MJ_A_DAY = 0.0864  # MJ m-2 d-1 of a mean flux of 1 W m-2
_EPOCH = dt.date(1970, 1, 1)
_HEAT = ("soil_heat_flux", "sensible_heat", "latent_heat")
_FLUXES = (
    "shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "net_radiation", *_HEAT,
)  # fmt: skip
_DAILY_FIELDS = {  # field of DailyWeather -> quantity of a daily row
    "tmax": "air_temperature_max", "tmin": "air_temperature_min", "tmean": "air_temperature",
    "rh_max": "relative_humidity_max", "rh_min": "relative_humidity_min",
    "rh_mean": "relative_humidity", "vapour_pressure": "vapour_pressure", "dew_point": "dew_point",
    "wind": "wind_speed", "sunshine": "sunshine_hours", "pressure": "pressure", "rain": "rain",
    **{name: name for name in _FLUXES},
}  # fmt: skip


def aggregate(
    rows: Rows,
    site: Site,
    days: NDArray[np.datetime64],
    good: Mapping[str, NDArray[np.bool_]] | None = None,
) -> tuple[DailyWeather, list[DayNote]]:
    """Daily weather of `days` from rows (give a day more on either side, so gaps can close).

    Rows finer than a day are judged for completeness; where they do not suffice, or there are
    none, a daily row serves. Steps are taken apart, the finest first. Returns the weather, NaN
    where a variable is missing, and one note for whatever was missing, filled, set aside, counted
    as offset or clipped on a day ("missing" names a field of DailyWeather, the others a quantity).
    `good` (rows,) by quantity: values that a person vouches for, which no row check sets aside.
    """
    wanted = np.asarray(days, "datetime64[D]").astype(np.int64)
    weather = DailyWeather.missing(np.asarray(days, "datetime64[D]"))
    if wanted.size == 0:
        return weather, []
    fields: dict[str, Any] = {}
    missing: dict[tuple[str, int], str] = {}
    notes: list[DayNote] = []
    for step in np.unique(rows.interval_s).tolist():
        part = _of_step(rows, step)
        here = rows.interval_s == step
        trusted = {name: mask[here] for name, mask in (good or {}).items()}
        if step == SECONDS_A_DAY:
            found, part_notes = _daily(part, site, wanted)
        else:
            grid = lay_out(part, site, np.unique(wanted), trusted)
            found, part_notes = _from_grid(grid, wanted)
        notes += part_notes
        for name, figure in found.items():
            before = fields.get(name, np.full(wanted.size, np.nan))
            fields[name] = np.where(np.isnan(before), figure.values, before)
            for i, reason in enumerate(figure.reason):
                if reason:
                    missing.setdefault((name, i), reason)
    notes += _missing_notes(fields, missing, wanted)
    return replace(weather, **fields), sorted(notes, key=lambda n: (n.day, n.quantity, n.what))


def _of_step(rows: Rows, step: int) -> Rows:
    same = rows.interval_s == step
    if same.all():
        return rows
    values = {name: column[same] for name, column in rows.values.items()}
    return Rows(rows.instant[same], rows.line[same], rows.interval_s[same], values)


def _from_grid(grid: Grid, wanted: Instants) -> tuple[dict[str, Figure], list[DayNote]]:
    found = _figures(grid)
    at = np.searchsorted(grid.day, wanted)
    picked = {
        name: Figure(figure.values[at], [_reason(grid, name, figure, i) for i in at])
        for name, figure in found.items()
    }
    notes = []
    tally = dict(grid.tally)
    for name, filled in grid.filled.items():
        if filled.any():
            tally["filled", name, "interpolated over at most 2 h"] = filled.sum(axis=1) * 1.0
    for (what, quantity, reason), count in tally.items():
        for i in at[count[at] > 0]:
            day = _EPOCH + dt.timedelta(days=int(grid.day[i]))
            notes.append(DayNote(day, quantity, what, float(count[i]), reason))  # type: ignore[arg-type]
    return picked, notes


def _reason(grid: Grid, field: str, figure: Figure, day: int) -> str:
    """Why a figure is missing, with what was set aside of its quantity that day."""
    reason = figure.reason[day]
    if reason:
        quantity = _DAILY_FIELDS[field]
        for (what, of, check), count in grid.tally.items():
            if what == "set_aside" and quantity.startswith(of) and count[day] > 0:
                reason += f"; {count[day]:.0f} set aside ({check})"
    return reason


def _figures(grid: Grid) -> dict[str, Figure]:
    found: dict[str, Figure] = {}
    for field, quantity in (
        ("tmean", "air_temperature"),
        ("rh_mean", "relative_humidity"),
        ("vapour_pressure", "vapour_pressure"),
        ("dew_point", "dew_point"),
        ("wind", "wind_speed"),
        ("pressure", "pressure"),
    ):
        if quantity in grid.values:
            found[field] = mean_of_day(grid, quantity)
    for field, quantity, highest in (
        ("tmax", "air_temperature", True),
        ("tmin", "air_temperature", False),
        ("rh_max", "relative_humidity", True),
        ("rh_min", "relative_humidity", False),
    ):
        own = f"{quantity}_{'max' if highest else 'min'}"
        ways = [extreme_of_day(grid, name, highest=highest) for name in (own, quantity)
                if name in grid.values]  # fmt: skip
        if ways:
            found[field] = _first(ways)
    for name in ("shortwave_down", "shortwave_up"):
        if name in grid.values:
            found[name] = _energy(sun_mean_of_day(grid, name))
    for name in ("longwave_down", "longwave_up", "net_radiation", *_HEAT):
        if name in grid.values:
            found[name] = _energy(mean_of_day(grid, name, night=True))
    if "rain" in grid.values:
        found["rain"] = sum_of_day(grid, "rain")
    if "sunshine_hours" in grid.values:
        found["sunshine"] = sum_of_day(grid, "sunshine_hours", daylight=True)
    return found


def _first(ways: list[Figure]) -> Figure:
    """The first way where it serves, else the next; the reason of the last where none does."""
    if len(ways) == 1:
        return ways[0]
    own, other = ways
    bad = np.isnan(own.values)
    reason = [other.reason[i] if bad[i] else "" for i in range(bad.size)]
    return Figure(np.where(bad, other.values, own.values), reason)


def _energy(mean_flux: Figure) -> Figure:
    return Figure(mean_flux.values * MJ_A_DAY, mean_flux.reason)


def _daily(rows: Rows, site: Site, wanted: Instants) -> tuple[dict[str, Figure], list[DayNote]]:
    """Daily rows straight through, each on the day its middle falls in; the last of a day wins."""
    middle = rows.instant + round(site.utc_offset_h * 3600) - SECONDS_A_DAY // 2
    day = middle // SECONDS_A_DAY
    notes: list[DayNote] = []
    taken: dict[str, Floats] = {}
    for quantity, column in rows.values.items():
        given = ~np.isnan(column)
        laid = np.full(wanted.size, np.nan)
        if given.any():
            order = np.searchsorted(day[given], wanted, side="right") - 1
            hit = (order >= 0) & (day[given][np.maximum(order, 0)] == wanted)
            laid[hit] = column[given][order[hit]]
        taken[quantity] = laid
    _tidy_daily(taken, wanted, notes)
    found = {}
    for field, quantity in _DAILY_FIELDS.items():
        if quantity in taken:
            scale = MJ_A_DAY if quantity in _FLUXES else 1.0
            reason = ["no daily row" if np.isnan(v) else "" for v in taken[quantity]]
            found[field] = Figure(taken[quantity] * scale, reason)
    return found, notes


def _tidy_daily(taken: dict[str, Floats], wanted: Instants, notes: list[DayNote]) -> None:
    """Humidity to 100 %, no negative shortwave, vapour pressure from a daily deficit."""
    for name in ("relative_humidity", "relative_humidity_max", "relative_humidity_min"):
        if name in taken:
            for i in np.flatnonzero(taken[name] > 105.0):
                day = _EPOCH + dt.timedelta(days=int(wanted[i]))
                notes.append(DayNote(day, name, "set_aside", 1.0, "above_saturation"))
            taken[name][taken[name] > 105.0] = np.nan
            taken[name] = np.minimum(taken[name], 100.0)
    for name in ("shortwave_down", "shortwave_up"):
        if name in taken:
            taken[name] = np.maximum(taken[name], 0.0)
    needed = ("vapour_pressure_deficit", "air_temperature_max", "air_temperature_min")
    if "vapour_pressure" not in taken and all(name in taken for name in needed):
        deficit, high, low = (taken[name] for name in needed)
        formed = mean_saturation_vapour_pressure(high, low) - deficit
        taken["vapour_pressure"] = np.where(formed > 0.0, formed, np.nan)


def _missing_notes(
    fields: dict[str, Floats], missing: dict[tuple[str, int], str], wanted: Instants
) -> list[DayNote]:
    notes = []
    for (name, i), reason in missing.items():
        if np.isnan(fields[name][i]):
            day = _EPOCH + dt.timedelta(days=int(wanted[i]))
            notes.append(DayNote(day, name, "missing", 0.0, reason))
    return notes
