"""The one place where the units of files and people become the units of the program, and back.

A unit is a straight line, `si = value * factor + shift`, into the canonical unit of its dimension.
Factors are exact by definition where the unit is defined that way (International System of Units,
9th edition; NIST Special Publication 811); tests hold them against the library pint.
"""

import re
import unicodedata
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science.quantities import QUANTITIES

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Unit:
    """One unit: `si = value * factor + shift`.

    `per`: "rate" (taken as it is), "interval" (an amount over the row's own interval, divided by
    its seconds), "seconds" (a rate that becomes an amount, multiplied by them).
    """

    name: str
    label: str
    dimension: str
    factor: float
    shift: float = 0.0
    per: str = "rate"


_INCH_MM = 25.4
_LANGLEY_J_M2 = 41840.0  # thermochemical calorie per square centimetre
_TABLE = (
    Unit("degC", "°C", "temperature", 1.0),
    Unit("degF", "°F", "temperature", 5.0 / 9.0, -160.0 / 9.0),
    Unit("K", "K", "temperature", 1.0, -273.15),
    Unit("%", "%", "humidity", 1.0),
    Unit("fraction", "fraction 0 to 1", "humidity", 100.0),
    Unit("kPa", "kPa", "pressure", 1.0),
    Unit("hPa", "hPa", "pressure", 0.1),
    Unit("mbar", "mbar", "pressure", 0.1),
    Unit("Pa", "Pa", "pressure", 0.001),
    Unit("bar", "bar", "pressure", 100.0),
    Unit("mmHg", "mmHg", "pressure", 0.133322387415),
    Unit("inHg", "inHg", "pressure", 3.386388640341),
    Unit("psi", "psi", "pressure", 6.894757293168),
    Unit("atm", "atm", "pressure", 101.325),
    Unit("m/s", "m/s", "speed", 1.0),
    Unit("km/h", "km/h", "speed", 1.0 / 3.6),
    Unit("mph", "mph", "speed", 0.44704),
    Unit("knot", "knots", "speed", 1852.0 / 3600.0),
    Unit("ft/s", "ft/s", "speed", 0.3048),
    Unit("km/d", "km a day (wind run)", "speed", 1000.0 / 86400.0),
    Unit("mi/d", "miles a day (wind run)", "speed", 1609.344 / 86400.0),
    Unit("km", "km in the interval (wind run)", "speed", 1000.0, per="interval"),
    Unit("mi", "miles in the interval (wind run)", "speed", 1609.344, per="interval"),
    Unit("W/m2", "W/m²", "irradiance", 1.0),
    Unit("kW/m2", "kW/m²", "irradiance", 1000.0),
    Unit("MJ/m2", "MJ/m² in the interval", "irradiance", 1.0e6, per="interval"),
    Unit("kJ/m2", "kJ/m² in the interval", "irradiance", 1.0e3, per="interval"),
    Unit("J/cm2", "J/cm² in the interval", "irradiance", 1.0e4, per="interval"),
    Unit("Wh/m2", "Wh/m² in the interval", "irradiance", 3600.0, per="interval"),
    Unit("kWh/m2", "kWh/m² in the interval", "irradiance", 3.6e6, per="interval"),
    Unit("langley", "langley in the interval", "irradiance", _LANGLEY_J_M2, per="interval"),
    Unit("MJ/m2/d", "MJ/m² a day", "irradiance", 1.0e6 / 86400.0),
    Unit("kJ/m2/d", "kJ/m² a day", "irradiance", 1.0e3 / 86400.0),
    Unit("J/cm2/d", "J/cm² a day", "irradiance", 1.0e4 / 86400.0),
    Unit("Wh/m2/d", "Wh/m² a day", "irradiance", 1.0 / 24.0),
    Unit("kWh/m2/d", "kWh/m² a day", "irradiance", 1000.0 / 24.0),
    Unit("langley/d", "langley a day", "irradiance", _LANGLEY_J_M2 / 86400.0),
    Unit("MJ/m2/h", "MJ/m² an hour", "irradiance", 1.0e6 / 3600.0),
    Unit("kJ/m2/h", "kJ/m² an hour", "irradiance", 1.0e3 / 3600.0),
    Unit("langley/min", "langley a minute", "irradiance", _LANGLEY_J_M2 / 60.0),
    Unit("mm", "mm", "depth", 1.0),
    Unit("cm", "cm", "depth", 10.0),
    Unit("inch", "inches", "depth", _INCH_MM),
    Unit("hundredth inch", "hundredths of an inch", "depth", _INCH_MM / 100.0),
    Unit("mm/h", "mm an hour", "depth", 1.0 / 3600.0, per="seconds"),
    Unit("inch/h", "inches an hour", "depth", _INCH_MM / 3600.0, per="seconds"),
    Unit("h", "hours", "duration", 1.0),
    Unit("min", "minutes", "duration", 1.0 / 60.0),
    Unit("s", "seconds", "duration", 1.0 / 3600.0),
)
UNITS: dict[str, Unit] = {unit.name: unit for unit in _TABLE}

