"""The detection table: faults planted in public records, how many were found, and what the clean
records raise. `python -m tests.science.energy.detection` prints it.

Records: BSRN Payerne, June 2016 (29 local days of 15 minutes); SURFRAD, 1 January 2016 (one clear
day of one minute); for drift a series made of a typical year (long_series.py) and two typical years
as they stand. Planting is ours (regression); detection is judged against the record itself.
"""

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache

import numpy as np

from app.science.energy.checks import row_checks
from app.science.energy.day_rows import DayRows
from app.science.energy.drift import Drift, drift
from app.science.energy.longwave import fourth_power_kelvin
from app.science.energy.records import Site
from app.science.energy.soft_checks import soft_row_checks
from app.science.energy.station_day import station_days
from app.science.energy.tilt import UsualShape, clear_shape
from app.science.energy.watch import watch_rows
from app.science.energy.window import morning_ratio
from tests.science.energy.long_series import LAST_HALF, last_half, made_series, typical_levels
from tests.science.energy.planted import Grid, leaning, payerne_grid, surfrad_local
from tests.science.energy.records import ALAMOSA, PAYERNE, daily, payerne_days, surfrad_rows

Record = tuple[Site, DayRows, Grid]
Plant = Callable[[Site, DayRows, Grid], Grid]
USUAL = UsualShape(-0.86, 1.094, 3)  # the winter sensor's own, as if levelled the month before


def black(grid: Grid) -> np.ndarray:
    return 5.67e-8 * fourth_power_kelvin(grid["air_temperature"])


def frost(site: Site, rows: DayRows, grid: Grid) -> Grid:
    """Three hours before sunrise to one after."""
    sunrise = np.argmax(~rows.night & rows.morning, axis=1)[:, None]
    at = (np.arange(rows.up.shape[1]) - sunrise) * rows.interval_s / 3600.0
    covered = (at >= -3.0) & (at < 1.0)
    return grid | {"longwave_down": np.where(covered, black(grid) - 2.0, grid["longwave_down"])}


def lean(east: float, south: float) -> Plant:
    def plant(site: Site, rows: DayRows, grid: Grid) -> Grid:
        return grid | {"shortwave_down": leaning(rows, grid, east, south)}

    return plant


def clock(minutes: int) -> Plant:
    def plant(site: Site, rows: DayRows, grid: Grid) -> Grid:
        step = round(minutes * 60 / rows.interval_s)
        return {name: np.roll(v.reshape(-1), step).reshape(v.shape) for name, v in grid.items()}

    return plant


def swapped(site: Site, rows: DayRows, grid: Grid) -> Grid:
    return grid | {
        "shortwave_down": grid["shortwave_up"],
        "shortwave_up": grid["shortwave_down"],
    }


def swapped_longwave(site: Site, rows: DayRows, grid: Grid) -> Grid:
    return grid | {"longwave_down": grid["longwave_up"], "longwave_up": grid["longwave_down"]}


def without_body(site: Site, rows: DayRows, grid: Grid) -> Grid:
    return grid | {"longwave_down": grid["longwave_down"] - black(grid)}


def shorted(site: Site, rows: DayRows, grid: Grid) -> Grid:
    return grid | {"shortwave_down": np.full(rows.up.shape, 0.2)}


def stuck_longwave(site: Site, rows: DayRows, grid: Grid) -> Grid:
    return grid | {"longwave_down": np.full(rows.up.shape, 310.0)}


def as_energy(site: Site, rows: DayRows, grid: Grid) -> Grid:
    """A flux in W m-2 taken for an energy in MJ m-2 an interval."""
    return grid | {"shortwave_down": grid["shortwave_down"] * 1e6 / rows.interval_s}


def snow_cap(site: Site, rows: DayRows, grid: Grid) -> Grid:
    """The dome under snow until noon: it passes a tenth of the light."""
    capped = np.where(rows.morning, 0.1 * grid["shortwave_down"], grid["shortwave_down"])
    return grid | {"shortwave_down": capped}


def bright(record: Record) -> np.ndarray:
    _, rows, grid = record
    return morning_ratio(rows, grid["shortwave_down"]) >= 0.6


def clear(record: Record) -> np.ndarray:
    """Days whose curve is a clear sky's: the only ones that tell a clock or a lean."""
    site, rows, grid = record
    moist = grid["vapour_pressure"].mean(axis=1)
    return np.asarray(clear_shape(site, rows, grid["shortwave_down"], moist).clear)


def every(record: Record) -> np.ndarray:
    return np.ones(record[1].date.shape, dtype=bool)


def june() -> Record:
    return (PAYERNE, *payerne_grid())


def winter() -> Record:
    return (ALAMOSA, *surfrad_local())


@dataclass(frozen=True)
class Fault:
    name: str
    record: Callable[[], Record]
    plant: Plant
    finding: str
    days: Callable[[Record], np.ndarray] = every  # on which it can be found
    usual: UsualShape | None = None


