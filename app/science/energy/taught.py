"""Rung 4: what a station's own measured days teach the model about net longwave.

A robust affine fit of measured on modelled net longwave, made anew for each day from the good days
before it, so that a later day never changes an earlier one.
"""

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Days, Floats, floats
from app.science.energy.shortwave import net_shortwave

TAUGHT_DAYS = 60  # good days a fit is made of at most (the methods page)
LEAST_DAYS = 20  # and at least (the methods page)
MOST_LEFT = 0.8  # cross-validated RMSE over the untaught one, above it the fit is dropped (methods)
BLOCKS = 5  # of consecutive days, of the cross-validation, working value
LEAST_SPREAD = 0.3  # MJ m-2 d-1, standard deviation of modelled Rnl that can carry a slope, working
SNOW_ALBEDO = 0.40  # -, above it there is snow (green cover 0.20-0.25, FAO-56 p. 43), working value
SNOW_TMAX = 2.0  # degC, a colder day may lie under snow where albedo is not known, working value
HUBER_K = 1.345  # scales, 95 % efficient on normal errors, from memory
_STEPS = 20  # of reweighting, always all: a day's fit must not hang on the days beside it


@dataclass(frozen=True)
class Lessons:
    """Days that can teach, (days,) in time order: `date`; `modelled` and `measured` net longwave
    Rnl [MJ m-2 d-1, upward positive]. Days that cannot teach are left out.
    """

    date: Days
    modelled: Floats
    measured: Floats

    def then(self, later: "Lessons") -> "Lessons":
        """These lessons and later ones; of a day that both hold, the later's (a recomputed day)."""
        before = self.date < later.date[0] if later.date.size else np.ones(self.date.shape, bool)
        return Lessons(
            np.concatenate([self.date[before], later.date]),
            np.concatenate([self.modelled[before], later.modelled]),
            np.concatenate([self.measured[before], later.measured]),
        )


@dataclass(frozen=True)
class Taught:
    """The fit that serves each day, all (days,): measured Rnl = `slope` modelled + `intercept`.

    `low`, `high` modelled Rnl of the days that taught it; `days` how many; `left` cross-validated
    RMSE over that of the untaught model [-]; `reason` empty where the fit holds, else `few_days`,
    `no_spread` or `no_gain`; `teacher` True where another station taught it. Figures are NaN where
    there is no fit.
    """

    slope: Floats
    intercept: Floats
    low: Floats
    high: Floats
    days: NDArray[np.int64]
    left: Floats
    reason: NDArray[np.object_]
    teacher: Bools

    @property
    def holds(self) -> Bools:
        """Where the fit may be used, (days,)."""
        return np.asarray(self.reason == "", dtype=np.bool_)

    def or_else(self, other: "Taught") -> "Taught":
        """This fit where it holds, else the other's where that holds, else this one's refusal."""
        take = ~self.holds & other.holds
        return Taught(
            **{
                f.name: np.where(take, getattr(other, f.name), getattr(self, f.name))
                for f in fields(self)
            }
        )


def lessons(
    date: Days,
    shortwave_down: Floats,
    shortwave_up: Floats,
    tmax: Floats,
    rn_measured: Floats,
    rn_modelled: Floats,
) -> Lessons:
    """The days of a record that can teach: measured, modelled and free of snow.

    Arguments, (days,) in time order: `shortwave_down`, `shortwave_up` (NaN where not measured),
    `rn_measured` by rungs 1 to 3, `rn_modelled` by rung 5 [MJ m-2 d-1]; `tmax` [degC]. Returns
    Lessons; net longwave is 0.77 Rs - Rn on either side. Snow: an albedo above 0.40, or without
    one a Tmax below 2 degC (working values).
    Source: the methods page, ladder; ASCE-EWRI eq 15, 16.
    """
    net = net_shortwave(shortwave_down)
    modelled, measured = net - rn_modelled, net - rn_measured
    known = ~np.isnan(shortwave_up)
    snow = np.where(known, shortwave_up > SNOW_ALBEDO * shortwave_down, tmax < SNOW_TMAX)
    good = ~np.isnan(modelled) & ~np.isnan(measured) & ~snow
    return Lessons(np.asarray(date)[good], modelled[good], measured[good])


def teach(date: Days, given: Lessons, *, teacher: bool = False) -> Taught:
    """The fit that serves each day, made of the last 60 lessons before it.

    Arguments: `date` (days,) that want a fit; `given` lessons; `teacher` where they are another
    station's. Returns Taught (days,). The fit holds with at least 20 days, enough spread, and a
    blocked cross-validation that leaves at most 0.8 of the untaught model's RMSE.
    Source: the methods page, ladder (working values); Huber's weights, from memory.
    """
    when = np.asarray(date).astype("datetime64[D]")
    end = np.searchsorted(given.date.astype("datetime64[D]"), when)
    ends, which = np.unique(end, return_inverse=True)
    at = ends[:, None] - TAUGHT_DAYS + np.arange(TAUGHT_DAYS)
    there = at >= 0
    empty = given.date.size == 0
    place = np.maximum(at, 0)
    x = np.zeros(at.shape) if empty else given.modelled[place]
    y = np.zeros(at.shape) if empty else given.measured[place]
    count = there.sum(axis=1)
    weight = there.astype(np.float64)
    slope, intercept = huber_line(x, y, weight)
    left = _left_after_cross_validation(x, y, weight)
    mean = (weight * x).sum(axis=1) / np.maximum(count, 1)
    spread = np.sqrt((weight * (x - mean[:, None]) ** 2).sum(axis=1) / np.maximum(count, 1))
    few, flat = count < LEAST_DAYS, spread < LEAST_SPREAD
    reason = np.select(
        [few, flat, ~(left <= MOST_LEFT)], ["few_days", "no_spread", "no_gain"], ""
    ).astype(np.object_)

    def told(values: Floats) -> Floats:
        return np.where(few, np.nan, values)[which]

    return Taught(
        slope=told(slope),
        intercept=told(intercept),
        low=told(np.where(there, x, np.inf).min(axis=1, initial=np.inf)),
        high=told(np.where(there, x, -np.inf).max(axis=1, initial=-np.inf)),
        days=count[which],
        left=told(left),
        reason=reason[which],
        teacher=np.full(when.shape, teacher),
    )


