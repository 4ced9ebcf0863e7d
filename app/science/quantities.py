"""The one table of weather quantities: name, unit, plausible range, the field's own term."""

from dataclasses import dataclass
from typing import Literal

from app.science import Bools, Floats

Kind = Literal["mean", "max", "min", "sum"]


@dataclass(frozen=True)
class Quantity:
    """A measured weather quantity and the range outside which one row's value is impossible.

    Arguments: canonical `name`, `term` of the trade, SI `unit`, `kind` of figure over the row's
    interval, `low` and `high` in the same unit.
    Source of the radiation ranges: Global Network recommended QC tests V2.0, physically possible
    limits rounded outwards; the others are world extremes rounded outwards (from memory).
    """

    name: str
    term: str
    unit: str
    kind: Kind
    low: float
    high: float


_TABLE = (
    Quantity("air_temperature", "air temperature", "degC", "mean", -80.0, 60.0),
    Quantity("air_temperature_max", "maximum air temperature", "degC", "max", -80.0, 60.0),
    Quantity("air_temperature_min", "minimum air temperature", "degC", "min", -90.0, 60.0),
    Quantity("relative_humidity", "relative humidity", "%", "mean", 0.0, 110.0),
    Quantity("relative_humidity_max", "maximum relative humidity", "%", "max", 0.0, 110.0),
    Quantity("relative_humidity_min", "minimum relative humidity", "%", "min", 0.0, 110.0),
    Quantity("dew_point", "dew point", "degC", "mean", -90.0, 40.0),
    Quantity("vapour_pressure", "vapour pressure", "kPa", "mean", 0.0, 7.5),
    Quantity("vapour_pressure_deficit", "vapour pressure deficit", "kPa", "mean", 0.0, 15.0),
    Quantity("wind_speed", "wind speed", "m/s", "mean", 0.0, 75.0),
    Quantity("shortwave_down", "downward shortwave", "W/m2", "mean", -20.0, 2200.0),
    Quantity("shortwave_up", "upward shortwave", "W/m2", "mean", -20.0, 1800.0),
    Quantity("longwave_down", "downward longwave", "W/m2", "mean", 40.0, 700.0),
    Quantity("longwave_up", "upward longwave", "W/m2", "mean", 40.0, 900.0),
    Quantity("net_radiation", "net radiation", "W/m2", "mean", -300.0, 1300.0),
    Quantity("sunshine_hours", "sunshine duration", "h", "sum", 0.0, 24.0),
    Quantity("rain", "rain", "mm", "sum", 0.0, 2000.0),
    Quantity("pressure", "air pressure", "kPa", "mean", 45.0, 110.0),
    Quantity("wet_bulb", "wet bulb temperature", "degC", "mean", -50.0, 40.0),
    Quantity("soil_heat_flux", "soil heat flux", "W/m2", "mean", -500.0, 500.0),
    Quantity("sensible_heat", "sensible heat flux", "W/m2", "mean", -500.0, 1000.0),
    Quantity("latent_heat", "latent heat flux", "W/m2", "mean", -500.0, 1200.0),
)

QUANTITIES: dict[str, Quantity] = {quantity.name: quantity for quantity in _TABLE}


def outside(name: str, values: Floats) -> Bools:
    """Where values lie outside their quantity's plausible range; NaN does not.

    Arguments: `name` in QUANTITIES; `values`, any shape, in that quantity's unit. Returns the same
    shape. Errors: KeyError for an unknown name.
    """
    quantity = QUANTITIES[name]
    return (values < quantity.low) | (values > quantity.high)
