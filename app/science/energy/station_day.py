"""A station's days: from daily weather to net radiation, reference ET and their uncertainty."""

import numpy as np

from app.science import Bools, Floats
from app.science.constants import WIND_FLOOR
from app.science.energy.day_checks import Finding, Marks, check_days, tokens
from app.science.energy.humidity import (
    HUMIDITY_SHARE,
    best_vapour_pressure,
    saturation_vapour_pressure,
)
from app.science.energy.ladder import (
    USUAL,
    Shortwave,
    best_rung,
    candidates,
    explain_rung,
    rn_uncertainty,
    rung_name,
    why_not,
)
from app.science.energy.records import DailyWeather, Site, StationDays
from app.science.energy.reference_et import eto_from_parts, eto_uncertainty
from app.science.energy.shortwave import (
    clear_sky,
    shortwave_from_sunshine,
    shortwave_from_temperature_range,
)
from app.science.energy.sun import day_length, day_of_year, extraterrestrial_daily
from app.science.energy.taught import Taught
from app.science.energy.usual import Usual
from app.science.energy.wind import WIND_SHARE, best_wind

__all__ = [
    "DailyWeather",
    "Site",
    "StationDays",
    "explain_rung",
    "rung_name",
    "station_days",
]

MEASURED_RUNGS = (1, 2, 3)
GUESSED_SHARE = HUMIDITY_SHARE[-1]  # of ea, where not even Tmin was measured


def station_days(
    site: Site,
    weather: DailyWeather,
    *,
    taught: Taught | None = None,
    neighbour_ratio: Floats | None = None,
    neighbour_wind: Floats | None = None,
    usual: Usual | None = None,
    rn_widening: Floats | float = 0.0,
    watched: tuple[Finding, ...] = (),
    marks: Marks | None = None,
) -> StationDays:
    """Net radiation by the best rung, reference ET and their uncertainty for each day.

    Arguments: `site`; `weather` (days,), NaN where not measured; what further rungs rest on, all
    (days,): `taught` (rung 4), `neighbour_ratio` Rs/Rso [-] (rung 6), `neighbour_wind` at 2 m
    [m s-1] (wind rung 2), `usual` (rung 9); `rn_widening` standard uncertainty that replaced hours
    add [MJ m-2 d-1]; `watched` findings of the rows (`watch.watch_rows`); `marks` of people.
    Returns StationDays (days,), NaN and rung 0 where no rung serves. Values that fail a hard check
    are not used; the checks that bit stand in `flags`. On a rung 9 day ETo rests on the usual for
    what is missing.
    Source: the methods page, sections on checks, ladder and reference ET; ASCE-EWRI eq 1.
    """
    j = day_of_year(weather.date)
    ra = extraterrestrial_daily(site.latitude_deg, j)
    angstrom = (site.angstrom_a, site.angstrom_b)
    rso = clear_sky(ra, site.elevation_m, angstrom)
    checked = check_days(site, weather, ra, rso, watched, marks)
    good = checked.weather

    ea, humidity_rung = best_vapour_pressure(
        tmax=good.tmax,
        tmin=good.tmin,
        vapour_pressure=good.vapour_pressure,
        dew_point=good.dew_point,
        rh_max=good.rh_max,
        rh_min=good.rh_min,
        rh_mean=good.rh_mean,
        arid=site.arid,
    )
    u2, wind_rung = best_wind(good.wind, site.wind_height_m, neighbour_wind)
    rs_sunshine = shortwave_from_sunshine(
        ra, good.sunshine, day_length(site.latitude_deg, j), angstrom
    )
    rs_temperature = shortwave_from_temperature_range(ra, good.tmax, good.tmin, rso, site.coastal)
    none = np.full(weather.date.shape, np.nan)
    rs_neighbours = none if neighbour_ratio is None else neighbour_ratio * rso
    shortwave = Shortwave(rs_neighbours, rs_sunshine, rs_temperature, rso)
    by_rung = candidates(site, good, ea, shortwave, taught, usual)
    rn, rung = best_rung(by_rung)
    rn_error = rn_uncertainty(rung, rn, False if taught is None else taught.teacher)
    rn_error = np.hypot(rn_error, rn_widening)
    humidity_error = HUMIDITY_SHARE[humidity_rung] * ea
    parts = (good.tmax, good.tmin, ea)
    if usual is not None:
        humidity_error = np.where(
            np.isnan(ea), GUESSED_SHARE * usual.vapour_pressure, humidity_error
        )
        parts = _with_usual(rung == USUAL, parts, usual)
    eto, etr = eto_from_parts(*parts, rn, u2, site.elevation_m)
    flags = np.empty(weather.date.shape, dtype=np.object_)
    flags[:] = tokens(checked.findings, weather.date.size)
    return StationDays(
        date=weather.date,
        rung=rung,
        why_not=why_not(site, checked, rung, taught),
        rn=rn,
        rn_uncertainty=rn_error,
        rn_measured=best_rung(by_rung, MEASURED_RUNGS)[0],
        rn_modelled=by_rung[5],
        vapour_pressure=ea,
        humidity_rung=humidity_rung,
        wind_2m=u2,
        wind_rung=wind_rung,
        rs=_first_known(
            good.shortwave_down,
            rs_neighbours,
            rs_sunshine,
            rs_temperature,
            none if usual is None else usual.ratio * rso,
        ),
        rso=rso,
        ra=ra,
        eto=eto,
        etr=etr,
        eto_uncertainty=eto_uncertainty(
            *parts,
            rn,
            u2,
            site.elevation_m,
            rn_error=rn_error,
            vapour_pressure_error=humidity_error,
            wind_error=WIND_SHARE[wind_rung] * np.maximum(u2, WIND_FLOOR),
        ),
        rh_min_used=_lowest_humidity(good, ea),
        tmax=good.tmax,
        tmin=good.tmin,
        rain=good.rain,
        flags=flags,
    )


def _with_usual(
    where: Bools, parts: tuple[Floats, Floats, Floats], usual: Usual
) -> tuple[Floats, Floats, Floats]:
    """Tmax, Tmin and ea with what is missing on a rung 9 day taken from the usual for the date."""
    fill = (usual.tmax, usual.tmin, usual.vapour_pressure)
    tmax, tmin, ea = (
        np.where(where & np.isnan(own), filler, own)
        for own, filler in zip(parts, fill, strict=True)
    )
    return tmax, tmin, ea


def _first_known(*sources: Floats) -> Floats:
    best = sources[0]
    for source in sources[1:]:
        best = np.where(np.isnan(best), source, best)
    return best


def _lowest_humidity(weather: DailyWeather, vapour_pressure: Floats) -> Floats:
    """The day's lowest relative humidity [%]: measured, else by FAO-56 eq 63 from ea and Tmax."""
    estimated = 100.0 * vapour_pressure / saturation_vapour_pressure(weather.tmax)
    return np.minimum(_first_known(weather.rh_min, estimated), 100.0)
