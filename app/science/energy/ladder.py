"""The ladder: a day's net radiation of the reference surface by the best rung that can be had."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from app.science import Bools, Floats
from app.science.constants import GRASS_EMISSIVITY
from app.science.energy.day_checks import CheckedDays
from app.science.energy.longwave import (
    black_body_daily,
    daily_ratio_or_polar_night,
    net_longwave_daily,
)
from app.science.energy.records import DailyWeather, Site
from app.science.energy.shortwave import net_shortwave
from app.science.energy.taught import Taught, taught_net_radiation, why_not_taught
from app.science.energy.usual import Usual
from app.science.energy.watch import WORDS
from app.science.quantities import QUANTITIES

USUAL = 9  # the last rung: no reading at all, only what is usual for the date
LEAST_UNCERTAINTY = 0.5  # MJ m-2 d-1, standard uncertainty of a day at best, working value
TEACHER_SHARE = 0.10  # of net radiation, rung 4 taught by another station, working value


@dataclass(frozen=True)
class Rung:
    """One way to obtain net radiation.

    `number` 1 (best) to 9; `name`; `needs` fields of DailyWeather; `share` standard uncertainty as
    a share of net radiation (working values); `reference_only` needs a reference surface under the
    sensor; `absent` reason code where nothing was handed in that the rung could rest on.
    """

    number: int
    name: str
    needs: tuple[str, ...]
    share: float
    reference_only: bool = False
    absent: str = ""


_EXTREMES = ("tmax", "tmin")
LADDER = (
    Rung(
        1,
        "four components",
        ("shortwave_down", "shortwave_up", "longwave_down", "longwave_up"),
        0.04,
        reference_only=True,
    ),
    Rung(2, "measured sky", ("shortwave_down", "longwave_down", *_EXTREMES), 0.05),
    Rung(3, "single net sensor", ("net_radiation",), 0.08, reference_only=True),
    Rung(4, "taught model", ("shortwave_down", *_EXTREMES), 0.08, absent="no_fit"),
    Rung(5, "model from solar", ("shortwave_down", *_EXTREMES), 0.12),
    Rung(6, "solar from neighbours", _EXTREMES, 0.14, absent="no_neighbours"),
    Rung(7, "sunshine hours", ("sunshine", *_EXTREMES), 0.14),
    Rung(8, "temperature range", _EXTREMES, 0.22),
    Rung(9, "usual for the date", (), 0.27, absent="outlook"),
)
RUNGS = {rung.number: rung for rung in LADDER}

_PLAIN = {
    "surface": "the ground under the sensor is not declared a reference surface",
    "no_fit": "no fit of measured on modelled longwave is at hand",
    "few_days": "too few measured days to teach the model",
    "no_spread": "the measured days are too much alike to teach the model",
    "no_gain": "teaching did not help on days the model had not seen",
    "outside_taught": "the day lies outside the range that was taught",
    "no_neighbours": "no neighbouring station's solar radiation is at hand",
    "undefined": "the equation has no value for this day",
}


def rung_name(rung: int) -> str:
    """The plain name of a rung, 0 (none) to 9; KeyError for any other number."""
    return "none" if rung == 0 else RUNGS[rung].name


def rung_share(rung: NDArray[np.int8]) -> Floats:
    """Standard uncertainty of each day's net radiation as a share of it; NaN for rung 0."""
    shares = np.array([np.nan] + [r.share for r in LADDER])
    return np.asarray(shares[rung])


def rn_uncertainty(
    rung: NDArray[np.int8], rn: Floats, from_teacher: Bools | bool = False
) -> Floats:
    """Standard uncertainty of a day's net radiation.

    Arguments: `rung` (days,); `rn` (days,) [MJ m-2 d-1]; `from_teacher` where another station
    taught rung 4. Returns MJ m-2 d-1, the larger of the rung's share and 0.5; NaN where there is
    no rung. Source: working values of the methods page.
    """
    least = np.where(rung > 0, LEAST_UNCERTAINTY, np.nan)
    share = np.where((rung == 4) & from_teacher, TEACHER_SHARE, rung_share(rung))
    return np.asarray(np.maximum(share * np.abs(rn), least))


