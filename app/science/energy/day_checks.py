"""Checks of a station's days: what is set aside (hard) and what only warns (soft).

Sources: ASCE-EWRI Appendix D and FAO-56 Annex 5 for the method; Global Network recommended QC tests
V2.0 (BSRN) for longwave against air temperature, upward shortwave and longwave limits. Thresholds
marked working value have no published source.
"""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from app.science import Bools, Floats
from app.science.constants import KELVIN, RH_LIMIT, WATTS_TO_MJ_DAY, WIND_FLOOR
from app.science.energy.humidity import (
    atmospheric_pressure,
    saturation_vapour_pressure,
)
from app.science.energy.longwave import black_body_daily, clear_sky_ratio
from app.science.energy.records import DailyWeather, Site
from app.science.energy.shortwave import clear_sky_envelope
from app.science.energy.sun import (
    daily_sine_of_elevation,
    day_length,
    day_of_year,
)
from app.science.quantities import outside

ENVELOPE_WARN = 1.05  # Rs over the clear-sky envelope, ASCE-EWRI Appendix D (3-5 %, from memory)
ENVELOPE_FAIL = 1.15  # the same, set aside, working value
ENVELOPE_SLACK = 0.5  # MJ m-2 d-1 that must be exceeded as well, working value
DARKEST = 0.02  # Rs/Ra under the densest cloud, working value (FAO-56: dense cloud about 0.25)
RANGE_WARN = 3.0  # K between the day's mean and the mean of its extremes, working value
STEP_WARN = 15.0  # K from one day's mean to the next, working value
GRASS_ALBEDO_RANGE = (0.10, 0.35)  # -, FAO-56 p. 43: green cover 0.20-0.25; widened, working value
WINDOW_GAP = 15.0  # W m-2 under a black body that a clear sky never reaches, working value
WINDOW_RATIO = 0.7  # Rs/Rso that proves an open sky over the day, working value
WIND_STUCK_DAYS = 5  # days in a row with the very same mean, working value
REACH_DAYS = WIND_STUCK_DAYS - 1  # how many days to either side a day's checks look

NET_LOWEST = -10.0  # MJ m-2 d-1, working value
NET_AGREES = (0.05, 1.0)  # share and MJ m-2 d-1, logger net against components, working value
RH_DRY_AFTERNOON = 5.0  # %, from memory
PRESSURE_SHARE = 0.05  # of the pressure at the station's elevation, working value

# check name -> what a failed or warning check says, in plain words
CHECKS = {
    "temperature_inverted": "the highest temperature is below the lowest",
    "temperature_flat": "temperature did not move all day",
    "temperature_mean_outside": "the mean temperature lies outside the day's extremes",
    "temperature_mean_far": "the mean temperature is far from the middle of the extremes",
    "temperature_step": "temperature jumped from the day before",
    "humidity_above_saturation": "relative humidity is above 105 %",
    "humidity_negative": "relative humidity is below zero",
    "humidity_inverted": "the highest humidity is below the lowest",
    "humidity_very_dry": "the lowest humidity is below 5 %",
    "dew_point_above_air": "the dew point is above the highest temperature",
    "vapour_above_saturation": "vapour pressure is above saturation",
    "wind_stuck": "wind was zero all day or the same for days",
    "wind_negative": "wind is below zero",
    "wind_low": "wind is below 0.5 m/s",
    "shortwave_above_clear_sky": "shortwave is above clear sky",
    "shortwave_too_dark": "shortwave is darker than the densest cloud",
    "upward_above_downward": "upward shortwave is above downward: snow or dirt on the upper dome",
    "shortwave_up_negative": "upward shortwave is below zero",
    "albedo_not_grass": "the albedo is not that of a grass surface",
    "longwave_down_impossible": "downward longwave is outside the physically possible",
    "longwave_up_impossible": "upward longwave is outside the physically possible",
    "longwave_down_against_air": "downward longwave does not fit the air temperature",
    "longwave_up_against_air": "upward longwave does not fit the air temperature",
    "longwave_pair_apart": "the two longwaves are too far apart",
    "window_covered": "the longwave window read like a black body under an open sky",
    "net_impossible": "net radiation is more than the sun gives or less than a night takes",
    "net_against_components": "net radiation differs from its four components",
    "sunshine_too_long": "sunshine is longer than the day",
    "pressure_against_elevation": "air pressure does not fit the station's elevation",
    "rain_negative": "rain is below zero",
}