def taught_net_radiation(taught: Taught, shortwave_down: Floats, rn_modelled: Floats) -> Floats:
    """Net radiation by rung 4, where the fit holds and its range was taught.

    Arguments, (days,): `taught`; `shortwave_down` Rs, `rn_modelled` by rung 5 [MJ m-2 d-1].
    Returns (1 - 0.23) Rs - (a Rnl + b) [MJ m-2 d-1], NaN elsewhere. Source: the methods page.
    """
    rnl = net_shortwave(shortwave_down) - rn_modelled
    serves = taught.holds & (rnl >= taught.low) & (rnl <= taught.high)
    return np.where(
        serves, net_shortwave(shortwave_down) - (taught.slope * rnl + taught.intercept), np.nan
    )


def why_not_taught(taught: Taught) -> NDArray[np.object_]:
    """Reason code of rung 4 on each day, for days it did not serve though the model was there.

    Arguments: `taught` (days,). Returns `few_days`, `no_spread`, `no_gain`, or `outside_taught`.
    """
    return np.where(taught.holds, "outside_taught", taught.reason).astype(np.object_)


def huber_line(x: ArrayLike, y: ArrayLike, weight: ArrayLike) -> tuple[Floats, Floats]:
    """Robust straight lines through stacks of points: Huber's weights, iterated.

    Arguments, (..., points): `x`, `y`; `weight` 0 leaves a point out. Returns slope and
    intercept (...); NaN where x does not vary. Source: Huber's M-estimator of location with the
    scale 1.4826 times the median absolute residual, from memory.
    """
    px, py, base = floats(x), floats(y), floats(weight)
    current = base
    slope, intercept = _line(px, py, current)
    for _ in range(_STEPS):
        off = np.abs(py - slope[..., None] * px - intercept[..., None])
        scale = 1.4826 * _median(off, base > 0.0)
        limit = HUBER_K * np.maximum(scale, 1e-9)[..., None]
        current = base * np.minimum(1.0, limit / np.maximum(off, 1e-12))
        slope, intercept = _line(px, py, current)
    return slope, intercept


def _line(x: Floats, y: Floats, weight: Floats) -> tuple[Floats, Floats]:
    total = weight.sum(axis=-1)
    total = np.where(total > 0.0, total, np.nan)
    mx, my = (weight * x).sum(axis=-1) / total, (weight * y).sum(axis=-1) / total
    dx = x - mx[..., None]
    square = (weight * dx * dx).sum(axis=-1)
    square = np.where(square > 1e-12, square, np.nan)
    slope = (weight * dx * y).sum(axis=-1) / square
    return np.asarray(slope), np.asarray(my - slope * mx)


def _median(values: Floats, which: Bools) -> Floats:
    """Median over the last axis of the values that count; 0 where none does."""
    ordered = np.sort(np.where(which, values, np.inf), axis=-1)
    count = which.sum(axis=-1)
    low = np.maximum((count - 1) // 2, 0)[..., None]
    high = np.minimum(count // 2, np.maximum(count - 1, 0))[..., None]
    pair = np.take_along_axis(ordered, low, -1) + np.take_along_axis(ordered, high, -1)
    return np.where(count > 0, pair[..., 0] / 2.0, 0.0)


def _left_after_cross_validation(x: Floats, y: Floats, weight: Floats) -> Floats:
    """RMSE on days a fit did not see over the untaught model's; blocks are consecutive days."""
    count = weight.sum(axis=1, keepdims=True)
    order = np.cumsum(weight, axis=1) - 1.0
    block = np.floor(BLOCKS * order / np.maximum(count, 1.0))
    unseen = (block[:, None, :] == np.arange(BLOCKS)[:, None]) & (weight[:, None, :] > 0.0)
    seen = weight[:, None, :] * ~unseen
    shape = seen.shape
    slope, intercept = huber_line(
        np.broadcast_to(x[:, None, :], shape), np.broadcast_to(y[:, None, :], shape), seen
    )
    guess = slope[..., None] * x[:, None, :] + intercept[..., None]
    wrong = np.where(unseen, (guess - y[:, None, :]) ** 2, 0.0).sum(axis=(1, 2))
    untaught = (weight * (x - y) ** 2).sum(axis=1)
    none = np.full(wrong.shape, np.nan)
    return np.asarray(np.sqrt(np.divide(wrong, untaught, out=none, where=untaught > 0.0)))
