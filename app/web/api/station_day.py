"""A station's day as the API gives it: what was measured, by which rung, and what was found."""

from collections.abc import Mapping
from datetime import date
from typing import Any

import numpy as np
from pydantic import BaseModel, Field

from app import wording
from app.science.constants import WIND_FLOOR
from app.science.energy.humidity import HUMIDITY_SHARE
from app.science.energy.wind import WIND_SHARE
from app.web.api.schemas import Number

ENERGY = "MJ m-2 d-1"
SUM = Field(description=ENERGY)
DEPTH = Field(description="mm d-1")
DEGREES = Field(description="degC")


class RungOut(BaseModel):
    """The rung that served; 0 where none did."""

    number: int = Field(examples=[2])
    not_to_be_had: list[str] = Field(description="what would have served better that day")
    name: str = Field(examples=["RHmax and RHmin"])
    uncertainty: Number = Field(
        description="one standard uncertainty, in the unit of the value: kPa, m s-1"
    )


class WhyNotOut(BaseModel):
    """A better rung of net radiation, and why it did not serve."""

    rung: int = Field(examples=[1])
    reason: str = Field(examples=["the site is not declared clipped, watered grass"])


class CheckOut(BaseModel):
    """A check that bit, with the figure that raised it."""

    check: str = Field(description="code", examples=["window_hours"])
    figure: Number = Field(examples=[4.0])
    says: str


class StationDayOut(BaseModel):
    """One day, local standard midnight to midnight; null where it is not known."""

    day: date
    tmax: Number = DEGREES
    tmin: Number = DEGREES
    tmean: Number = DEGREES
    rh_max: Number = Field(description="%")
    rh_min: Number = Field(description="%")
    rh_min_used: Number = Field(description="%, estimated where not measured")
    vapour_pressure: Number = Field(description="kPa")
    wind_2m: Number = Field(description="m s-1, at 2 m over grass")
    rain: Number = Field(description="mm")
    shortwave_down: Number = SUM
    shortwave_up: Number = SUM
    longwave_down: Number = SUM
    longwave_up: Number = SUM
    rs: Number = Field(description=f"{ENERGY}, shortwave the day rests on, by its rung")
    rso: Number = Field(description=f"{ENERGY}, clear sky")
    ra: Number = Field(description=f"{ENERGY}, above the atmosphere")
    rung: int = Field(description="of net radiation, 1 best to 9; 0 where none served")
    rung_name: str = Field(examples=["model from solar"])
    why_not: list[WhyNotOut]
    humidity: RungOut
    wind: RungOut
    rn: Number = Field(description=f"{ENERGY}, of the reference surface, by the rung that served")
    rn_uncertainty: Number = Field(description=f"{ENERGY}, one standard uncertainty")
    rn_measured: Number = Field(description=f"{ENERGY}, by the best measured rung")
    rn_modelled: Number = Field(description=f"{ENERGY}, by the model from solar, beside it")
    eto: Number = Field(description="mm d-1, short reference")
    etr: Number = Field(description="mm d-1, tall reference")
    eto_uncertainty: Number = Field(description="mm d-1, one standard uncertainty")
    eto_daily: Number = Field(description="mm d-1, by the daily equation at an hourly station")
    etr_daily: Number = DEPTH
    eto_hours: Number = Field(description="mm d-1, sum of complete hours")
    etr_hours: Number = DEPTH
    net_radiation: Number = Field(description=f"{ENERGY}, over what lies under the sensors")
    soil_heat_flux: Number = SUM
    sensible_heat: Number = SUM
    latent_heat: Number = SUM
    et_by_residual: Number = Field(description="mm d-1, (Rn - G - H) as water")
    clear_level: Number = Field(description="shortwave over clear sky, on clear days")
    clear_tilt_deg: Number = Field(description="lean to the east, degrees, on clear days")
    clear_clock_min: Number = Field(description="minutes the clock runs ahead, on clear days")
    checks: list[CheckOut]
    notes: list[str] = Field(
        description="quantity:what:intervals:check, of values missing, filled or set aside"
    )


class StationDaysOut(BaseModel):
    """Days of a station, oldest first."""

    station: str
    caution: str
    days: list[StationDayOut]


def day_out(row: Mapping[str, Any], et_by_residual: float | None) -> StationDayOut:
    """A stored day with its codes opened."""
    humidity, wind = row["humidity_rung"], row["wind_rung"]
    told = {
        "rung_name": wording.rung(row["rung"]),
        "why_not": [
            WhyNotOut(rung=rung, reason=reason)
            for rung, reason in wording.why_codes(row["why_not"])
        ],
        "humidity": RungOut(
            number=humidity,
            not_to_be_had=wording.higher_rungs(wording.HUMIDITY_RUNGS, humidity),
            name=wording.HUMIDITY_RUNGS[humidity],
            uncertainty=_share_of(HUMIDITY_SHARE[humidity], row["vapour_pressure"]),
        ),
        "wind": RungOut(
            number=wind,
            not_to_be_had=wording.higher_rungs(wording.WIND_RUNGS, wind),
            name=wording.WIND_RUNGS[wind],
            uncertainty=_share_of(WIND_SHARE[wind], row["wind_2m"], WIND_FLOOR),
        ),
        "et_by_residual": et_by_residual,
        "checks": [_check(flag) for flag in row["flags"].split()],
        "notes": row["notes"].splitlines(),
    }
    return StationDayOut.model_validate({**row, **told})


def _share_of(share: float, value: float | None, floor: float = 0.0) -> float | None:
    """Nothing for a missing value, or for rung 0, whose share is NaN."""
    return None if value is None or np.isnan(share) else float(share) * max(value, floor)


def _check(flag: str) -> CheckOut:
    check, _, figure = flag.partition("=")
    return CheckOut(
        check=check,
        figure=float(figure) if figure and figure != "nan" else None,
        says=wording.check_word(check),
    )