def measured_sky(weather: DailyWeather) -> Floats:
    """Reference net radiation from measured downward short- and longwave (rung 2).

    Arguments: `weather` (days,). Returns (1 - 0.23) SWd + 0.98 (LWd - sigma Ta^4) [MJ m-2 d-1],
    the surface taken at air temperature. NaN gives NaN. Source: definition of net radiation,
    FAO-56 eq 38, 40; emissivity working value.
    """
    black = black_body_daily(weather.tmax, weather.tmin)
    net_longwave_down = GRASS_EMISSIVITY * (weather.longwave_down - black)
    return net_shortwave(weather.shortwave_down) + net_longwave_down


def modelled(weather: DailyWeather, vapour_pressure: Floats, rs: Floats, rso: Floats) -> Floats:
    """Reference net radiation from shortwave, temperature and humidity (rungs 5 to 8).

    Arguments, (days,): `weather`; `vapour_pressure` [kPa]; `rs`, `rso` [MJ m-2 d-1]. Returns
    Rns - Rnl [MJ m-2 d-1]. NaN gives NaN. Source: ASCE-EWRI eq 15-18.
    """
    ratio = daily_ratio_or_polar_night(rs, rso)
    return net_shortwave(rs) - net_longwave_daily(
        weather.tmax, weather.tmin, vapour_pressure, ratio
    )


@dataclass(frozen=True)
class Shortwave:
    """Rs of each day by source and Rso, (days,) [MJ m-2 d-1], for rungs without a pyranometer."""

    neighbours: Floats
    sunshine: Floats
    temperature: Floats
    clear_sky: Floats


def candidates(
    site: Site,
    weather: DailyWeather,
    vapour_pressure: Floats,
    shortwave: Shortwave,
    taught: Taught | None = None,
    usual: Usual | None = None,
) -> dict[int, Floats]:
    """Net radiation by every rung; NaN where a rung cannot serve.

    Arguments: `site`; `weather` with what failed set to NaN; `vapour_pressure` (days,) [kPa];
    `shortwave`; `taught` and `usual` where there are any. Returns rung number to (days,)
    [MJ m-2 d-1].
    """
    none = np.full(weather.date.shape, np.nan)
    rso = shortwave.clear_sky
    components = weather.shortwave_down - weather.shortwave_up
    components = components + weather.longwave_down - weather.longwave_up
    model = modelled(weather, vapour_pressure, weather.shortwave_down, rso)
    return {
        1: components if site.reference_surface else none,
        2: measured_sky(weather),
        3: weather.net_radiation if site.reference_surface else none,
        4: taught_net_radiation(taught, weather.shortwave_down, model) if taught else none,
        5: model,
        6: modelled(weather, vapour_pressure, shortwave.neighbours, rso),
        7: modelled(weather, vapour_pressure, shortwave.sunshine, rso),
        8: modelled(weather, vapour_pressure, shortwave.temperature, rso),
        9: usual_net_radiation(weather, vapour_pressure, usual, rso) if usual else none,
    }


def usual_net_radiation(
    weather: DailyWeather, vapour_pressure: Floats, usual: Usual, rso: Floats
) -> Floats:
    """Net radiation by the usual for the date (rung 9): what was measured, else what is usual.

    Arguments: `weather`, `vapour_pressure` [kPa], `usual`, `rso` [MJ m-2 d-1], all (days,).
    Returns MJ m-2 d-1. NaN gives NaN. Source: the methods page, ladder; ASCE-EWRI eq 15-18.
    """
    warm = replace(
        weather,
        tmax=np.where(np.isnan(weather.tmax), usual.tmax, weather.tmax),
        tmin=np.where(np.isnan(weather.tmin), usual.tmin, weather.tmin),
    )
    ea = np.where(np.isnan(vapour_pressure), usual.vapour_pressure, vapour_pressure)
    return modelled(warm, ea, usual.ratio * rso, rso)