@dataclass(frozen=True)
class Finding:
    """One check on all days: where it bit and the figure that raised it.

    `check` name in CHECKS; `where` (days,); `figure` (days,); `quantities` it sets aside, none for
    a soft check.
    """

    check: str
    where: Bools
    figure: Floats
    quantities: tuple[str, ...] = ()


@dataclass(frozen=True)
class CheckedDays:
    """Weather with what failed set to NaN, and the findings that bit, in the order of checking."""

    weather: DailyWeather
    findings: tuple[Finding, ...]

    def failed_by(self, quantity: str) -> list[tuple[str, Bools]]:
        """The hard checks that set this quantity aside and on which days, in order."""
        return [(f.check, f.where) for f in self.findings if quantity in f.quantities]


@dataclass(frozen=True)
class Marks:
    """What a person said of days, by field of DailyWeather, (days,) each: `bad` must not be used,
    `good` is used whatever a check says (the check still shows).
    """

    bad: Mapping[str, Bools] = field(default_factory=dict)
    good: Mapping[str, Bools] = field(default_factory=dict)


def check_days(
    site: Site,
    weather: DailyWeather,
    ra: Floats,
    rso: Floats,
    watched: tuple[Finding, ...] = (),
    marks: Marks | None = None,
) -> CheckedDays:
    """Check every day, what people and rows said first, then air, then radiation against the air.

    Arguments: `site`; `weather` (days,); `ra`, `rso` (days,) [MJ m-2 d-1]; `watched` findings of
    the days' rows (`watch.watch_rows`); `marks` of people. Returns CheckedDays. A missing value
    never fails. Source: ASCE-EWRI Appendix D; FAO-56 Annex 5; BSRN.
    """
    said = Marks() if marks is None else marks
    ones = np.ones(weather.date.shape)
    findings = [Finding("marked_bad", bad, ones, (name,)) for name, bad in said.bad.items()]
    findings += [part for f in watched for part in _unless_good(f, said.good)]
    findings = [f for f in findings if f.where.any()]
    weather = _set_aside(weather, findings)
    for stage in (_temperature, _humidity, _wind_and_rain, _shortwave, _longwave, _net):
        bitten = (f for f in stage(site, weather, ra, rso) if f.where.any())
        found = [part for f in bitten for part in _unless_good(f, said.good)]
        weather = _set_aside(weather, found)
        findings.extend(found)
    return CheckedDays(weather, tuple(findings))


def _unless_good(finding: Finding, good: Mapping[str, Bools]) -> list[Finding]:
    """The finding split so that it sets nothing aside that a person marked as good."""
    if not any(name in good for name in finding.quantities):
        return [finding]
    never = np.zeros(finding.where.shape, dtype=np.bool_)
    parts = [finding_on(finding, finding.where, ())]
    for name in finding.quantities:
        parts.append(finding_on(finding, finding.where & ~good.get(name, never), (name,)))
    return parts


def finding_on(finding: Finding, where: Bools, quantities: tuple[str, ...]) -> Finding:
    """The same finding on other days (days,), setting aside other quantities."""
    return Finding(finding.check, where, finding.figure, quantities)


def _set_aside(weather: DailyWeather, findings: list[Finding]) -> DailyWeather:
    for finding in findings:
        for name in finding.quantities:
            kept = np.where(finding.where, np.nan, getattr(weather, name))
            weather = replace(weather, **{name: kept})
    return weather


