"""What neighbouring stations tell: their clear-sky ratio (rung 6) and a check against them."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Floats, floats

FARTHEST_KM = 100.0  # effective distance a neighbour still speaks from, working value
HEIGHT_KM_PER_M = 0.05  # km of distance that a metre of height counts as, working value
NEAREST_KM = 1.0  # km, nearer counts as this, working value
WINDOW_DAYS = 60  # days before, whose differences tell what is usual, working value
LEAST_DAYS = 15  # of them, working value
MOST_SPREADS = 5.0  # robust spreads from the usual difference, working value


def neighbour_weights(distance_km: ArrayLike, height_difference_m: ArrayLike) -> Floats:
    """Weight of each neighbour by distance and height, inverse square; 0 beyond 100 km.

    Arguments, (neighbours,): `distance_km` [0..]; `height_difference_m` [any sign]. Returns
    weights [km-2], where 20 m of height count as one km of distance (working value). NaN gives 0.
    Source: inverse distance squared, common practice, no source.
    """
    away = np.hypot(floats(distance_km), HEIGHT_KM_PER_M * floats(height_difference_m))
    near = away <= FARTHEST_KM
    return np.where(near, 1.0 / np.square(np.maximum(away, NEAREST_KM)), 0.0)


def neighbour_ratio(ratios: ArrayLike, weights: ArrayLike) -> tuple[Floats, NDArray[np.int64]]:
    """Clear-sky ratio at a station from its neighbours' on each day.

    Arguments: `ratios` Rs/Rso of each neighbour by its own Rso (neighbours, days) [-], NaN where
    not measured; `weights` (neighbours,) of `neighbour_weights`. Returns the weighted mean (days,)
    [-], NaN where no neighbour speaks, and how many spoke. With three or more, one that lies
    beyond 0.25 of the weighted median is left out (working value).
    Source: the methods page, ladder.
    """
    values, weight = floats(ratios), floats(weights)[:, None]
    known = ~np.isnan(values) & (weight > 0.0)
    middle = weighted_median(values, np.where(known, weight, 0.0))
    many = known.sum(axis=0) >= 3
    used = known & ~(many & (np.abs(values - middle) > 0.25))
    share = np.where(used, weight, 0.0)
    total = share.sum(axis=0)
    summed = np.where(used, share * np.nan_to_num(values), 0.0).sum(axis=0)
    none = np.full(total.shape, np.nan)
    return np.divide(summed, total, out=none, where=total > 0.0), used.sum(axis=0)


def neighbour_mean(values: ArrayLike, weights: ArrayLike) -> Floats:
    """Weighted mean of what neighbours measured on each day, as of wind at 2 m.

    Arguments: `values` (neighbours, days) [any unit], NaN where not measured; `weights`
    (neighbours,) of `neighbour_weights`. Returns (days,), NaN where no neighbour speaks.
    """
    known = floats(values)
    share = np.where(np.isnan(known), 0.0, floats(weights)[:, None])
    total = share.sum(axis=0)
    summed = (share * np.nan_to_num(known)).sum(axis=0)
    none = np.full(total.shape, np.nan)
    return np.asarray(np.divide(summed, total, out=none, where=total > 0.0))


def weighted_median(values: Floats, weights: Floats) -> Floats:
    """Weighted median over the first axis; weight 0 leaves a value out, NaN where all are out.

    Arguments, (n, days): `values` (NaN only where the weight is 0); `weights` [not below 0].
    """
    if values.shape[0] == 0:
        return np.full(values.shape[1:], np.nan)
    order = np.argsort(np.where(weights > 0.0, values, np.inf), axis=0)
    sorted_values = np.take_along_axis(values, order, 0)
    cumulated = np.cumsum(np.take_along_axis(weights, order, 0), axis=0)
    half = cumulated[-1] / 2.0
    at = np.argmax(cumulated >= half, axis=0)
    picked = np.take_along_axis(sorted_values, at[None], 0)[0]
    return np.where(cumulated[-1] > 0.0, picked, np.nan)


@dataclass(frozen=True)
class NeighbourCheck:
    """A station's days against its neighbours, all (days,): `difference` own less the neighbours'
    weighted median; `usual` median difference of the days before; `spreads` how many robust
    spreads the day lies from it; `suspect` beyond 5. NaN and False where it cannot be told.
    """

    difference: Floats
    usual: Floats
    spreads: Floats
    suspect: Bools


def against_neighbours(
    own: ArrayLike, neighbours: ArrayLike, weights: ArrayLike, least_spread: float
) -> NeighbourCheck:
    """Whether a station's day departs from its neighbours' more than it usually does.

    Arguments: `own` (days,) and `neighbours` (neighbours, days) of one variable on the same
    consecutive days, in the same unit; `weights` (neighbours,); `least_spread` the spread below
    which agreement says nothing, in that unit (0.05 for a clear-sky ratio, 0.7 K for temperature).
    Returns NeighbourCheck. Only the 60 days before tell what is usual, at least 15 of them, and
    suspect days are left out of it, so a later day changes nothing.
    Source: the methods page, checks (robust difference; working values).
    """
    value, others = floats(own), floats(neighbours)
    weight = np.where(np.isnan(others), 0.0, floats(weights)[:, None])
    difference = value - weighted_median(others, weight)
    usual, spreads = np.full(value.shape, np.nan), np.full(value.shape, np.nan)
    suspect = np.zeros(value.shape, dtype=np.bool_)
    for day in range(value.size):
        past = slice(max(day - WINDOW_DAYS, 0), day)
        known = difference[past][~np.isnan(difference[past]) & ~suspect[past]]
        if known.size < LEAST_DAYS or np.isnan(difference[day]):
            continue
        usual[day] = np.median(known)
        spread = max(1.4826 * float(np.median(np.abs(known - usual[day]))), least_spread)
        spreads[day] = (difference[day] - usual[day]) / spread
        suspect[day] = abs(spreads[day]) > MOST_SPREADS
    return NeighbourCheck(difference, usual, spreads, suspect)
