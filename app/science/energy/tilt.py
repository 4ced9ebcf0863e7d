"""A pyranometer's geometry from clear days: tilt or clock, and the clear-day level.

A clear day is a smooth bell. Mornings against afternoons tell of a lean to the east or west, or of
a clock that is off. The midpoint of sunrise and sunset tells which: it moves with the clock, minute
by minute, and with a lean by less than two minutes a degree (measured on SURFRAD's clear day). So
the clock is set by the midpoint first; the asymmetry that remains is a lean, of at least that
size. A lean to the south or north shows in the level alone (METHODS, checks).
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.science import Bools, Floats
from app.science.constants import SOLAR_CONSTANT_W
from app.science.energy.day_rows import HIGH_SUN, DayRows, sun_direction
from app.science.energy.humidity import atmospheric_pressure
from app.science.energy.records import Site
from app.science.energy.shortwave import clear_sky

SMOOTH = 1.03  # rise and fall over twice the highest value, 1 for a bell, working value
MISFIT = 0.03  # residual of the clear-day shape over its mean, working value
LEVELS = (0.6, 1.5)  # -, clear-day level that can be a clear day at all, working value
DAWN_WATTS = 10.0  # W m-2, at which sunrise and sunset are timed: mostly diffuse, working value
BLOCK_S = 600  # s, finer rows are averaged to it
COARSEST_S = 1800  # s, coarser rows cannot time a sunrise
CLOCK_MINUTES = 5.0  # min off that are a fault, working value
TILT_DEGREES = (1.5, 1.0)  # off level, and off the sensor's own usual, working values
LEVEL_SHARE = (0.10, 0.05)  # off the clear-sky model, and off its own usual, working values
LEAST_ROWS = 5  # of high sun that can show a curve, working value
LEAST_DAYS = 3  # clear days that make a usual, working value


@dataclass(frozen=True)
class ClearShape:
    """What each day's shortwave curve says, all (days,): `clear` whether it was a clear day; then,
    NaN elsewhere, `clock` minutes the record runs ahead of the sun, `tilt_east` [degrees to the
    east at least, the clock set right], `level` measured over beam and diffuse of clear moist air
    [-], `simple_level` over the simple clear sky [-], `misfit` [-].
    """

    clear: Bools
    clock: Floats
    tilt_east: Floats
    level: Floats
    simple_level: Floats
    misfit: Floats


def clear_shape(
    site: Site, rows: DayRows, shortwave_down: Floats, vapour_pressure: Floats
) -> ClearShape:
    """Find the clear days of a record and what their curves say of sensor and clock.

    Arguments: `site`; `rows` of at most half an hour; `shortwave_down` (days, rows) [W m-2];
    `vapour_pressure` mean of each day (days,) [kPa]. Returns ClearShape. A day with a missing row
    in daylight is not clear; rows coarser than half an hour give no clock.
    Source: the methods page, checks; ASCE-EWRI Appendix D (from memory) for the curve; FAO-56
    eq 36, 37 for the simple clear sky.
    """
    middle, seen = _blocks(rows, np.maximum(shortwave_down, 0.0))
    up = sun_direction(site.latitude_deg, site.longitude_deg, middle)[0]
    seen = np.where(np.isnan(seen) & (up < -0.1), 0.0, seen)
    peak = seen.max(axis=1, initial=0.0)
    travel = np.abs(np.diff(seen, axis=1)).sum(axis=1)
    smooth = (travel <= SMOOTH * 2.0 * peak) & (peak > 5.0 * DAWN_WATTS)
    count = rows.date.size
    clock, tilt, level, simple, misfit = (np.full(count, np.nan) for _ in range(5))
    for day in np.flatnonzero(smooth):
        clock[day] = _clock_minutes(middle[day], seen[day], up[day])
        shift = 0.0 if np.isnan(clock[day]) else clock[day]
        sun = sun_direction(
            site.latitude_deg, site.longitude_deg, middle[day] - round(shift * 60.0)
        )
        tilt[day], level[day], simple[day], misfit[day] = _fit(
            site, seen[day], sun[0], sun[1], sun[3], float(vapour_pressure[day])
        )
    clear = (misfit <= MISFIT) & (level >= LEVELS[0]) & (level <= LEVELS[1])

    def told(values: Floats) -> Floats:
        return np.where(clear, values, np.nan)

    return ClearShape(clear, told(clock), told(tilt), told(level), told(simple), told(misfit))


def _blocks(rows: DayRows, values: Floats) -> tuple[NDArray[np.int64], Floats]:
    """Rows averaged to ten minutes where they are finer and fit, with the middles of the blocks."""
    size = max(int(BLOCK_S // rows.interval_s), 1)
    days, width = values.shape
    if size == 1 or width % size:
        return rows.middle, values
    blocked = values.reshape(days, width // size, size).mean(axis=2)
    middle = rows.middle.reshape(days, width // size, size).mean(axis=2)
    return middle.astype(np.int64), blocked


def _clock_minutes(middle: NDArray[np.int64], seen: Floats, up: Floats) -> float:
    """Minutes by which the midpoint of sunrise and sunset in the record is later than the sun's."""
    if middle.size < 2 or middle[1] - middle[0] > COARSEST_S:
        return np.nan
    minutes = (middle - middle[0]) / 60.0
    record = _midpoint(minutes, seen - DAWN_WATTS)
    return record - _midpoint(minutes, up)


