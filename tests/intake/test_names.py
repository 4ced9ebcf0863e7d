"""Wordings of column names, English and Spanish, written the way loggers and people write them."""

import pytest

from app.intake.names import read_name

SAYS: dict[str, tuple[str | None, str | None]] = {
    "Temp (°F)": ("air_temperature", "degF"),
    "wind [mph]": ("wind_speed", "mph"),
    "Rs_MJ_m2": ("shortwave_down", "MJ/m2"),
    "Rs_MJ_m2_day": ("shortwave_down", "MJ/m2/d"),
    "solar_kW_m2": ("shortwave_down", "kW/m2"),
    "sw_in": ("shortwave_down", None),
    "sw_out": ("shortwave_up", None),
    "lw_in": ("longwave_down", None),
    "lw_out": ("longwave_up", None),
    "SWin_Wm2": ("shortwave_down", "W/m2"),
    "incoming longwave (W m-2)": ("longwave_down", "W/m2"),
    "reflected solar": ("shortwave_up", None),
    "sun down": ("shortwave_down", None),
    "sky infrared": ("longwave_down", None),
    "Net Radiation W/m2": ("net_radiation", "W/m2"),
    "Radiación neta": ("net_radiation", None),
    "Radiación solar (W/m2)": ("shortwave_down", "W/m2"),
    "onda larga entrante": ("longwave_down", None),
    "T_C": ("air_temperature", "degC"),
    "Ta_K": ("air_temperature", "K"),
    "Tmax": ("air_temperature_max", None),
    "TN": ("air_temperature_min", None),
    "Temp. máx. (ºC)": ("air_temperature_max", "degC"),
    "High Temp F": ("air_temperature_max", "degF"),
    "Avg air temp (F)": ("air_temperature", "degF"),
    "Temperatura media (ºC)": ("air_temperature", "degC"),
    "Dry-bulb (C)": ("air_temperature", "degC"),
    "Wet bulb (C)": ("wet_bulb", "degC"),
    "Bulbo húmedo (°C)": ("wet_bulb", "degC"),
    "Soil heat flux (W/m2)": ("soil_heat_flux", "W/m2"),
    "SHF_Avg (W/m^2)": ("soil_heat_flux", "W/m2"),
    "G (W m-2)": ("soil_heat_flux", "W/m2"),
    "Calor en el suelo (W/m²)": ("soil_heat_flux", "W/m2"),
    "Soil temperature (C)": (None, "degC"),
    "H (W/m2)": ("sensible_heat", "W/m2"),
    "Sensible heat flux W/m2": ("sensible_heat", "W/m2"),
    "LE (W/m2)": ("latent_heat", "W/m2"),
    "Calor latente (W/m2)": ("latent_heat", "W/m2"),
    "Global horizontal (W/m2)": ("shortwave_down", "W/m2"),
    "Dew-point (C)": ("dew_point", "degC"),
    "punto de rocío (°C)": ("dew_point", "degC"),
    "RH_pct": ("relative_humidity", "%"),
    "RHmin": ("relative_humidity_min", None),
    "Humedad relativa mínima": ("relative_humidity_min", None),
    "HR (%)": ("relative_humidity", "%"),
    "ea_kpa": ("vapour_pressure", "kPa"),
    "vapor pressure (hPa)": ("vapour_pressure", "hPa"),
    "VPD (kPa)": ("vapour_pressure_deficit", "kPa"),
    "u2": ("wind_speed", None),
    "wind_ms": ("wind_speed", "m/s"),
    "Wind_Run_km": ("wind_speed", "km"),
    "velocidad del viento": ("wind_speed", None),
    "precipitation": ("rain", None),
    "rain_in": ("rain", "inch"),
    "ppt_inches": ("rain", "inch"),
    "Lluvia (mm)": ("rain", "mm"),
    "P [mm]": ("rain", "mm"),
    "p_hpa": ("pressure", "hPa"),
    "P [kPa]": ("pressure", "kPa"),
    "Barometric pressure inHg": ("pressure", "inHg"),
    "AirTC_Avg": ("air_temperature", None),
    "AirTF (deg F)": ("air_temperature", "degF"),
    "DPT (C)": ("dew_point", "degC"),
    "TBH (°C)": ("wet_bulb", "degC"),
    "DPV (kPa)": ("vapour_pressure_deficit", "kPa"),
    "Rneta (W/m2)": ("net_radiation", "W/m2"),
    "Onda larga atmosférica (W/m2)": ("longwave_down", "W/m2"),
    "SunDur (h)": ("sunshine_hours", "h"),
    "sunshine (min)": ("sunshine_hours", "min"),
    "Insolación (h)": ("sunshine_hours", "h"),
    # not to be taken
    "Soil temp (°C)": (None, "degC"),
    "wind dir": (None, None),
    "Wind gust (m/s)": (None, "m/s"),
    "Wind speed max (m/s)": (None, "m/s"),
    "temp std": (None, None),
    "battery volt": (None, None),
    "body temp (C)": (None, "degC"),
    "ETo (mm)": (None, "mm"),
    "GHI source": (None, None),
    "DNI (W/m^2)": (None, "W/m2"),
    "PAR": (None, None),
    "weather": (None, None),
    "record": (None, None),
    "leaf wetness": (None, None),
    "sea level pressure (hPa)": (None, "hPa"),
}


@pytest.mark.parametrize("name", SAYS)
def test_name(name: str) -> None:
    says = read_name(name)
    assert (says.quantity, says.unit) == SAYS[name]
    assert says.why


def test_unit_and_kind_lines_belong_to_the_name() -> None:
    says = read_name("T", "Deg C", "Max")
    assert (says.quantity, says.unit) == ("air_temperature_max", "degC")
    assert read_name("wind", "meters/second", "Max").quantity is None


def test_an_unknown_unit_is_kept_as_written() -> None:
    assert read_name("wind speed (furlongs)").unknown_unit == "furlongs"
    assert read_name("wind", "V").unknown_unit == "V"


@pytest.mark.parametrize(
    ("name", "height"),
    [("wind 10m", 10.0), ("Viento 2m (m/s)", 2.0), ("u10", 10.0), ("wind at 3 m [km/h]", 3.0),
     ("wind (10 m)", 10.0), ("wind (m/s)", None), ("wind 250 m", None), ("w/m2", None)],
)  # fmt: skip
def test_height_in_the_name(name: str, height: float | None) -> None:
    assert read_name(name).height_m == height


def test_the_minute_is_a_unit_before_it_is_an_extreme() -> None:
    assert read_name("Sunshine_min", "min").quantity == "sunshine_hours"
    assert read_name("Tmin", "").quantity == "air_temperature_min"
