"""Reference ET: the standardized Penman-Monteith equation, daily and hourly, short and tall."""

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.constants import (
    ASCE,
    DAILY,
    HOURLY_CD_FAO56,
    HOURLY_DAY,
    HOURLY_NIGHT,
    MM_PER_MJ,
    WIND_FLOOR,
    Standard,
    Surface,
)
from app.science.energy.humidity import (
    atmospheric_pressure,
    mean_saturation_vapour_pressure,
    psychrometric_constant,
    saturation_slope,
    saturation_vapour_pressure,
)

_CHUNK = 16_384  # days worked on at once: the intermediates then stay in the processor's cache


def evaporation_depth(energy: ArrayLike) -> Floats:
    """Depth of water that an energy evaporates.

    Arguments: `energy`, any shape [MJ m-2]. Returns the depth [mm]. NaN gives NaN.
    Source: FAO-56 eq 20 (latent heat 2.45 MJ kg-1).
    """
    return floats(energy) * MM_PER_MJ


def soil_heat_flux_monthly(
    temperature: ArrayLike, temperature_before: ArrayLike, temperature_after: ArrayLike = np.nan
) -> Floats:
    """Soil heat flux G of a month, positive into the soil.

    Arguments, shapes that broadcast: mean air temperature of the month, of the one before and of
    the one after [degC; NaN after where not known yet]. Returns G [MJ m-2 d-1]. NaN before gives
    NaN. Source: FAO-56 eq 43 (with the month after), eq 44 (without).
    """
    before = floats(temperature_before)
    after = floats(temperature_after)
    known = 0.14 * (floats(temperature) - before)
    return np.where(np.isnan(after), known, 0.07 * (after - before))


def daily_terms(
    tmax: ArrayLike,
    tmin: ArrayLike,
    vapour_pressure: ArrayLike,
    net_radiation: ArrayLike,
    wind_2m: ArrayLike,
    pressure: ArrayLike,
    *,
    surface: Surface = "short",
    soil_heat_flux: ArrayLike = 0.0,
    constants: Standard = ASCE,
) -> tuple[Floats, Floats]:
    """The radiation term and the aerodynamic term of daily reference ET.

    Arguments as `reference_et_daily`. Returns both terms [mm d-1], which add up to the reference
    ET. NaN gives NaN. Source: ASCE-EWRI eq 1; FAO-56 eq 6 and its worked examples.
    """
    figures = DAILY[surface]
    tmean = (floats(tmax) + floats(tmin)) / 2.0
    u2 = floats(wind_2m)
    slope = saturation_slope(tmean, constants)
    gamma = psychrometric_constant(pressure)
    denominator = slope + gamma * (1.0 + figures.cd * u2)
    available = floats(net_radiation) - floats(soil_heat_flux)
    radiation = MM_PER_MJ * slope * available / denominator
    deficit = mean_saturation_vapour_pressure(tmax, tmin) - floats(vapour_pressure)
    aerodynamic = gamma * figures.cn / (tmean + 273.0) * u2 * deficit / denominator
    return radiation, aerodynamic


