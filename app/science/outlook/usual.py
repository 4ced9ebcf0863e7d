"""The usual reference ET where there is no forecast and no measurement."""

import numpy as np

from app.science import Bools, Floats

# Days the usual ratio is taken over, and pairs of days below which no persistence is assumed
# (working values).
RATIO_DAYS, RECORD_DAYS, LEAST_PAIRS = 30, 60, 10


def usual_ahead(eto_history: Floats, ra_history: Floats, ra_ahead: Floats) -> Floats:
    """Usual ETo of the days ahead: the season's shape times the recent ratio to it.

    eto_history (n,) [mm d-1] up to yesterday, NaN allowed; ra_history (n,) and ra_ahead (h,)
    extraterrestrial radiation [MJ m-2 d-1]. The last 30 days' mean ratio ETo/Ra carries on;
    yesterday's departure from it fades with the lag-1 correlation of the last 60. Returns (h,)
    [mm d-1], NaN where the last 30 days hold nothing. Source: working values of the methods page.
    """
    ratio = _ratio(eto_history, ra_history)
    recent = ratio[-RATIO_DAYS:]
    known = recent[~np.isnan(recent)]
    if known.size == 0:
        return np.full(ra_ahead.shape, np.nan)
    mean = float(known.mean())
    departure = float(ratio[-1]) - mean if not np.isnan(ratio[-1]) else 0.0
    fading = departure * persistence(ratio[-RECORD_DAYS:]) ** np.arange(1, ra_ahead.size + 1)
    return np.asarray(np.maximum(mean + fading, 0.0) * ra_ahead)


def persistence(values: Floats) -> float:
    """Lag-1 correlation of a record, held to 0-1; NaN are left out; 0 for fewer than 10 pairs.

    values (n,). Departures are taken from the record's own mean.
    """
    today, tomorrow = values[:-1], values[1:]
    both = ~np.isnan(today) & ~np.isnan(tomorrow)
    if both.sum() < LEAST_PAIRS:
        return 0.0
    departure = values - np.nanmean(values)
    together = float(np.sum(departure[:-1][both] * departure[1:][both]))
    spread = np.sqrt(np.sum(departure[:-1][both] ** 2) * np.sum(departure[1:][both] ** 2))
    return float(np.clip(together / spread, 0.0, 1.0)) if spread > 0.0 else 0.0


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


def _ratio(eto: Floats, ra: Floats) -> Floats:
    """ETo over Ra; NaN in the polar night."""
    none = np.full(eto.shape, np.nan)
    return np.asarray(np.divide(eto, ra, out=none, where=ra > 0.1))