FAULTS = (
    Fault("frost on the window, bright mornings", june, frost, "window_hours", bright),
    Fault(
        "frost on the window, dull mornings", june, frost, "window_undecidable",
        lambda record: ~bright(record),
    ),
    Fault("frost on the window", winter, frost, "window_hours"),
    Fault("snow on the dome until noon", june, snow_cap, "snow_on_dome"),
    Fault("snow on the dome until noon", winter, snow_cap, "snow_on_dome"),
    Fault("shortwave swapped", june, swapped, "shortwave_swapped"),
    Fault("shortwave swapped", winter, swapped, "shortwave_swapped"),
    Fault("longwave swapped", june, swapped_longwave, "longwave_swapped"),
    Fault("longwave swapped", winter, swapped_longwave, "longwave_swapped"),
    Fault("body term missing", june, without_body, "body_term_missing"),
    Fault("body term missing", winter, without_body, "body_term_missing"),
    Fault("shortwave sensor shorted", june, shorted, "shortwave_dead"),
    Fault("shortwave sensor shorted", winter, shorted, "shortwave_dead"),
    Fault("longwave sensor stuck", june, stuck_longwave, "longwave_dead"),
    Fault("W m-2 read as MJ m-2", june, as_energy, "shortwave_unit"),
    Fault("W m-2 read as MJ m-2", winter, as_energy, "shortwave_unit"),
    *(Fault(f"clock {m} min off", winter, clock(m), "clock") for m in (10, -10, 15, 60)),
    *(Fault(f"clock {m} min off", june, clock(m), "clock", clear) for m in (15, 60)),
    Fault("5 degrees to the east", winter, lean(5.0, 0.0), "tilt"),
    Fault("5 degrees to the west", winter, lean(-5.0, 0.0), "tilt"),
    Fault("5 degrees to the south", winter, lean(0.0, 5.0), "level"),
    Fault("2 degrees to the east", winter, lean(2.0, 0.0), "tilt", usual=USUAL),
    Fault("2 degrees to the west", winter, lean(-2.0, 0.0), "tilt", usual=USUAL),
    Fault("2 degrees to the south", winter, lean(0.0, 2.0), "level", usual=USUAL),
)  # fmt: skip


def found(fault: Fault) -> tuple[int, int]:
    """Days on which the fault could be found, and on which it was."""
    record = fault.record()
    site, rows, grid = record
    told = watch_rows(site, rows, fault.plant(site, rows, grid), usual=fault.usual)
    where = fault.days(record)
    hit = np.zeros(where.shape, dtype=bool)
    for finding in told.findings:
        if finding.check == fault.finding:
            hit = finding.where
    return int(where.sum()), int((hit & where).sum())


def day_flags(name: str) -> list[str]:
    """What the checks of days say of the clean record's daily weather."""
    if name == "june":
        return list(station_days(PAYERNE, payerne_days()).flags)
    weather = daily(surfrad_rows(), 0.0, 1440)
    return list(station_days(replace(ALAMOSA, utc_offset_h=0.0), weather).flags)


@cache
def clean_alarms(name: str) -> dict[str, float]:
    """What a clean record raises: shares of rows by hard and soft checks, days by finding."""
    site, rows, grid = {"june": june, "winter": winter}[name]()
    flat = {quantity: v.reshape(-1) for quantity, v in grid.items()}
    middle = rows.middle.reshape(-1)
    hard = list(row_checks(site, middle, flat).values())
    soft = soft_row_checks(site, middle, flat)
    faults = [v for check, v in soft.items() if not check.endswith("/offset")]
    surface = "reference grass" if site.reference_surface else None
    told = {f.check: float(f.where.sum()) for f in watch_rows(
        site, rows, grid, surface=surface).findings}  # fmt: skip
    return {
        "hard_rows": float(np.any(hard, axis=0).mean()),
        "soft_rows": float(np.any(faults, axis=0).mean()),
        "days_flagged": float(sum(flags != "" for flags in day_flags(name))),
        **told,
    }


def drifts() -> dict[str, Drift]:
    """Verdicts on drift: planted, and on what is clean or too short to tell."""
    level = made_series()[0]
    told = {
        f"{100 * share:+.0f} % over six months, made series": last_half(
            level * (1.0 + share * LAST_HALF)
        )
        for share in (-0.04, 0.04, 0.0)
    }
    for name in ("723170TYA.CSV", "703165TY.csv"):
        date, shape = typical_levels(name)
        told[f"typical year {name[:6]} as it stands"] = drift(date, shape.level, shape.clear)
    site, rows, grid = june()
    shape = clear_shape(site, rows, grid["shortwave_down"], grid["vapour_pressure"].mean(axis=1))
    told["Payerne as it stands"] = drift(rows.date, shape.level, shape.clear)
    return told


def drift_lines() -> list[str]:
    lines = ["| drift | clear days | change | verdict |", "| --- | --- | --- | --- |"]
    for name, told in drifts().items():
        verdict = told.reason or ("drifting" if told.drifting else "none")
        change = "" if np.isnan(told.change) else f"{100 * told.change:+.1f} %"
        lines.append(f"| {name} | {told.clear_days} | {change} | {verdict} |")
    return lines


def table() -> str:
    lines = ["| planted | record | days | found |", "| --- | --- | --- | --- |"]
    for fault in FAULTS:
        days, hits = found(fault)
        record = "Payerne" if fault.record is june else "San Luis Valley"
        lines.append(f"| {fault.name} | {record} | {days} | {hits} |")
    lines += ["", "| clean record | check | share of rows, or days |", "| --- | --- | --- |"]
    for name in ("june", "winter"):
        record = "Payerne" if name == "june" else "San Luis Valley"
        lines += [f"| {record} | {check} | {n:g} |" for check, n in clean_alarms(name).items()]
    return "\n".join([*lines, "", *drift_lines()])


if __name__ == "__main__":
    print(table())