def _temperature(site: Site, day: DailyWeather, ra: Floats, rso: Floats) -> Iterator[Finding]:
    span = day.tmax - day.tmin
    both = ("tmax", "tmin")
    yield Finding("temperature_inverted", span < 0.0, span, both)
    yield Finding("temperature_flat", span == 0.0, span, both)
    outside = (day.tmean > day.tmax + 0.1) | (day.tmean < day.tmin - 0.1)
    yield Finding("temperature_mean_outside", outside & (span > 0.0), day.tmean, ("tmean",))
    middle = (day.tmax + day.tmin) / 2.0
    far = np.abs(day.tmean - middle)
    yield Finding("temperature_mean_far", (far > RANGE_WARN) & ~outside, far)
    step = np.abs(np.diff(middle, prepend=np.nan))
    next_day = np.diff(day.date, prepend=day.date[:1]) == np.timedelta64(1, "D")
    yield Finding("temperature_step", (step > STEP_WARN) & next_day, step)


def _humidity(site: Site, day: DailyWeather, ra: Floats, rso: Floats) -> Iterator[Finding]:
    for name in ("rh_max", "rh_min", "rh_mean"):
        values: Floats = getattr(day, name)
        yield Finding("humidity_above_saturation", values > RH_LIMIT, values, (name,))
        yield Finding("humidity_negative", values < 0.0, values, (name,))
    span = day.rh_max - day.rh_min
    yield Finding("humidity_inverted", span < 0.0, span, ("rh_max", "rh_min"))
    dry = (day.rh_min < RH_DRY_AFTERNOON) & (day.rh_min >= 0.0)
    yield Finding("humidity_very_dry", dry, day.rh_min)
    yield Finding("dew_point_above_air", day.dew_point > day.tmax, day.dew_point, ("dew_point",))
    wrong = (day.vapour_pressure > saturation_vapour_pressure(day.tmax)) | (
        day.vapour_pressure < 0.0
    )
    yield Finding("vapour_above_saturation", wrong, day.vapour_pressure, ("vapour_pressure",))


def _wind_and_rain(site: Site, day: DailyWeather, ra: Floats, rso: Floats) -> Iterator[Finding]:
    stuck = (day.wind == 0.0) | _runs_of_same(day.wind, WIND_STUCK_DAYS)
    yield Finding("wind_stuck", stuck, day.wind, ("wind",))
    yield Finding("wind_negative", day.wind < 0.0, day.wind, ("wind",))
    low = (day.wind > 0.0) & (day.wind < WIND_FLOOR) & ~stuck
    yield Finding("wind_low", low, day.wind)
    yield Finding("rain_negative", day.rain < 0.0, day.rain, ("rain",))
    expected = atmospheric_pressure(site.elevation_m)
    off = np.abs(day.pressure / expected - 1.0) > PRESSURE_SHARE
    yield Finding("pressure_against_elevation", off, day.pressure)


def _shortwave(site: Site, day: DailyWeather, ra: Floats, rso: Floats) -> Iterator[Finding]:
    j = day_of_year(day.date)
    moist = clear_sky_envelope(
        ra,
        site.elevation_m,
        saturation_vapour_pressure(day.tmin - 2.0),
        daily_sine_of_elevation(site.latitude_deg, j),
    )
    envelope = np.fmax(rso, moist)
    down, up = day.shortwave_down, day.shortwave_up
    ratio = clear_sky_ratio(down, envelope)
    above = (down > ENVELOPE_FAIL * envelope) & (down > envelope + ENVELOPE_SLACK)
    yield Finding("shortwave_above_clear_sky", above, ratio, ("shortwave_down",))
    bright = (down > ENVELOPE_WARN * envelope) & (down > envelope + ENVELOPE_SLACK) & ~above
    yield Finding("shortwave_above_clear_sky", bright, ratio)
    dark = (down < DARKEST * ra) & ((ra > 1.0) | (down < -ENVELOPE_SLACK))
    yield Finding("shortwave_too_dark", dark, down, ("shortwave_down",))
    yield Finding("shortwave_up_negative", up < -ENVELOPE_SLACK, up, ("shortwave_up",))
    albedo = clear_sky_ratio(up, down)
    covered = (up > down) & (np.fmax(up, down) > ENVELOPE_SLACK)
    pair = ("shortwave_down", "shortwave_up")
    yield Finding("upward_above_downward", covered, albedo, pair)
    if site.reference_surface:
        low, high = GRASS_ALBEDO_RANGE
        strange = ((albedo < low) | (albedo > high)) & ~covered & ~dark & ~above
        yield Finding("albedo_not_grass", strange, albedo, ("shortwave_up",))
    length = day_length(site.latitude_deg, j)
    # sunshine recorders and the formula's day length differ by refraction and horizon
    long = (day.sunshine > 1.05 * length + 0.25) | (day.sunshine < 0.0)
    yield Finding("sunshine_too_long", long, day.sunshine, ("sunshine",))


