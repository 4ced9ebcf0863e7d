"""The sensors of a station watched: every check that needs the rows of days, in one call."""

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from app.science import Bools, Floats
from app.science.energy.day_checks import CHECKS, Finding
from app.science.energy.day_rows import DayRows
from app.science.energy.records import Site
from app.science.energy.sensor_faults import SENSOR_FAULTS, sensor_faults
from app.science.energy.tilt import ClearShape, UsualShape, clear_shape, shape_faults
from app.science.energy.window import (
    CoveredWindow,
    ReplacedLongwave,
    covered_window,
    dome_days,
    replace_covered,
)

ROW_FINDINGS = {
    **SENSOR_FAULTS,
    "snow_on_dome": "hours of more shortwave from below than from above: snow or dirt on the dome",
    "night_offset": "mean night reading of the pyranometer, below -2 W/m2",
    "window_hours": "hours the longwave window was covered by frost, dew, snow or dust",
    "window_undecidable": "hours the longwave window read like a black body: fog, or covered",
    "clock": "minutes the logger's clock runs ahead of the sun",
    "tilt": "degrees at least the pyranometer leans to the east (minus: west)",
    "level": "share by which clear days are off clear sky: level, dirt or calibration",
}
MARKED = {"marked_bad": "marked as not to be used"}
WORDS = {**CHECKS, **ROW_FINDINGS, **MARKED}


def finding_words(check: str) -> str:
    """What a finding of days, rows or people says, in plain words; KeyError for an unknown one."""
    return WORDS[check]


@dataclass(frozen=True)
class Watch:
    """What the rows of days say. `findings` (days,) each, empty where all is well; `shape` of clear
    days; `window` and `replaced`, None without longwave, temperature and humidity.
    """

    findings: tuple[Finding, ...]
    shape: ClearShape | None
    window: CoveredWindow | None
    replaced: ReplacedLongwave | None

    def rn_widening(self, days: int) -> Floats:
        """Standard uncertainty that replaced hours add to each day's net radiation [MJ m-2 d-1]."""
        return np.zeros(days) if self.replaced is None else self.replaced.widening


def watch_rows(
    site: Site,
    rows: DayRows,
    values: Mapping[str, Floats],
    *,
    surface: str | None = None,
    usual: UsualShape | None = None,
    open_by_neighbour: Bools | None = None,
) -> Watch:
    """Every check of a station's radiometers that looks at the rows of whole days.

    Arguments: `site`; `rows`; `values` canonical quantity to (days, rows) [units of
    `science.quantities`], as read: before single values are set aside or zeroed, for a swapped
    pair or a missing body term shows in just those values; `surface` declared (a name of
    `sensor_faults.ALBEDO`); `usual` of the same pyranometer; `open_by_neighbour` (days,). Returns
    Watch. What a finding's `quantities` name must not be used that day; the others warn.
    `replaced` has covered rows modelled and is otherwise as read: leave out of it what the row
    checks set aside. Source: the methods page, checks.
    """
    findings = sensor_faults(rows, values, surface)
    down, up = values.get("shortwave_down"), values.get("shortwave_up")
    longwave, air = values.get("longwave_down"), values.get("air_temperature")
    moist = values.get("vapour_pressure")
    shape = window = replaced = None
    if down is not None:
        findings += _dome(rows, down, np.full(down.shape, np.nan) if up is None else up)
    if down is not None and longwave is not None and air is not None:
        window = covered_window(rows, longwave, air, down, open_by_neighbour)
        findings += _window(window)
        if moist is not None:
            replaced = replace_covered(rows, window, longwave, air, moist)
    if down is not None and moist is not None:
        shape = clear_shape(site, rows, down, _day_mean(moist))
        codes, figures = shape_faults(shape, usual)
        findings += [Finding(name, codes == name, figures) for name in ("clock", "tilt", "level")]
    bitten = tuple(f for f in findings if f.where.any())
    return Watch(bitten, shape, window, replaced)


def _dome(rows: DayRows, down: Floats, up: Floats) -> list[Finding]:
    dome = dome_days(rows, down, up)
    return [
        Finding("snow_on_dome", dome.snow_hours > 0.0, dome.snow_hours),
        Finding("night_offset", dome.offset_rows > 0, dome.offset),
    ]


def _window(window: CoveredWindow) -> list[Finding]:
    return [
        Finding("window_hours", window.covered_hours > 0.0, window.covered_hours),
        Finding("window_undecidable", window.undecidable_hours > 0.0, window.undecidable_hours),
    ]


def _day_mean(values: Floats) -> Floats:
    known = ~np.isnan(values)
    count = known.sum(axis=1)
    total = np.where(known, values, 0.0).sum(axis=1)
    return np.asarray(np.divide(total, count, out=np.full(count.shape, np.nan), where=count > 0))
