"""The usual reference ET where there is no forecast and no measurement.

All is reckoned in ratios to extraterrestrial radiation Ra, which carry the season's shape.
"""

import numpy as np

from app.science import Bools, Floats

# Days the recent ratio is taken over, days of the record that persistence is taken from, and pairs
# of days below which none is assumed (working values).
RATIO_DAYS, RECORD_DAYS, LEAST_PAIRS = 30, 60, 10
# Share of the recent departure from the usual for the date that is carried on (working value).
CARRIED = 0.5


def usual_ahead(
    eto_history: Floats, ra_history: Floats, ra_ahead: Floats, usual: Floats | None = None
) -> Floats:
    """Usual ETo of the days ahead.

    eto_history (n,) [mm d-1] up to yesterday, NaN allowed; ra_history (n,) and ra_ahead (h,)
    extraterrestrial radiation [MJ m-2 d-1]; usual (n + h,) [mm d-1]: the mean of past years for
    the date on each of these days, NaN where not known. Returns (h,) [mm d-1] by `foretell`, NaN
    where the last 30 days hold nothing. Source: working values of the methods page.
    """
    days = min(eto_history.size, RECORD_DAYS)
    history = slice(eto_history.size - days, None)
    record = ratio_to_ra(eto_history[history], ra_history[history])
    shape = np.full(days + ra_ahead.size, np.nan)
    if usual is not None:
        ra = np.concatenate((ra_history[history], ra_ahead))
        shape = ratio_to_ra(usual[history], ra)
    return foretell(record, shape) * ra_ahead


def foretell(record: Floats, usual: Floats) -> Floats:
    """Ratios ETo/Ra ahead (..., h) from those up to yesterday.

    record (..., n): ratios of the last 60 days, NaN allowed. usual (..., n + h): the ratio usual
    for the date on these days and the h ahead. Ahead, the usual for the date holds, with half of
    the last 30 days' mean departure from it; where any of it is NaN, the last 30 days' mean ratio
    holds instead. Yesterday's departure from that fades with the record's lag-1 correlation.
    Never below 0; NaN where the last 30 days hold nothing. Source: working values of the methods
    page, the weather ahead.
    """
    days = record.shape[-1]
    told = ~np.isnan(usual).any(axis=-1, keepdims=True)
    base = np.where(told, usual, 0.0)
    departure = record - base[..., :days]
    level = _mean(departure[..., -RATIO_DAYS:]) * np.where(told, CARRIED, 1.0)
    last = departure[..., -1:] - level
    fading = persistence(record)[..., None] ** np.arange(1, usual.shape[-1] - days + 1)
    ahead = base[..., days:] + level + np.where(np.isnan(last), 0.0, last) * fading
    return np.asarray(np.maximum(ahead, 0.0))


def persistence(values: Floats) -> Floats:
    """Lag-1 correlation of records (..., n), held to 0-1; 0 for fewer than 10 pairs.

    NaN are left out. Departures are taken from each record's own mean. Returns (...).
    """
    departure = values - _mean(values)
    today, tomorrow = departure[..., :-1], departure[..., 1:]
    both = ~np.isnan(today) & ~np.isnan(tomorrow)
    today, tomorrow = np.where(both, today, 0.0), np.where(both, tomorrow, 0.0)
    together = np.sum(today * tomorrow, axis=-1)
    spread = np.sqrt(np.sum(today**2, axis=-1) * np.sum(tomorrow**2, axis=-1))
    known = (both.sum(axis=-1) >= LEAST_PAIRS) & (spread > 0.0)
    found = np.divide(together, spread, out=np.zeros(together.shape), where=known)
    return np.asarray(np.clip(found, 0.0, 1.0))


def fill_gaps(eto: Floats, ra: Floats) -> tuple[Floats, Bools]:
    """ETo with each gap filled by what was usual then, and where it was filled.

    eto (n,) [mm d-1], NaN in gaps; ra (n,) [MJ m-2 d-1]. Each gap is filled as `usual_ahead`
    would have foretold it from the days before it alone, so later days change nothing; the first
    day of a gap and the last speak from the same morning. A gap with nothing in the 30 days
    before it stays NaN and is not marked. Returns two arrays (n,).
    """
    filled = np.array(eto, dtype=np.float64)
    was_filled = np.zeros(filled.shape, dtype=np.bool_)
    missing = np.isnan(filled)
    day = 0
    while day < filled.size:
        if not missing[day]:
            day += 1
            continue
        end = day + 1
        while end < filled.size and missing[end]:
            end += 1
        if day > 0:
            filled[day:end] = usual_ahead(eto[:day], ra[:day], ra[day:end])
            was_filled[day:end] = ~np.isnan(filled[day:end])
        day = end
    return filled, was_filled


def ratio_to_ra(eto: Floats, ra: Floats) -> Floats:
    """ETo over Ra [mm MJ-1 m2], any shape; NaN in the polar night."""
    none = np.full(eto.shape, np.nan)
    return np.asarray(np.divide(eto, ra, out=none, where=ra > 0.1))


def _mean(values: Floats) -> Floats:
    """Mean over the last axis of what is known, (..., 1); NaN where nothing is."""
    known = ~np.isnan(values)
    count = known.sum(axis=-1, keepdims=True)
    total = np.where(known, values, 0.0).sum(axis=-1, keepdims=True)
    return np.asarray(np.divide(total, count, out=np.full(total.shape, np.nan), where=count > 0))
