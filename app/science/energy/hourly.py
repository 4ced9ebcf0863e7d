"""Hours of a station day: net radiation and reference ET hour by hour, summed to the day."""

from collections.abc import Mapping
from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

from app.science import Bools, Days, Floats
from app.science.constants import ASCE, GRASS_EMISSIVITY, LOW_SUN, WIND_FLOOR, Standard, Surface
from app.science.energy.humidity import atmospheric_pressure
from app.science.energy.ladder import best_rung
from app.science.energy.longwave import (
    clear_sky_ratio,
    cloudiness,
    daily_ratio_or_polar_night,
    fourth_power_kelvin,
    net_longwave_hourly,
)
from app.science.energy.records import Site
from app.science.energy.reference_et import reference_et_hourly
from app.science.energy.shortwave import clear_sky, net_shortwave
from app.science.energy.sun import (
    day_of_year,
    extraterrestrial_period,
    hour_angle,
    sine_of_elevation,
)
from app.science.energy.wind import wind_at_2m

HOURS = 24
HOUR_SHARE = 0.9  # of an hour's rows, working value
CARRY_HOURS = 24  # h, longest that cloudiness is carried over, working value
RATIO_DAYS = 30  # days before, whose ratio of hourly to daily ET serves an incomplete day (METHODS)
LEAST_RATIOS = 5  # of those days with both, working value


@dataclass(frozen=True)
class HourlyWeather:
    """What a station measured hour by hour; `date` (days,), the others (days, 24), NaN missing.

    Hour 1 ends at 01:00 local standard time. `temperature` [degC]; `vapour_pressure` [kPa];
    `wind` [m s-1 at the site's wind height]; `shortwave_down`, `shortwave_up`, `longwave_down`,
    `longwave_up`, `net_radiation` [MJ m-2 h-1].
    Errors: ValueError naming the field whose shape is wrong.
    """

    date: Days
    temperature: Floats
    vapour_pressure: Floats
    wind: Floats
    shortwave_down: Floats
    shortwave_up: Floats
    longwave_down: Floats
    longwave_up: Floats
    net_radiation: Floats

    def __post_init__(self) -> None:
        date = np.asarray(self.date, dtype="datetime64[D]")
        object.__setattr__(self, "date", date)
        for field in fields(self)[1:]:
            values = np.asarray(getattr(self, field.name), dtype=np.float64)
            if values.shape != (date.size, HOURS):
                raise ValueError(
                    f"{field.name} has shape {values.shape}; it must be one value an hour, "
                    f"shape {(date.size, HOURS)}"
                )
            object.__setattr__(self, field.name, values)

    @classmethod
    def missing(cls, date: Days) -> "HourlyWeather":
        """Days (days,) on which nothing was measured; fill with `dataclasses.replace`."""
        days = np.asarray(date, dtype="datetime64[D]")
        names = [f.name for f in fields(cls) if f.name != "date"]
        return cls(date=days, **{name: np.full((days.size, HOURS), np.nan) for name in names})

    def or_else(self, other: "HourlyWeather") -> "HourlyWeather":
        """These hours, and those of `other` of the same days where these are NaN."""
        found = {}
        for name in [f.name for f in fields(self) if f.name != "date"]:
            own = getattr(self, name)
            found[name] = np.where(np.isnan(own), getattr(other, name), own)
        return replace(self, **found)


_FROM_ROWS = {  # field of HourlyWeather -> quantity of rows, MJ m-2 h-1 of it
    "temperature": ("air_temperature", 1.0),
    "vapour_pressure": ("vapour_pressure", 1.0),
    "wind": ("wind_speed", 1.0),
    **{
        name: (name, 0.0036)
        for name in (
            "shortwave_down",
            "shortwave_up",
            "longwave_down",
            "longwave_up",
            "net_radiation",
        )
    },
}