_DIMENSION_OF_SI = {
    "degC": "temperature",
    "%": "humidity",
    "kPa": "pressure",
    "m/s": "speed",
    "W/m2": "irradiance",
    "mm": "depth",
    "h": "duration",
}

# Written forms, after `_plain` has brought them to one shape.
_ALIASES: dict[str, str] = {
    alias: name
    for name, aliases in {
        "degC": "c degc celsius centigrade deg_c oc gradosc grados_c gradoscentigrados celcius",
        "degF": "f degf fahrenheit deg_f of gradosf",
        "K": "k kelvin degk",
        "%": "% pct percent percentage %rh porcentaje por_ciento perc rh%",
        "fraction": "fraction frac fraccion 0-1 1/1 fraction0to1 decimal",
        "kPa": "kpa kilopascal",
        "hPa": "hpa hectopascal",
        "mbar": "mbar mb millibar millibars milibar",
        "Pa": "pa pascal",
        "bar": "bar",
        "mmHg": "mmhg torr",
        "inHg": "inhg inchhg in_hg inhgabs",
        "psi": "psi",
        "atm": "atm",
        "m/s": "m/s ms ms-1 mps m/sec meters/second meters/s metros/s m/seg metre/s meter/s"
        " meterspersecond metrespersecond",
        "km/h": "km/h kph kmh kmh-1 kmph km/hr km/hora",
        "mph": "mph mi/h miles/h miles/hour mi/hr milesperhour",
        "knot": "knot knots kn kt kts nudo nudos",
        "ft/s": "ft/s fps ft/sec feet/s fts-1",
        "km/d": "km/d km/day kmd-1 km/dia",
        "mi/d": "mi/d mi/day miles/d miles/day",
        "km": "km",
        "mi": "mi miles mile",
        "W/m2": "w/m2 wm-2 wm2 watts/m2 watt/m2 w/sqm wattspersquaremeter w.m-2 watts/meter2 wpm2",
        "kW/m2": "kw/m2 kwm-2 kwm2",
        "MJ/m2": "mj/m2 mjm-2 mjm2 megajoules/m2 mj/sqm",
        "kJ/m2": "kj/m2 kjm-2 kjm2",
        "J/cm2": "j/cm2 jcm-2 jcm2",
        "Wh/m2": "wh/m2 whm-2 whm2 watthours/m2",
        "kWh/m2": "kwh/m2 kwhm-2 kwhm2",
        "langley": "ly langley langleys lang cal/cm2 calcm-2 calcm2",
        "MJ/m2/d": "mj/m2/d mj/m2/day mjm-2d-1 mjm-2day-1 mj/m2d mj/m2day mjm2d mjm2day mj/m2/dia"
        " mj/(m2d) mj/day/m2 mj/d/m2",
        "kJ/m2/d": "kj/m2/d kj/m2/day kjm-2d-1",
        "J/cm2/d": "j/cm2/d j/cm2/day jcm-2d-1",
        "Wh/m2/d": "wh/m2/d wh/m2/day whm-2d-1",
        "kWh/m2/d": "kwh/m2/d kwh/m2/day kwhm-2d-1",
        "langley/d": "ly/d ly/day langley/d langley/day langleys/day cal/cm2/day cal/cm2/d",
        "MJ/m2/h": "mj/m2/h mj/m2/hr mj/m2/hour mjm-2h-1",
        "kJ/m2/h": "kj/m2/h kj/m2/hr kjm-2h-1",
        "langley/min": "ly/min langley/min cal/cm2/min",
        "mm": "mm millimeter millimetre millimeters millimetres milimetros l/m2 lm-2",
        "cm": "cm centimeter centimetre",
        "inch": "in inch inches pulg pulgada pulgadas \" ''",
        "hundredth inch": "in/100 0.01in 1/100in hundredthsofaninch",
        "mm/h": "mm/h mm/hr mmh-1 mm/hour",
        "inch/h": "in/h in/hr inch/h inches/hr inches/hour",
        "h": "h hr hrs hour hours hora horas",
        "min": "min mins minute minutes minuto minutos",
        "s": "s sec secs second seconds segundos",
    }.items()
    for alias in aliases.split()
}
_WORDS = str.maketrans(
    {"²": "2", "³": "3", "º": "", "°": "", "·": "", "⋅": "", "*": "", "^": "", "−": "-", "⁻": "-",
     "¹": "1", "µ": "u", "˚": "", "％": "%", "″": '"'}
)  # fmt: skip
_CASE_MATTERS = {"Ly": "langley", "MB": "mbar", "M/S": "m/s", "mJ/m2": None, "mw/m2": None}