def _midpoint(minutes: Floats, height: Floats) -> float:
    """Midpoint of the first rise through zero and the last fall through it; NaN without both."""
    above = height >= 0.0
    rise, fall = np.flatnonzero(~above[:-1] & above[1:]), np.flatnonzero(above[:-1] & ~above[1:])
    if rise.size == 0 or fall.size == 0 or fall[-1] <= rise[0]:
        return np.nan

    def moment(at: np.intp) -> float:
        share = height[at] / (height[at] - height[at + 1])
        return float(minutes[at] + share * (minutes[at + 1] - minutes[at]))

    return (moment(rise[0]) + moment(fall[-1])) / 2.0


def beam_and_diffuse(
    up: Floats, factor: Floats, elevation_m: float, vapour_pressure: float
) -> tuple[Floats, Floats]:
    """Clear-sky direct normal and diffuse horizontal irradiance at moments.

    Arguments: `up` sine of elevation, `factor` Earth-Sun factor, of one shape [-]; `elevation_m`;
    `vapour_pressure` [kPa]. Returns both [W m-2], 0 with the sun down. NaN gives NaN.
    Source: ASCE-EWRI Appendix D (from memory); FAO-56 Annex 3 eq 3-17 to 3-20 in form.
    """
    pressure = atmospheric_pressure(elevation_m)
    sine = np.maximum(up, 0.02)
    water = 0.14 * vapour_pressure * pressure + 2.1
    kb = 0.98 * np.exp(-0.00146 * pressure / sine - 0.075 * (water / sine) ** 0.4)
    kd = np.where(kb >= 0.15, 0.35 - 0.36 * kb, 0.18 + 0.82 * kb)
    outside = SOLAR_CONSTANT_W * factor * (up > 0.0)
    return kb * outside, kd * outside * sine


def _fit(
    site: Site, seen: Floats, up: Floats, east: Floats, factor: Floats, vapour_pressure: float
) -> tuple[float, float, float, float]:
    """Lean to the east [degrees], both levels and misfit of one day's curve, by least squares."""
    high = up > HIGH_SUN
    if high.sum() < LEAST_ROWS or np.isnan(seen[high]).any() or np.isnan(vapour_pressure):
        return np.nan, np.nan, np.nan, np.nan
    beam, diffuse = beam_and_diffuse(up, factor, site.elevation_m, vapour_pressure)
    shapes = np.stack([(beam * up + diffuse)[high], (beam * east)[high]], axis=1)
    (scale, lean), *_ = np.linalg.lstsq(shapes, seen[high], rcond=None)
    if scale <= 0.0:
        return np.nan, np.nan, np.nan, np.nan
    off = seen[high] - shapes @ np.array([scale, lean])
    above = SOLAR_CONSTANT_W * (factor * up)[high]
    clear = clear_sky(above, site.elevation_m, (site.angstrom_a, site.angstrom_b))
    simple = float(seen[high].sum() / clear.sum())
    misfit = float(np.sqrt((off**2).mean()) / seen[high].mean())
    return float(np.degrees(lean / scale)), float(scale), simple, misfit


@dataclass(frozen=True)
class UsualShape:
    """A sensor's own usual on clear days: `tilt_east` [degrees], `level` [-], and `days` of it."""

    tilt_east: float
    level: float
    days: int


def usual_shape(shape: ClearShape) -> UsualShape | None:
    """Medians over a span's clear days; None with fewer than three: too few clear days.

    Arguments: `shape` of the span that was good, as after levelling and calibration.
    """
    days = int(shape.clear.sum())
    if days < LEAST_DAYS:
        return None
    return UsualShape(
        float(np.median(shape.tilt_east[shape.clear])),
        float(np.median(shape.level[shape.clear])),
        days,
    )


def shape_faults(
    shape: ClearShape, usual: UsualShape | None = None
) -> tuple[NDArray[np.object_], Floats]:
    """What each clear day says is wrong, and the figure that says it.

    Arguments: `shape` (days,); `usual` of the same sensor where it is known. Returns codes (days,)
    `tilt` [degrees east at least, off the usual where known], `clock` [minutes ahead], `level`
    [share off], or empty, and the figures, NaN where empty. Only one a day, in that order, for a
    lean moves the midpoint somewhat and the level as well.
    Source: the methods page, checks (working values).
    """
    known = usual is not None
    lean = shape.tilt_east - (usual.tilt_east if usual else 0.0)
    level = _level_off(shape) if usual is None else shape.level / usual.level - 1.0
    faults = (
        ("tilt", np.abs(lean) >= TILT_DEGREES[known], lean),
        ("clock", np.abs(shape.clock) >= CLOCK_MINUTES, shape.clock),
        ("level", np.abs(level) >= LEVEL_SHARE[known], level),
    )
    codes = np.full(shape.clear.shape, "", dtype=np.object_)
    figures = np.full(shape.clear.shape, np.nan)
    for name, bites, figure in reversed(faults):
        codes[bites] = name
        figures = np.where(bites, figure, figures)
    return codes, figures


def _level_off(shape: ClearShape) -> Floats:
    """Share by which the level is off both clear skies alike, the nearer one; 0 between them.

    Neither is right everywhere: the moist one is some 9 % low on high dry ground in winter, the
    simple one high at a low sun.
    """
    both = np.stack([shape.level, shape.simple_level]) - 1.0
    near, far = np.min(np.abs(both), axis=0), np.sign(both)
    return np.asarray(np.where(far[0] == far[1], far[0] * near, 0.0 * near))
