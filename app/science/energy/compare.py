"""Measured against modelled net radiation, and the energy balance residual of a crop."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Bools, Days, Floats, floats
from app.science.energy.reference_et import eto_from_parts, evaporation_depth

SQUARE_M_PER_HA = 10_000.0
CUBIC_M_PER_ACRE_FOOT = 1233.48184  # definition: 43 560 cubic feet


@dataclass(frozen=True)
class Comparison:
    """Model against measurement over the days that have both, of `days` in all: `both` how many;
    `measured_mj`, `modelled_mj` sums [MJ m-2]; `ratio` of the sums [-]; `bias_mj`, `rmse_mj`
    [MJ m-2 d-1], model less measured; `eto_measured_mm`, `eto_modelled_mm` sums [mm], `eto_more_mm`
    what the model would have added, `eto_days` of them that have wind, temperature and humidity.
    Ratio, bias and RMSE are NaN where no day has both.
    """

    days: int
    both: int
    measured_mj: float
    modelled_mj: float
    ratio: float
    bias_mj: float
    rmse_mj: float
    eto_days: int
    eto_measured_mm: float
    eto_modelled_mm: float
    eto_more_mm: float


@dataclass(frozen=True)
class Pairs:
    """Days with what a comparison needs, all (days,): `date`; `measured`, `modelled` net radiation
    [MJ m-2 d-1]; `eto_measured`, `eto_modelled` [mm d-1]; NaN where not to be had.
    """

    date: Days
    measured: Floats
    modelled: Floats
    eto_measured: Floats
    eto_modelled: Floats


def pairs(
    date: Days,
    rn_measured: Floats,
    rn_modelled: Floats,
    tmax: Floats,
    tmin: Floats,
    vapour_pressure: Floats,
    wind_2m: Floats,
    elevation_m: float,
) -> Pairs:
    """Net radiation both ways, and the reference ET either would give, all else the same.

    Arguments, (days,): `date`; `rn_measured` (rungs 1 to 3), `rn_modelled` (rung 5) [MJ m-2 d-1];
    `tmax`, `tmin` [degC]; `vapour_pressure` [kPa]; `wind_2m` [m s-1]; `elevation_m`. Returns
    Pairs. NaN gives NaN. Source: ASCE-EWRI eq 1.
    """
    air = (tmax, tmin, vapour_pressure)
    both = np.where(np.isnan(rn_modelled), np.nan, rn_measured)
    model = np.where(np.isnan(rn_measured), np.nan, rn_modelled)
    return Pairs(
        date=np.asarray(date).astype("datetime64[D]"),
        measured=both,
        modelled=model,
        eto_measured=eto_from_parts(*air, both, wind_2m, elevation_m)[0],
        eto_modelled=eto_from_parts(*air, model, wind_2m, elevation_m)[0],
    )


def compare(given: Pairs, where: Bools | None = None) -> Comparison:
    """Model against measurement over days.

    Arguments: `given` (days,); `where` which of them, all by default. Returns Comparison.
    Source: the methods page, measured against modelled.
    """
    chosen = np.ones(given.date.shape, dtype=np.bool_) if where is None else where
    both = chosen & ~np.isnan(given.measured)
    count = int(both.sum())
    off = (given.modelled - given.measured)[both]
    measured, modelled = float(given.measured[both].sum()), float(given.modelled[both].sum())
    water = both & ~np.isnan(given.eto_measured) & ~np.isnan(given.eto_modelled)
    eto_measured = float(given.eto_measured[water].sum())
    eto_modelled = float(given.eto_modelled[water].sum())
    return Comparison(
        days=int(chosen.sum()),
        both=count,
        measured_mj=measured,
        modelled_mj=modelled,
        ratio=modelled / measured if measured else np.nan,
        bias_mj=float(off.mean()) if count else np.nan,
        rmse_mj=float(np.sqrt((off**2).mean())) if count else np.nan,
        eto_days=int(water.sum()),
        eto_measured_mm=eto_measured,
        eto_modelled_mm=eto_modelled,
        eto_more_mm=eto_modelled - eto_measured,
    )


def compare_by_month(given: Pairs) -> list[tuple[np.datetime64, Comparison]]:
    """One comparison a calendar month that has days with both, in order."""
    month = given.date.astype("datetime64[M]")
    told = [(m, compare(given, month == m)) for m in np.unique(month)]
    return [(m, comparison) for m, comparison in told if comparison.both]


def compare_by_season(given: Pairs) -> list[tuple[str, Comparison]]:
    """One comparison a quarter of the year (`2024-DJF`, by the year of its February), in order."""
    month = given.date.astype("datetime64[M]").astype(np.int64)
    quarter = (month + 1) // 3  # December opens a quarter
    told = []
    for q in np.unique(quarter):
        year, part = divmod(int(q), 4)
        name = f"{1970 + year}-{('DJF', 'MAM', 'JJA', 'SON')[part]}"
        comparison = compare(given, quarter == q)
        if comparison.both:
            told.append((name, comparison))
    return told


def volume_m3(depth_mm: ArrayLike, area_ha: ArrayLike) -> Floats:
    """Volume of a depth of water over an area [mm, ha], shapes that broadcast. Returns m3."""
    return np.asarray(floats(depth_mm) / 1000.0 * floats(area_ha) * SQUARE_M_PER_HA)


def acre_feet(volume: ArrayLike) -> Floats:
    """Acre-feet of a volume, any shape [m3]. Source: definition, 43 560 cubic feet."""
    return np.asarray(floats(volume) / CUBIC_M_PER_ACRE_FOOT)


@dataclass(frozen=True)
class Residual:
    """Energy balance of a crop, all (days,): `latent` LE = Rn - G - H [MJ m-2 d-1]; `et` [mm d-1];
    `closure` (LE measured + H) over (Rn - G) [-], NaN where LE is not measured or Rn - G is small.
    """

    latent: Floats
    et: Floats
    closure: Floats


LEAST_AVAILABLE = 2.0  # MJ m-2 d-1 of Rn - G below which a ratio says nothing, working value


def residual(
    net_radiation: ArrayLike,
    soil_heat_flux: ArrayLike,
    sensible_heat: ArrayLike,
    latent_measured: ArrayLike = np.nan,
) -> Residual:
    """What is left of net radiation over a crop for evaporation, and how well the balance closes.

    Arguments, shapes that broadcast, one value a day [MJ m-2 d-1]: `net_radiation` Rn over the
    crop; `soil_heat_flux` G, storage above the plate added, positive into the soil;
    `sensible_heat` H, positive upward; `latent_measured` LE where it is measured too. Returns
    Residual. NaN gives NaN. It is shown beside Kc ETo, never blended in.
    Source: FAO-56 eq 1, eq 20 (latent heat 2.45 MJ kg-1); closure ratio, common practice.
    """
    rn, g, h, le = np.broadcast_arrays(
        floats(net_radiation),
        floats(soil_heat_flux),
        floats(sensible_heat),
        floats(latent_measured),
    )
    available = rn - g
    latent = available - h
    return Residual(
        latent=latent,
        et=evaporation_depth(latent),
        closure=_ratio(le + h, available, available >= LEAST_AVAILABLE),
    )


def closure_of_span(
    net_radiation: Floats, soil_heat_flux: Floats, sensible_heat: Floats, latent_measured: Floats
) -> tuple[float, NDArray[np.bool_]]:
    """Energy balance ratio of a span: the sum of LE + H over that of Rn - G.

    Arguments, (days,) [MJ m-2 d-1]. Returns the ratio [-], NaN where no day has all four or their
    Rn - G does not sum above 0, and which days have all four. Source: common practice, no source.
    """
    turbulent = latent_measured + sensible_heat
    available = net_radiation - soil_heat_flux
    whole = ~np.isnan(turbulent + available)
    total = float(available[whole].sum())
    return (float(turbulent[whole].sum()) / total if total > 0.0 else np.nan), whole


def _ratio(top: Floats, bottom: Floats, where: Bools) -> Floats:
    none = np.full(top.shape, np.nan)
    return np.asarray(np.divide(top, bottom, out=none, where=where))