def best_rung(
    by_rung: dict[int, Floats], numbers: tuple[int, ...] = tuple(RUNGS)
) -> tuple[Floats, NDArray[np.int8]]:
    """The value of the best rung on each day and its number (NaN and 0 where none serves).

    Arguments: `by_rung` rung number to (days,), at least one; `numbers` the rungs to look at.
    """
    shape = next(iter(by_rung.values())).shape
    best, rung = np.full(shape, np.nan), np.zeros(shape, dtype=np.int8)
    for number in sorted(n for n in by_rung if n in numbers):
        take = (rung == 0) & ~np.isnan(by_rung[number])
        best = np.where(take, by_rung[number], best)
        rung = np.where(take, np.int8(number), rung)
    return best, rung


def why_not(
    site: Site,
    checked: CheckedDays,
    rung: NDArray[np.int8],
    taught: Taught | None = None,
) -> NDArray[np.object_]:
    """Why no higher rung served, as codes: `1:surface 2:missing:longwave_down 5:failed:<check>`.

    Arguments: `site`; `checked` (days,); `rung` (days,) the rung that served, 0 none; `taught`
    (days,) where there is a fit. Returns text (days,), empty for rung 1; `explain_rung` reads it
    back.
    """
    quantities = sorted({need for r in LADDER for need in r.needs})
    checks = list(WORDS)
    # one state a quantity: 0 there, 1 missing, 2 + i set aside by check i; packed to find the
    # few distinct combinations, so that the text is made once for each
    packed = rung.astype(np.int64)
    states = []
    for quantity in quantities:
        values: Floats = getattr(checked.weather, quantity)
        state = np.where(np.isnan(values), 1, 0)
        for check, where in reversed(checked.failed_by(quantity)):
            state = np.where(where, 2 + checks.index(check), state)
        states.append(state)
        packed = packed * (2 + len(checks)) + state
    fits, fit = [""], np.zeros(rung.shape, dtype=np.int64)
    if taught is not None:
        names, fit = np.unique(why_not_taught(taught).astype(str), return_inverse=True)
        fits = names.tolist()
    packed = packed * len(fits) + fit
    _, first, which = np.unique(packed, return_index=True, return_inverse=True)
    texts = np.empty(first.size, dtype=np.object_)
    for i, day in enumerate(first):
        of_day = {q: int(s[day]) for q, s in zip(quantities, states, strict=True)}
        texts[i] = _reasons(site, int(rung[day]), of_day, checks, fits[fit[day]])
    return np.asarray(texts[which], dtype=np.object_)


def _reasons(site: Site, served: int, states: dict[str, int], checks: list[str], fit: str) -> str:
    higher = [r for r in LADDER if r.number < (served or 9)]
    return " ".join(f"{r.number}:{_reason(site, r, states, checks, fit)}" for r in higher)


def _reason(site: Site, rung: Rung, states: dict[str, int], checks: list[str], fit: str) -> str:
    if rung.absent and not (rung.number == 4 and fit):
        return rung.absent
    if rung.reference_only and not site.reference_surface:
        return "surface"
    missing = [need for need in rung.needs if states[need] == 1]
    if missing:
        return "missing:" + ",".join(missing)
    failed = {checks[states[need] - 2]: None for need in rung.needs if states[need] >= 2}
    if failed:
        return "failed:" + ",".join(failed)
    return fit if rung.number == 4 else "undefined"


_QUANTITY_OF = {
    "tmax": "air_temperature_max",
    "tmin": "air_temperature_min",
    "sunshine": "sunshine_hours",
}


def _term(field: str) -> str:
    """The trade's term for a field of DailyWeather that a rung needs."""
    return QUANTITIES[_QUANTITY_OF.get(field, field)].term


def explain_rung(code: str) -> list[tuple[int, str]]:
    """The reasons of a `why_not` code in plain words, one (rung, reason) for each higher rung.

    Arguments: `code` as StationDays.why_not holds it. Returns a list, empty for an empty code.
    Errors: ValueError naming a part that is no such code.
    """
    told = []
    for part in code.split():
        number, _, reason = part.partition(":")
        kind, _, names = reason.partition(":")
        if kind == "missing":
            text = "missing: " + ", ".join(_term(name) for name in names.split(","))
        elif kind == "failed":
            text = "; ".join(WORDS.get(name, name) for name in names.split(","))
        elif kind in _PLAIN and number.isdigit():
            text = _PLAIN[kind]
        else:
            raise ValueError(f"{part!r} is not a reason code of the ladder")
        told.append((int(number), text))
    return told
