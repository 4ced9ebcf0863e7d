"""The public records laid out by day and row, for the tests that plant faults in them."""

from dataclasses import replace
from functools import cache

import numpy as np
import pvlib

from app.science.energy.day_rows import DayRows, day_rows
from app.science.energy.humidity import saturation_vapour_pressure
from tests.science.energy.records import ALAMOSA, FOLDER, PAYERNE, payerne_rows, surfrad_rows

Grid = dict[str, np.ndarray]


@cache
def payerne_grid() -> tuple[DayRows, Grid]:
    """29 whole local days, 2 to 30 June 2016, (29, 96), with `vapour_pressure` by row."""
    record = payerne_rows()
    first = int(np.flatnonzero((record.middle + 3600) % 86400 == 450)[0])
    kept = slice(first, first + 29 * 96)
    rows = day_rows(PAYERNE, np.datetime64("2016-06-02") + np.arange(29), 96)
    np.testing.assert_array_equal(rows.middle.reshape(-1), record.middle[kept])
    return rows, with_vapour({n: v[kept].reshape(29, 96) for n, v in record.values.items()})


@cache
def surfrad_grid() -> tuple[DayRows, Grid]:
    """The one day by UTC, whose daylight is a whole local day's, (1, 1440)."""
    record = surfrad_rows()
    site = replace(ALAMOSA, utc_offset_h=0.0)
    rows = day_rows(site, np.array(["2016-01-01"], dtype="datetime64[D]"), 1440)
    np.testing.assert_array_equal(rows.middle.reshape(-1), record.middle)
    return rows, with_vapour({n: v.reshape(1, 1440) for n, v in record.values.items()})


@cache
def surfrad_local() -> tuple[DayRows, Grid]:
    """The same day by local time: the seven hours of the evening before follow the afternoon."""
    rows = day_rows(ALAMOSA, np.array(["2016-01-01"], dtype="datetime64[D]"), 1440)
    grid = {name: np.roll(v, -420, axis=1) for name, v in surfrad_grid()[1].items()}
    table, _ = pvlib.iotools.read_surfrad(FOLDER / "surfrad-slv16001.dat")
    direct = np.maximum(table["dni"].to_numpy(), 0.0)
    return rows, grid | {"direct_normal": np.roll(direct, -420)[None, :]}


def leaning(rows: DayRows, grid: Grid, east: float, south: float) -> np.ndarray:
    """Shortwave of that day as a sensor leaning some degrees would have read it: the beam, measured
    by the station's own tracker, falls on the leaning plane."""
    way = np.radians(east) * rows.east + np.radians(south) * rows.south
    lit = rows.up > 0.0
    return np.maximum(grid["shortwave_down"] + grid["direct_normal"] * way * lit, -4.0)


def with_vapour(grid: Grid) -> Grid:
    moist = np.minimum(grid["relative_humidity"], 100.0) / 100.0
    return grid | {"vapour_pressure": saturation_vapour_pressure(grid["air_temperature"]) * moist}