def reference_et_daily(
    tmax: ArrayLike,
    tmin: ArrayLike,
    vapour_pressure: ArrayLike,
    net_radiation: ArrayLike,
    wind_2m: ArrayLike,
    pressure: ArrayLike,
    *,
    surface: Surface = "short",
    soil_heat_flux: ArrayLike = 0.0,
    constants: Standard = ASCE,
) -> Floats:
    """Daily reference ET: ETo of the short surface or ETr of the tall one.

    Arguments, shapes that broadcast: `tmax`, `tmin` [degC]; `vapour_pressure` ea [kPa];
    `net_radiation` Rn, `soil_heat_flux` G [MJ m-2 d-1]; `wind_2m` u2 [m s-1]; `pressure` P [kPa];
    `surface`; `constants` ASCE or FAO56 (FAO-56 knows the short surface only). Returns mm d-1, as
    the equation gives it (a winter day can come out negative). NaN gives NaN.
    Errors: ValueError for FAO-56 constants with the tall surface.
    Source: ASCE-EWRI eq 1, table 1; FAO-56 eq 6.
    """
    _refuse_unknown(surface, constants)
    arguments = [
        floats(a)
        for a in (tmax, tmin, vapour_pressure, net_radiation, wind_2m, pressure, soil_heat_flux)
    ]
    shape = np.broadcast_shapes(*(a.shape for a in arguments))
    size = int(np.prod(shape))
    if size <= _CHUNK:
        return _sum_of_terms(arguments, surface, constants)
    flat = [a if a.size == 1 else np.broadcast_to(a, shape).reshape(-1) for a in arguments]
    result = np.empty(size)
    for begin in range(0, size, _CHUNK):
        part = slice(begin, begin + _CHUNK)
        pieces = [a.reshape(()) if a.size == 1 else a[part] for a in flat]
        result[part] = _sum_of_terms(pieces, surface, constants)
    return result.reshape(shape)


def _sum_of_terms(arguments: list[Floats], surface: Surface, constants: Standard) -> Floats:
    *positional, soil_heat_flux = arguments
    tmax, tmin, ea, rn, u2, pressure = positional
    radiation, aerodynamic = daily_terms(
        tmax,
        tmin,
        ea,
        rn,
        u2,
        pressure,
        surface=surface,
        soil_heat_flux=soil_heat_flux,
        constants=constants,
    )
    return radiation + aerodynamic


def reference_et_hourly(
    temperature: ArrayLike,
    vapour_pressure: ArrayLike,
    net_radiation: ArrayLike,
    wind_2m: ArrayLike,
    pressure: ArrayLike,
    *,
    surface: Surface = "short",
    constants: Standard = ASCE,
) -> Floats:
    """Hourly reference ET; day is where net radiation is above 0.

    Arguments, shapes that broadcast: `temperature` [degC]; `vapour_pressure` ea [kPa];
    `net_radiation` Rn [MJ m-2 h-1]; `wind_2m` u2 [m s-1]; `pressure` P [kPa]; `surface`;
    `constants`. Soil heat flux is the standard's share of Rn. Returns mm h-1, as the equation
    gives it (may be negative at night). NaN gives NaN.
    Errors: ValueError for FAO-56 constants with the tall surface.
    Source: ASCE-EWRI eq 1, table 1, eq 65, 66; FAO-56 eq 53, 45, 46 (Cd 0.34 day and night).
    """
    _refuse_unknown(surface, constants)
    day, night = HOURLY_DAY[surface], HOURLY_NIGHT[surface]
    t = floats(temperature)
    rn = floats(net_radiation)
    u2 = floats(wind_2m)
    lit = rn > 0.0
    fao = constants.name == "FAO-56"
    cd = HOURLY_CD_FAO56 if fao else np.where(lit, day.cd, night.cd)
    available = rn - soil_heat_flux_hourly(rn, surface=surface)
    slope = saturation_slope(t, constants)
    gamma = psychrometric_constant(pressure)
    deficit = saturation_vapour_pressure(t) - floats(vapour_pressure)
    numerator = MM_PER_MJ * slope * available + gamma * day.cn / (t + 273.0) * u2 * deficit
    return np.asarray(numerator / (slope + gamma * (1.0 + cd * u2)))


def soil_heat_flux_hourly(net_radiation: ArrayLike, *, surface: Surface = "short") -> Floats:
    """Soil heat flux G of an hour as the standard's share of net radiation.

    Arguments: `net_radiation` Rn, any shape [MJ m-2 h-1]; `surface`. Returns G [MJ m-2 h-1].
    NaN gives NaN. Source: ASCE-EWRI eq 65, 66; FAO-56 eq 45, 46.
    """
    rn = floats(net_radiation)
    day, night = HOURLY_DAY[surface].soil_share, HOURLY_NIGHT[surface].soil_share
    return np.where(rn > 0.0, day, night) * rn


