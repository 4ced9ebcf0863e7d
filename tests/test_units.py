"""Units against the general-purpose library pint, and written forms of units."""

import numpy as np
import pint
import pytest

from app.science.quantities import QUANTITIES
from app.units import UNITS, fits, from_si, parse_unit, to_si, units_for

REGISTRY = pint.UnitRegistry()
HOUR = 3600.0
# unit -> (pint expression of one unit, pint expression of the canonical unit, quantity). An amount
# over an interval is divided by an hour; langley is the thermochemical calorie per cm2, and the
# conventional mmHg and inHg are those of NIST Special Publication 811.
PINT = {
    "K": ("kelvin", "degC", "air_temperature"),
    "degF": ("degF", "degC", "air_temperature"),
    "hPa": ("hPa", "kPa", "pressure"),
    "mbar": ("mbar", "kPa", "pressure"),
    "Pa": ("Pa", "kPa", "pressure"),
    "bar": ("bar", "kPa", "pressure"),
    "mmHg": ("mmHg", "kPa", "pressure"),
    "inHg": ("inHg", "kPa", "pressure"),
    "psi": ("psi", "kPa", "pressure"),
    "atm": ("atm", "kPa", "pressure"),
    "km/h": ("km/hour", "m/s", "wind_speed"),
    "mph": ("mile/hour", "m/s", "wind_speed"),
    "knot": ("knot", "m/s", "wind_speed"),
    "ft/s": ("foot/s", "m/s", "wind_speed"),
    "km/d": ("km/day", "m/s", "wind_speed"),
    "mi/d": ("mile/day", "m/s", "wind_speed"),
    "km": ("km/hour", "m/s", "wind_speed"),
    "mi": ("mile/hour", "m/s", "wind_speed"),
    "kW/m2": ("kW/m^2", "W/m^2", "shortwave_down"),
    "MJ/m2": ("MJ/m^2/hour", "W/m^2", "shortwave_down"),
    "kJ/m2": ("kJ/m^2/hour", "W/m^2", "shortwave_down"),
    "J/cm2": ("J/cm^2/hour", "W/m^2", "shortwave_down"),
    "Wh/m2": ("W*hour/m^2/hour", "W/m^2", "shortwave_down"),
    "kWh/m2": ("kW*hour/m^2/hour", "W/m^2", "shortwave_down"),
    "langley": ("calorie/cm^2/hour", "W/m^2", "shortwave_down"),
    "MJ/m2/d": ("MJ/m^2/day", "W/m^2", "shortwave_down"),
    "kJ/m2/d": ("kJ/m^2/day", "W/m^2", "shortwave_down"),
    "J/cm2/d": ("J/cm^2/day", "W/m^2", "shortwave_down"),
    "Wh/m2/d": ("W*hour/m^2/day", "W/m^2", "shortwave_down"),
    "kWh/m2/d": ("kW*hour/m^2/day", "W/m^2", "shortwave_down"),
    "langley/d": ("calorie/cm^2/day", "W/m^2", "shortwave_down"),
    "MJ/m2/h": ("MJ/m^2/hour", "W/m^2", "shortwave_down"),
    "kJ/m2/h": ("kJ/m^2/hour", "W/m^2", "shortwave_down"),
    "langley/min": ("calorie/cm^2/minute", "W/m^2", "shortwave_down"),
    "cm": ("cm", "mm", "rain"),
    "inch": ("inch", "mm", "rain"),
    "hundredth inch": ("inch/100", "mm", "rain"),
    "mm/h": ("mm", "mm", "rain"),  # over one hour
    "inch/h": ("inch", "mm", "rain"),
    "min": ("minute", "hour", "sunshine_hours"),
    "s": ("second", "hour", "sunshine_hours"),
    "fraction": ("dimensionless", "percent", "relative_humidity"),
}
SI = {"degC", "%", "kPa", "m/s", "W/m2", "mm", "h"}


@pytest.mark.parametrize("unit", PINT)
def test_conversion_agrees_with_pint(unit: str) -> None:
    one, canonical, quantity = PINT[unit]
    whole, share, _ = one.partition("/100")
    for value in (0.0, 1.0, 37.5, 290.0):
        expected = REGISTRY.Quantity(value, REGISTRY.parse_units(whole))
        magnitude = expected.to(canonical).magnitude / (100 if share else 1)
        assert to_si(value, unit, quantity, HOUR) == pytest.approx(magnitude, rel=2e-6, abs=1e-9)