def _longwave(site: Site, day: DailyWeather, ra: Floats, rso: Floats) -> Iterator[Finding]:
    down, up = day.longwave_down / WATTS_TO_MJ_DAY, day.longwave_up / WATTS_TO_MJ_DAY
    impossible_down = outside("longwave_down", down)
    impossible_up = outside("longwave_up", up)
    yield Finding("longwave_down_impossible", impossible_down, down, ("longwave_down",))
    yield Finding("longwave_up_impossible", impossible_up, up, ("longwave_up",))
    black = black_body_daily(day.tmax, day.tmin) / WATTS_TO_MJ_DAY
    off_air = ((down < 0.4 * black) | (down > black + 25.0)) & ~impossible_down
    yield Finding("longwave_down_against_air", off_air, down - black, ("longwave_down",))
    middle = (day.tmax + day.tmin) / 2.0 + KELVIN
    low, high = (black * ((middle + shift) / middle) ** 4 for shift in (-15.0, 25.0))
    off_surface = ((up < low) | (up > high)) & ~impossible_up
    yield Finding("longwave_up_against_air", off_surface, up - black, ("longwave_up",))
    apart = (down < up - 300.0) | (down > up + 25.0)
    single = apart & ~(impossible_down | impossible_up | off_air | off_surface)
    pair = ("longwave_down", "longwave_up")
    yield Finding("longwave_pair_apart", single, down - up, pair)
    open_sky = clear_sky_ratio(day.shortwave_down, rso) >= WINDOW_RATIO
    covered = open_sky & (down > black - WINDOW_GAP) & ~off_air & ~impossible_down
    yield Finding("window_covered", covered, down - black, ("longwave_down",))


def _net(site: Site, day: DailyWeather, ra: Floats, rso: Floats) -> Iterator[Finding]:
    rn = day.net_radiation
    most = np.where(np.isnan(day.shortwave_down), 0.85 * ra, day.shortwave_down) + 1.0
    wrong = (rn > most) | (rn < NET_LOWEST)
    yield Finding("net_impossible", wrong, rn, ("net_radiation",))
    parts = day.shortwave_down - day.shortwave_up + day.longwave_down - day.longwave_up
    share, least = NET_AGREES
    apart = np.abs(rn - parts) > np.maximum(share * np.abs(parts), least)
    yield Finding("net_against_components", apart & ~wrong, rn - parts)


def _runs_of_same(values: Floats, length: int) -> Bools:
    """Where a value stands in a run of at least `length` equal values; NaN breaks a run."""
    if values.size == 0:
        return np.zeros(0, dtype=np.bool_)
    starts = np.r_[True, values[1:] != values[:-1]]  # NaN differs from everything
    run = np.cumsum(starts) - 1
    return np.asarray((np.bincount(run) >= length)[run])


def tokens(findings: tuple[Finding, ...], days: int) -> list[str]:
    """Each day's findings as text, `check=figure` separated by spaces; the worst case is short.

    Arguments: `findings` on `days` days. Returns one string a day, empty where nothing bit.
    """
    texts: list[list[str]] = [[] for _ in range(days)]
    for finding in findings:
        for index in np.flatnonzero(finding.where):
            text = f"{finding.check}={finding.figure[index]:.3g}"
            if text not in texts[index]:
                texts[index].append(text)
    return [" ".join(parts) for parts in texts]