def parse_unit(text: str) -> str | None:
    """Name of the unit a header or unit line writes as `text`; None when it is not known."""
    stripped = text.strip().strip("[](){}<>").strip()
    if stripped in UNITS:
        return stripped
    if stripped in _CASE_MATTERS:
        return _CASE_MATTERS[stripped]
    return _ALIASES.get(_plain(stripped))


def _plain(text: str) -> str:
    low = unicodedata.normalize("NFKD", text.translate(_WORDS).lower().replace("**", ""))
    low = "".join(letter for letter in low if not unicodedata.combining(letter))
    low = re.sub(r"\bper\b|\bpor\b", "/", low)
    low = re.sub(r"\bsq(?:uare|\.)?\s*m(?:et(?:er|re)s?)?\b|\bsqm\b", "m2", low)
    low = re.sub(r"^(deg(?:rees?|s)?|grados?)[\s._]*(?=[cfk])", "", low)
    low = re.sub(r"\s*/\s*", "/", low)
    low = re.sub(r"(?<=[a-z])\.(?=[a-z])", "", low)
    low = re.sub(r"m-?2[\s._]+", lambda match: match.group().strip(" ._"), low)
    return re.sub(r"[\s]+", "", low)


def units_for(quantity: str) -> tuple[Unit, ...]:
    """Units a value of `quantity` (a name of QUANTITIES) may be written in, SI first."""
    dimension = _DIMENSION_OF_SI[QUANTITIES[quantity].unit]
    return tuple(unit for unit in _TABLE if unit.dimension == dimension)


def fits(unit: str, quantity: str) -> bool:
    """Whether `unit` measures what `quantity` is."""
    return UNITS[unit].dimension == _DIMENSION_OF_SI[QUANTITIES[quantity].unit]


def to_si(values: ArrayLike, unit: str, quantity: str, interval_s: ArrayLike) -> Floats:
    """Values in `unit` as the canonical unit of `quantity`; NaN stays NaN.

    An energy or a wind run over the row's interval becomes a mean over it; `interval_s` [s] is
    used for these alone. Errors: ValueError when the unit does not measure the quantity.
    """
    factor, shift = _line(unit, quantity, interval_s)
    given = np.asarray(values, np.float64)
    parts = round(1.0 / float(factor)) if factor.ndim == 0 else 0
    if parts > 1 and abs(parts * float(factor) - 1.0) < 1e-12:
        return given / parts + shift  # tenths stay tenths: 958 hPa is 95.8 kPa to the last bit
    return given * factor + shift


def from_si(values: ArrayLike, unit: str, quantity: str, interval_s: ArrayLike = 86400) -> Floats:
    """Canonical values of `quantity` written in `unit`: the reverse of `to_si`."""
    factor, shift = _line(unit, quantity, interval_s)
    return (np.asarray(values, np.float64) - shift) / factor


def _line(unit: str, quantity: str, interval_s: ArrayLike) -> tuple[Floats, float]:
    if unit not in UNITS:
        raise ValueError(f"unit {unit!r} is not known; use one of {', '.join(UNITS)}")
    if not fits(unit, quantity):
        allowed = ", ".join(u.name for u in units_for(quantity))
        raise ValueError(f"{unit} does not measure {quantity}; use one of {allowed}")
    found = UNITS[unit]
    seconds = np.asarray(interval_s, np.float64)
    factor = np.asarray(found.factor, np.float64)
    if found.per == "interval":
        factor = factor / seconds
    elif found.per == "seconds":
        factor = factor * seconds
    return factor, found.shift