def hours_from_rows(date: Days, values: Mapping[str, Floats]) -> HourlyWeather:
    """Hourly means of finer rows laid out by local standard day.

    Arguments: `date` (days,); `values` canonical quantity to (days, rows of a day) in the units of
    `science.quantities`, what must not be used NaN, negative shortwave zeroed; rows of at most an
    hour. Returns HourlyWeather; an hour with less than 90 % of its rows is NaN (working value).
    Errors: ValueError naming the quantity whose rows do not divide into hours.
    """
    weather = HourlyWeather.missing(date)
    fields_of_hours = {}
    for name, (quantity, scale) in _FROM_ROWS.items():
        if quantity not in values:
            continue
        rows = values[quantity]
        if rows.shape[1] % HOURS:
            raise ValueError(f"{quantity} has {rows.shape[1]} rows a day; they must make up hours")
        parts = rows.reshape(weather.date.size, HOURS, rows.shape[1] // HOURS)
        known = ~np.isnan(parts)
        enough = known.sum(axis=2) >= HOUR_SHARE * parts.shape[2]
        mean = np.where(known, parts, 0.0).sum(axis=2) / np.maximum(known.sum(axis=2), 1)
        fields_of_hours[name] = np.where(enough, mean * scale, np.nan)
    return replace(weather, **fields_of_hours)


@dataclass(frozen=True)
class HourlyDays:
    """Hours and their sums. Arrays (days, 24): `rn`, `rn_modelled` [MJ m-2 h-1], `cloud` fcd [-],
    `eto`, `etr` [mm h-1]. Arrays (days,): `date`; `rung` int8 of the hours' net radiation, 0 where
    not all 24 hours could be had; `eto_sum`, `etr_sum` [mm d-1], NaN where `rung` is 0.
    """

    date: Days
    rn: Floats
    rn_modelled: Floats
    cloud: Floats
    eto: Floats
    etr: Floats
    rung: NDArray[np.int8]
    eto_sum: Floats
    etr_sum: Floats


def hourly_days(
    site: Site,
    weather: HourlyWeather,
    constants: Standard = ASCE,
    *,
    day_rung: NDArray[np.int8] | None = None,
    day_rn: Floats | None = None,
    day_wind_2m: Floats | None = None,
    day_vapour_pressure: Floats | None = None,
) -> HourlyDays:
    """Net radiation and reference ET of each hour by the best rung that covers the whole day.

    Arguments: `site`; `weather` (days, 24) in time order, NaN where not measured; `constants`;
    `day_rung`, `day_rn` (days,) of the daily ladder [MJ m-2 d-1]: where the day's rung is better
    than the hours' (a taught day), the hours are shifted alike so that they add up to it;
    `day_wind_2m` [m s-1], `day_vapour_pressure` [kPa] (days,) by the day's ladders: they serve all
    hours of a day on which none was measured. Returns
    HourlyDays; an hour that lacks an input is NaN and its day has rung 0, whose other hours are
    each by their own best rung. A sum below zero counts as 0 (common practice, no source).
    Source: ASCE-EWRI eq 1, table 1, hourly net radiation eq 42-45; rungs of the methods page.
    """
    weather = replace(
        weather, vapour_pressure=_served(weather.vapour_pressure, day_vapour_pressure)
    )
    ra, sine = hourly_sun(site, weather.date)
    rso = clear_sky(ra, site.elevation_m, (site.angstrom_a, site.angstrom_b))
    cloud = hourly_cloud(weather.date, weather.shortwave_down, rso, sine, constants)
    by_rung = _candidates(site, weather, cloud, constants)
    # one rung for all hours of a day, so that a day is not stitched from two surfaces
    whole = {
        number: np.where(np.isnan(rn).any(axis=1, keepdims=True), np.nan, rn)
        for number, rn in by_rung.items()
    }
    rn, rung_of_hour = best_rung(whole)
    rn = np.where(rung_of_hour > 0, rn, best_rung(by_rung)[0])  # hours of a day that is not whole
    if day_rung is not None and day_rn is not None:
        own = rung_of_hour[:, 0]
        better = (own > 0) & (day_rung > 0) & (day_rung < own)
        shift = np.where(better, day_rn - rn.sum(axis=1), 0.0) / HOURS
        rn = rn + shift[:, None]
        rung_of_hour = np.where(better[:, None], day_rung[:, None], rung_of_hour)
    u2 = _served(wind_at_2m(weather.wind, site.wind_height_m), day_wind_2m)
    u2 = np.maximum(u2, WIND_FLOOR)
    pressure = atmospheric_pressure(site.elevation_m)
    surfaces: tuple[Surface, ...] = ("short",) if constants.name == "FAO-56" else ("short", "tall")
    et = [
        reference_et_hourly(
            weather.temperature,
            weather.vapour_pressure,
            rn,
            u2,
            pressure,
            surface=surface,
            constants=constants,
        )
        for surface in surfaces
    ]
    eto, etr = et[0], et[-1] if len(et) == 2 else np.full(rn.shape, np.nan)
    complete = ~np.isnan(eto).any(axis=1)
    return HourlyDays(
        date=weather.date,
        rn=rn,
        rn_modelled=by_rung[5],
        cloud=cloud,
        eto=eto,
        etr=etr,
        rung=np.where(complete, rung_of_hour[:, 0], 0).astype(np.int8),
        eto_sum=np.maximum(eto.sum(axis=1), 0.0),
        etr_sum=np.maximum(etr.sum(axis=1), 0.0),
    )


def _served(hours: Floats, day: Floats | None) -> Floats:
    """Hours (days, 24), those of days on which none is known at the day's own value (days,)."""
    if day is None:
        return hours
    none = np.asarray(np.isnan(hours).all(axis=1))
    return np.where(none[:, None], day[:, None], hours)


def hourly_sun(site: Site, date: Days) -> tuple[Floats, Floats]:
    """Extraterrestrial radiation and sine of elevation of each hour of local standard days.

    Arguments: `site`; `date` (days,). Returns Ra [MJ m-2 h-1] and sin(beta) at mid-hour [-],
    (days, 24). Source: ASCE-EWRI eq 48-57, 62; FAO-56 eq 28-33.
    """
    day = day_of_year(date)[:, None]
    omega = hour_angle(np.arange(HOURS) + 0.5, day, site.longitude_deg, site.utc_offset_h)
    ra = extraterrestrial_period(site.latitude_deg, day, omega)
    return ra, sine_of_elevation(site.latitude_deg, day, omega)


def hourly_cloud(
    date: Days, shortwave: Floats, rso: Floats, sine: Floats, constants: Standard = ASCE
) -> Floats:
    """Cloudiness fcd of each hour, carried from the last hour whose sun stood above 0.3 rad.

    Arguments: `date` (days,) in time order; `shortwave` Rs, `rso` [MJ m-2 h-1], `sine` of
    elevation, (days, 24). Returns fcd (days, 24). It is carried at most 24 h; where nothing is
    there to carry (start of a record, high latitudes in winter) the day's own Rs/Rso serves,
    a working value. NaN where neither is known.
    Source: ASCE-EWRI, hourly cloudiness at low sun; FAO-56 eq 39.
    """
    values = cloudiness(clear_sky_ratio(shortwave, rso), constants)
    tells = (sine >= np.sin(LOW_SUN)) & ~np.isnan(values)
    hour = np.asarray(date).astype("datetime64[D]").astype(np.int64)[:, None] * HOURS
    hour = (hour + np.arange(HOURS)).reshape(-1)
    flat, tell = values.reshape(-1), tells.reshape(-1)
    last = np.maximum.accumulate(np.where(tell, np.arange(flat.size), -1))
    at = np.maximum(last, 0)
    fresh = (last >= 0) & (hour - hour[at] <= CARRY_HOURS) if flat.size else tell
    carried = np.where(fresh, flat[at], np.nan).reshape(values.shape)
    of_day = daily_ratio_or_polar_night(shortwave.sum(axis=1), rso.sum(axis=1))
    return np.where(np.isnan(carried), cloudiness(of_day, constants)[:, None], carried)


def _candidates(
    site: Site, weather: HourlyWeather, cloud: Floats, constants: Standard
) -> dict[int, Floats]:
    """Net radiation of each hour by the rungs that hours can serve: 1, 2, 3 and 5."""
    none = np.full(weather.temperature.shape, np.nan)
    shortwave = net_shortwave(weather.shortwave_down)
    black = constants.sigma_hour * fourth_power_kelvin(weather.temperature)
    components = weather.shortwave_down - weather.shortwave_up
    components = components + weather.longwave_down - weather.longwave_up
    rnl = net_longwave_hourly(weather.temperature, weather.vapour_pressure, cloud, constants)
    return {
        1: components if site.reference_surface else none,
        2: shortwave + GRASS_EMISSIVITY * (weather.longwave_down - black),
        3: weather.net_radiation if site.reference_surface else none,
        5: shortwave - rnl,
    }


@dataclass(frozen=True)
class SteppedEt:
    """Reference ET of days in hourly mode, all (days,): `eto`, `etr` [mm d-1]; `by_hours` where the
    hours were complete; `ratio` hourly over daily that served the others [-, NaN elsewhere];
    `flags` text `hourly_incomplete=<ratio>` or `hourly_without_ratio=1`, empty elsewhere.
    """

    eto: Floats
    etr: Floats
    by_hours: Bools
    ratio: Floats
    flags: NDArray[np.object_]


def et_by_hours(
    date: Days,
    hourly_eto: Floats,
    hourly_etr: Floats,
    daily_eto: Floats,
    daily_etr: Floats,
) -> SteppedEt:
    """ET of each day by hours; an incomplete day takes the daily value times the usual ratio.

    Arguments, (days,) in time order: `date`; sums of hours (NaN where incomplete) and daily
    values [mm d-1]. Returns SteppedEt. The ratio is the median of the last 30 days before, at
    least 5 of them, so that a later day never changes an earlier one; with fewer the daily value
    stands as it is, flagged. NaN where the daily value is NaN too.
    Source: the methods page, reference ET (working values).
    """
    day = np.asarray(date).astype("datetime64[D]").astype(np.int64)
    complete = ~np.isnan(hourly_eto)
    ratio_o = _trailing_ratio(day, hourly_eto, daily_eto)
    ratio_r = _trailing_ratio(day, hourly_etr, daily_etr)
    used = ~complete & ~np.isnan(daily_eto)
    flags = np.full(day.shape, "", dtype=np.object_)
    for i in np.flatnonzero(used):
        known = not np.isnan(ratio_o[i])
        flags[i] = f"hourly_incomplete={ratio_o[i]:.3g}" if known else "hourly_without_ratio=1"

    def merged(hours: Floats, daily: Floats, ratio: Floats) -> Floats:
        served = daily * np.where(np.isnan(ratio), 1.0, ratio)
        return np.where(np.isnan(hours), served, hours)

    return SteppedEt(
        eto=merged(hourly_eto, daily_eto, ratio_o),
        etr=merged(hourly_etr, daily_etr, ratio_r),
        by_hours=complete,
        ratio=np.where(used, ratio_o, np.nan),
        flags=flags,
    )


def _trailing_ratio(day: NDArray[np.int64], hours: Floats, daily: Floats) -> Floats:
    """Median of hours/daily over the days with both in the 30 days before each day."""
    both = ~np.isnan(hours) & (daily > 0.1)  # below it a ratio says nothing
    ratio = hours[both] / daily[both]
    begin = np.searchsorted(day[both], day - RATIO_DAYS)
    end = np.searchsorted(day[both], day)
    result = np.full(day.shape, np.nan)
    for i in np.flatnonzero(np.isnan(hours) & (end - begin >= LEAST_RATIOS)):
        result[i] = np.median(ratio[begin[i] : end[i]])
    return result