def hargreaves(tmax: ArrayLike, tmin: ArrayLike, extraterrestrial: ArrayLike) -> Floats:
    """Reference ET from temperatures alone, a plausibility companion.

    Arguments, shapes that broadcast: `tmax`, `tmin` [degC]; `extraterrestrial` Ra [MJ m-2 d-1].
    Returns mm d-1; NaN where an input is NaN or Tmax is below Tmin. Source: FAO-56 eq 52.
    """
    high, low = floats(tmax), floats(tmin)
    span = high - low
    root = np.sqrt(np.where(span >= 0.0, span, np.nan))
    return 0.0023 * ((high + low) / 2.0 + 17.8) * root * evaporation_depth(extraterrestrial)


def eto_from_parts(
    tmax: ArrayLike,
    tmin: ArrayLike,
    vapour_pressure: ArrayLike,
    rn: ArrayLike,
    wind_2m: ArrayLike,
    elevation_m: ArrayLike,
) -> tuple[Floats, Floats]:
    """Reference ET of both surfaces as the ledger uses it, from parts of whatever source.

    Arguments, shapes that broadcast: `tmax`, `tmin` [degC]; `vapour_pressure` ea [kPa]; `rn` net
    radiation of the reference surface [MJ m-2 d-1]; `wind_2m` [m s-1], raised to the equation's
    floor of 0.5; `elevation_m` [m]. Returns ETo, ETr [mm d-1]; a negative result counts as 0
    (common practice, no source). NaN gives NaN. Source: ASCE-EWRI eq 1, 3 and Appendix D.
    """
    wind = np.maximum(floats(wind_2m), WIND_FLOOR)
    pressure = atmospheric_pressure(elevation_m)
    surfaces: tuple[Surface, Surface] = ("short", "tall")
    eto, etr = (
        reference_et_daily(tmax, tmin, vapour_pressure, rn, wind, pressure, surface=surface)
        for surface in surfaces
    )
    return np.maximum(eto, 0.0), np.maximum(etr, 0.0)


def eto_uncertainty(
    tmax: ArrayLike,
    tmin: ArrayLike,
    vapour_pressure: ArrayLike,
    rn: ArrayLike,
    wind_2m: ArrayLike,
    elevation_m: ArrayLike,
    *,
    rn_error: ArrayLike,
    vapour_pressure_error: ArrayLike,
    wind_error: ArrayLike,
) -> Floats:
    """Standard uncertainty of daily ETo from those of net radiation, humidity and wind.

    Arguments as `eto_from_parts`, and the standard uncertainty of each part in the part's unit.
    Returns mm d-1: the errors through the partial derivatives of the equation, in quadrature
    (taken as independent). NaN gives NaN. Source: ASCE-EWRI eq 1, differentiated.
    """
    figures = DAILY["short"]
    wind = np.maximum(floats(wind_2m), WIND_FLOOR)
    tmean = (floats(tmax) + floats(tmin)) / 2.0
    pressure = atmospheric_pressure(elevation_m)
    gamma = psychrometric_constant(pressure)
    slope = saturation_slope(tmean)
    denominator = slope + gamma * (1.0 + figures.cd * wind)
    eto = reference_et_daily(tmax, tmin, vapour_pressure, rn, wind, pressure)
    deficit = mean_saturation_vapour_pressure(tmax, tmin) - floats(vapour_pressure)
    pull = gamma * figures.cn / (tmean + 273.0)
    by_rn = MM_PER_MJ * slope / denominator * floats(rn_error)
    by_humidity = pull * wind / denominator * floats(vapour_pressure_error)
    by_wind = (pull * deficit - eto * gamma * figures.cd) / denominator * floats(wind_error)
    return np.asarray(np.sqrt(by_rn**2 + by_humidity**2 + by_wind**2))


def _refuse_unknown(surface: str, constants: Standard) -> None:
    if surface not in DAILY:
        raise ValueError(f"surface is {surface!r}; it must be 'short' or 'tall'")
    if constants.name == "FAO-56" and surface == "tall":
        raise ValueError("FAO-56 defines the short surface only; take ASCE constants for the tall")
