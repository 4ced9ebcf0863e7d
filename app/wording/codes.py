"""Codes as words: standings, rungs, units, checks. One table for each."""

import warnings
from collections.abc import Mapping
from datetime import date, timedelta

from app.wording.figures import MINUS, days, short_day

CAUTION_TITLE = "Estimates to support a decision."
CAUTION = (
    "Local water rights, orders and delivery rules come first; a licensed or certified "
    "agronomist’s and the grower’s own judgement overrule these figures. Check the soil before a "
    "large application. Electrical, pumping and chemical-injection work follows local code and "
    "licensed practice."
)


class UnwordedCode(UserWarning):
    """A code has no word in its table."""


def word(table: Mapping[str, str], code: str) -> str:
    """The word of a code; a code without one warns and comes back with its underscores opened."""
    if code in table:
        return table[code]
    warnings.warn(f"no word for {code!r}", UnwordedCode, stacklevel=2)
    return code.replace("_", " ")


STANDINGS = {
    "late": "past its limit",
    "due": "passes its limit unless watered at one of the next two chances",
    "soon": "within three days after",
    "easy": "later",
    "wet": "at or above field capacity",
}
STAGES = ("initial", "development", "mid-season", "late season")
RUNGS = (
    *("none", "four components", "measured sky", "single net sensor", "taught model"),
    *("model from solar", "solar from neighbours", "sunshine hours", "temperature range"),
    "usual for the date",
)
HUMIDITY_RUNGS = (
    *("none", "vapour pressure or dew point", "RHmax and RHmin", "RHmax", "RHmean", "Tmin"),
)
WIND_RUNGS = ("none", "measured", "neighbours", "2 m/s assumed")


def higher_rungs(rungs: tuple[str, ...], served: int) -> list[str]:
    """What would have served better than rung `served` of humidity or wind and was not to be had
    that day; all of them where none served (0)."""
    return list(rungs[1 : served or len(rungs)])


VARIABLES = {
    "energy": "energy",
    "temperature": "temperature and humidity",
    "wind": "wind",
    "rain": "rain",
}
UNITS = {
    "hours": "h",
    "gross_mm": "mm gross",
    "net_mm": "mm net",
    "volume_m3": "m³",
    "rain_mm": "mm",
    "": "",
}
UNIT_CHOICES = {
    "hours": "hours",
    "gross_mm": "mm gross",
    "net_mm": "mm net",
    "volume_m3": "m³",
}
OWN_GAUGE = "mm of rain, own gauge"
PURPOSES = {
    "crop": "crop",
    "pre-plant": "pre-plant",
    "germination": "germination",
    "leaching": "leaching",
    "frost": "frost protection",
    "cooling": "cooling",
    "injection": "chemical injection",
}
CONFIRMATIONS = {
    "advised": "advised, not yet said to be done",
    "presumed": "presumed done",
    "reported": "reported",
    "metered": "metered",
    "measured": "measured",
}
UNCONFIRMED = frozenset({"advised", "presumed"})
INTAKE_STATES = {
    "previewed": "looked at, not taken in",
    "applied": "taken in",
    "undone": "undone",
    "same": "nothing new in it",
    "away": "put away",
}
SEVERITIES = {"refused": "not taken", "warning": "taken, doubted", "asked": "asks"}
ROLES = {"advisor": "advisor", "grower": "grower", "admin": "admin"}


def rung(code: int) -> str:
    """The plain name of a rung of net radiation."""
    return RUNGS[code] if 0 <= code < len(RUNGS) else word({}, f"rung_{code}")


def quantity_unit(unit: str) -> str:
    """A unit of the weather table as it is printed."""
    return PRINTED_UNITS.get(unit, unit)


PRINTED_UNITS = {
    "degC": "°C",
    "degF": "°F",
    "W/m2": "W/m²",
    "MJ/m2": "MJ/m²",
    "percent": "%",
}


