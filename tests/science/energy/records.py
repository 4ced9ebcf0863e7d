"""Real records of tests/data/radiation, read for the energy tests (see the README there)."""

from dataclasses import dataclass, replace
from functools import cache
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
from numpy.typing import NDArray

from app.science.energy.humidity import saturation_vapour_pressure
from app.science.energy.records import DailyWeather, Site

FOLDER = Path(__file__).parents[2] / "data" / "radiation"
PAYERNE = Site(46.815, 6.944, 491.0, 1.0, reference_surface=True)  # short grass
ALAMOSA = Site(37.70, -105.92, 2317.0, -7.0, wind_height_m=10.0)
MJ = 0.0864  # MJ m-2 d-1 per W m-2


@dataclass(frozen=True)
class Record:
    middle: NDArray[np.int64]  # middle of each interval, UTC s
    values: dict[str, NDArray[np.float64]]  # canonical quantity to rows


@cache
def payerne_rows() -> Record:
    """June 2016, 15 minutes, complete."""
    table = pd.read_csv(FOLDER / "payerne_2016-06_15min.csv", parse_dates=["end"])
    names = {
        "sw_in": "shortwave_down",
        "sw_out": "shortwave_up",
        "lw_in": "longwave_down",
        "lw_out": "longwave_up",
        "t": "air_temperature",
        "rh": "relative_humidity",
        "rn4": "net_radiation",
    }
    end = table["end"].to_numpy().astype("datetime64[s]").astype(np.int64)
    return Record(end - 450, {ours: table[theirs].to_numpy() for theirs, ours in names.items()})


@cache
def surfrad_rows() -> Record:
    """1 January 2016 UTC, one minute, complete."""
    table, _ = pvlib.iotools.read_surfrad(FOLDER / "surfrad-slv16001.dat")
    names = {
        "ghi": "shortwave_down",
        "uw_solar": "shortwave_up",
        "dw_ir": "longwave_down",
        "uw_ir": "longwave_up",
        "totalnet": "net_radiation",
        "temp_air": "air_temperature",
        "relative_humidity": "relative_humidity",
        "wind_speed": "wind_speed",
    }
    middle = table.index.as_unit("s").asi8 + 30
    return Record(middle, {ours: table[theirs].to_numpy() for theirs, ours in names.items()})


def daily(record: Record, utc_offset_h: float, rows_a_day: int) -> DailyWeather:
    """Complete local days of a record; vapour pressure is the mean over the rows."""
    day = (record.middle + round(utc_offset_h * 3600)) // 86400
    whole, count = np.unique(day, return_counts=True)
    whole = whole[count == rows_a_day]
    groups = [day == number for number in whole]

    def each(name: str, how: str) -> NDArray[np.float64]:
        return np.array([getattr(record.values[name][g], how)() for g in groups])

    v = record.values
    moist = np.minimum(v["relative_humidity"], 100.0) / 100.0
    ea = saturation_vapour_pressure(v["air_temperature"]) * moist
    fluxes = ("shortwave_down", "shortwave_up", "longwave_down", "longwave_up", "net_radiation")
    return replace(
        DailyWeather.missing(whole.astype("datetime64[D]")),
        tmax=each("air_temperature", "max"),
        tmin=each("air_temperature", "min"),
        tmean=each("air_temperature", "mean"),
        rh_max=each("relative_humidity", "max"),
        rh_min=each("relative_humidity", "min"),
        vapour_pressure=np.array([ea[g].mean() for g in groups]),
        wind=each("wind_speed", "mean") if "wind_speed" in v else np.full(len(groups), np.nan),
        **{name: each(name, "mean") * MJ for name in fluxes},
    )


def payerne_days() -> DailyWeather:
    """29 whole days, 2 to 30 June 2016, by local standard time."""
    return daily(payerne_rows(), 1.0, 96)