def test_every_unit_is_checked() -> None:
    assert set(PINT) | SI == set(UNITS)


def test_printed_values() -> None:
    """NIST Special Publication 811, Appendix B: conversion factors as printed."""
    assert to_si(1, "mph", "wind_speed", HOUR) == pytest.approx(0.44704, abs=0)
    assert to_si(1, "knot", "wind_speed", HOUR) == pytest.approx(0.5144444, abs=5e-8)
    assert to_si(1, "inch", "rain", HOUR) == pytest.approx(25.4, abs=0)
    assert to_si(1, "mmHg", "pressure", HOUR) == pytest.approx(0.1333224, abs=5e-8)
    assert to_si(1, "inHg", "pressure", HOUR) == pytest.approx(3.386389, abs=5e-7)
    assert to_si(1, "langley/d", "shortwave_down", HOUR) * 86400 == pytest.approx(41840)
    assert to_si(212, "degF", "air_temperature", HOUR) == pytest.approx(100)
    assert to_si(-40, "degF", "air_temperature", HOUR) == pytest.approx(-40)
    # FAO Irrigation and Drainage Paper 56 (1998), Table 3: 1 MJ m-2 d-1 = 11.6 W m-2, and
    # 1 cal cm-2 d-1 = 4.1868 10-2 MJ m-2 d-1 (another calorie, 0.07 % larger).
    assert to_si(1, "MJ/m2/d", "shortwave_down", HOUR) == pytest.approx(11.6, abs=0.05)
    assert to_si(100, "langley/d", "shortwave_down", 1) * 0.0864 == pytest.approx(4.1868, rel=1e-3)


@pytest.mark.parametrize("unit", UNITS)
def test_there_and_back(unit: str) -> None:
    quantity = next(name for name in QUANTITIES if fits(unit, name))
    values = np.array([0.0, 1.0, 33.3, np.nan])
    back = from_si(to_si(values, unit, quantity, 900), unit, quantity, 900)
    np.testing.assert_allclose(back, values, rtol=1e-12, atol=1e-12)


def test_energy_over_the_interval_depends_on_it() -> None:
    interval = np.array([900, 3600, 86400])
    found = to_si([1.0, 1.0, 1.0], "MJ/m2", "shortwave_down", interval)
    np.testing.assert_allclose(found, 1e6 / interval)
    assert to_si(2.0, "mm/h", "rain", 900) == pytest.approx(0.5)


def test_tenths_stay_tenths() -> None:
    assert to_si(958.0, "hPa", "pressure", 900) == 95.8


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("°C", "degC"), ("(ºC)", "degC"), ("Deg C", "degC"), ("degrees F", "degF"), ("[K]", "K"),
        ("W/m²", "W/m2"), ("W m-2", "W/m2"), ("w/m^2", "W/m2"), ("W·m⁻²", "W/m2"),
        ("watts per square meter", "W/m2"), ("MJ m-2 d-1", "MJ/m2/d"), ("MJ/m2/day", "MJ/m2/d"),
        ("MJ/m²", "MJ/m2"), ("langleys", "langley"), ("Ly", "langley"), ("ly/day", "langley/d"),
        ("m s-1", "m/s"), ("m.s-1", "m/s"), ("mph", "mph"), ("kts", "knot"), ("nudos", "knot"),
        ("km per day", "km/d"), ("km/h", "km/h"), ("hPa", "hPa"), ("mb", "mbar"), ("inHg", "inHg"),
        ("%", "%"), ("pct", "%"), ("fraction", "fraction"), ("in", "inch"), ("pulgadas", "inch"),
        ("pulg", "inch"), ("MJ/m²/día", "MJ/m2/d"),
        ("mm", "mm"), ("l/m2", "mm"), ("min", "min"), ("horas", "h"),
        ("furlongs", None), ("V", None), ("deg", None), ("mJ/m2", None), ("", None), ("°", None),
    ],
)  # fmt: skip
def test_written_forms(text: str, name: str | None) -> None:
    assert parse_unit(text) == name


def test_every_unit_name_reads_back() -> None:
    assert [parse_unit(name) for name in UNITS] == list(UNITS)


def test_what_does_not_fit_is_refused() -> None:
    with pytest.raises(ValueError, match="does not measure rain"):
        to_si(1.0, "mph", "rain", HOUR)
    with pytest.raises(ValueError, match="not known"):
        to_si(1.0, "furlong", "rain", HOUR)
    assert all(fits(unit.name, name) for name in QUANTITIES for unit in units_for(name))