def unsure(codes: str, stations: Mapping[str, str], on: date) -> list[str]:
    """Why the mark stands beside the standing, a sentence for each code.

    `stale:<station key>:<days>` and `range:<days>`; `stations` gives the names by key; `on` is the
    morning of the advice.
    """
    said = []
    for code in codes.split():
        kind, _, rest = code.partition(":")
        if kind == "stale":
            station, _, age = rest.partition(":")
            name, old = stations.get(station, station), int(float(age))
            since = short_day(on - timedelta(days=old)) if old < 9999 else ""
            last = f"last data {since}" if since else "has sent nothing yet"
            said.append(f"{name}: {last}; check the soil.")
        elif kind == "range":
            said.append(f"The range is wide: {days(int(float(rest)))} between early and late.")
        else:
            said.append(word({}, code))
    return said


# Checks and rungs that did not serve

QUANTITIES = {
    "shortwave_down": "downward shortwave",
    "shortwave_up": "upward shortwave",
    "longwave_down": "downward longwave",
    "longwave_up": "upward longwave",
    "net_radiation": "net radiation",
    "air_temperature": "air temperature",
    "tmax": "maximum temperature",
    "tmin": "minimum temperature",
    "tmean": "mean temperature",
    "vapour_pressure": "vapour pressure",
    "dew_point": "dew point",
    "relative_humidity": "relative humidity",
    "air_temperature_max": "maximum temperature",
    "air_temperature_min": "minimum temperature",
    "vapour_pressure_deficit": "vapour pressure deficit",
    "relative_humidity_max": "maximum relative humidity",
    "relative_humidity_min": "minimum relative humidity",
    "rh_max": "maximum relative humidity",
    "rh_min": "minimum relative humidity",
    "rh_mean": "mean relative humidity",
    "wind_speed": "wind speed",
    "wind": "wind speed",
    "sunshine": "sunshine duration",
    "sunshine_hours": "sunshine duration",
    "pressure": "air pressure",
    "wet_bulb": "wet bulb temperature",
    "soil_heat_flux": "soil heat flux",
    "sensible_heat": "sensible heat flux",
    "latent_heat": "latent heat flux",
    "rain": "rain",
    "humidity": "humidity",
    "temperature": "temperature",
}
FLAGS = {
    "temperature_inverted": "the highest temperature is below the lowest",
    "temperature_flat": "temperature did not move all day",
    "temperature_mean_outside": "the mean temperature lies outside the day’s extremes",
    "temperature_mean_far": "the mean temperature is far from the middle of the extremes",
    "temperature_step": "temperature jumped from the day before",
    "humidity_above_saturation": "relative humidity is above 105 %",
    "humidity_negative": "relative humidity is below zero",
    "humidity_inverted": "the highest humidity is below the lowest",
    "humidity_very_dry": "the lowest humidity is below 5 %",
    "dew_point_above_air": "the dew point is above the highest temperature",
    "vapour_above_saturation": "vapour pressure is above saturation",
    "wind_stuck": "wind stood still, or at one figure for days",
    "wind_negative": "wind is below zero",
    "wind_low": "wind is below 0.5 m/s",
    "shortwave_above_clear_sky": "shortwave is above clear sky",
    "shortwave_too_dark": "shortwave is darker than the densest cloud",
    "upward_above_downward": "upward shortwave is above downward: snow or dirt on the upper dome",
    "shortwave_up_negative": "upward shortwave is below zero",
    "albedo_not_grass": "the albedo is not that of grass",
    "longwave_down_impossible": "downward longwave is outside the physically possible",
    "longwave_up_impossible": "upward longwave is outside the physically possible",
    "longwave_down_against_air": "downward longwave does not fit the air temperature",
    "longwave_up_against_air": "upward longwave does not fit the air temperature",
    "shortwave_swapped": "downward and upward shortwave look swapped",
    "longwave_swapped": "downward and upward longwave look swapped",
    "body_term_missing": "longwave lacks the radiation of the sensor’s own body",
    "shortwave_dead": "the shortwave sensor reads nothing under the sun",
    "longwave_dead": "the longwave sensor does not move",
    "shortwave_unit": "shortwave is far above clear sky: a wrong unit or factor",
    "net_rows_against_components": "net radiation differs from its components row by row",
    "albedo_against_surface": "the albedo is not that of the declared surface",
    "snow_on_dome": "snow or dirt on the dome, hours with more light from below than above",
    "night_offset": "the pyranometer’s night reading is below −2 W/m²",
    "window_hours": "frost, dew, snow or dust on the longwave window, hours",
    "window_undecidable": "fog, or a covered longwave window, hours",
    "clock": "the logger’s clock runs ahead of the sun, minutes",
    "tilt": "the pyranometer leans to the east (minus: west), degrees at least",
    "level": "clear days are off clear sky by this share: level, dirt or calibration",
    "marked_bad": "marked as not to be used",
    "longwave_pair_apart": "the two longwaves are too far apart",
    "window_covered": "the longwave window read like a black body under an open sky: covered",
    "net_impossible": "net radiation is more than the sun gives or less than a night takes",
    "net_against_components": "net radiation differs from its four components",
    "sunshine_too_long": "sunshine is longer than the day",
    "pressure_against_elevation": "air pressure does not fit the station’s elevation",
    "rain_negative": "rain is below zero",
    "possible": "outside the physically possible",
    "below_upward": "below upward shortwave: snow or dirt on the upper dome",
    "above_downward": "above downward shortwave: snow or dirt on the upper dome",
    "against_air": "does not fit the air temperature",
    "against_upward": "does not fit upward longwave",
    "against_downward": "does not fit downward longwave",
    "above_shortwave": "above what the sun gives",
    "above_saturation": "above saturation",
    "stuck": "the same figure all day",
    "rare": "physically possible, but extremely rare",
    "albedo": "upward shortwave is no share of downward that any ground reflects",
    "very_dry": "below 5 %",
    "low": "below 0.5 m/s all day",
    "step": "changes faster than weather does",
    "hourly_incomplete": "not all hours: the day’s own equation, times the usual ratio of both",
    "hourly_without_ratio": "not all hours, and no ratio yet: the day’s own equation",
}
NOTES = {
    "missing": "missing",
    "filled": "filled over a short gap",
    "set_aside": "set aside",
    "offset": "below zero at night, counted as zero",
    "clipped": "clipped to 100 %",
    "warned": "used, but odd",
}
WHY_NOT = {
    "surface": "the site is not declared clipped, watered grass",
    "missing": "no {what}",
    "failed": "{what}",
    "no_fit": "no fit of measured on modelled longwave yet",
    "few_days": "fewer than 20 measured days before it to teach the model",
    "no_spread": "the measured days before it are too alike to teach the model",
    "no_gain": "teaching the model did not help on days it had not seen",
    "outside_taught": "the day lies outside what the model was taught",
    "no_neighbours": "no neighbour’s solar radiation at hand",
    "outlook": "no record of the date yet",
    "undefined": "the equation has no value for this day",
}


def flag_words(flags: str) -> list[str]:
    """The checks of a day in words, each with the figure that raised it."""
    said = []
    for flag in flags.split():
        name, _, figure = flag.partition("=")
        said.append(
            f"{check_word(name)} ({figure.replace('-', MINUS)})" if figure else check_word(name)
        )
    return said


def check_word(name: str) -> str:
    """A check by its name, `check` or `quantity/check`."""
    quantity, _, check = name.rpartition("/")
    said = word(FLAGS, check)
    return f"{word(QUANTITIES, quantity)}: {said}" if quantity else said


def why_codes(codes: str) -> list[tuple[int, str]]:
    """`1:surface 2:missing:longwave_down` as rung and reason in words."""
    found = []
    for code in codes.split():
        rung_text, _, rest = code.partition(":")
        kind, _, what = rest.partition(":")
        table = FLAGS if kind == "failed" else QUANTITIES
        named = ", ".join(word(table, item) for item in what.split(",") if item)
        found.append((int(rung_text), word(WHY_NOT, kind).format(what=named)))
    return found


def why_not_rung(codes: str, number: int) -> str:
    """Why a rung did not serve; nothing where its reason is not among the codes."""
    return "; ".join(reason for code, reason in why_codes(codes) if code == number)
