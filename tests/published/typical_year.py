"""Real hourly weather carried by the pvlib package: two typical years of NREL's TMY3 data set.

723170TYA.CSV is Greensboro, North Carolina (36.1 N, 273 m); 703165TY.csv is Sand Point, Alaska
(55.3 N, 7 m). Each is 8760 hours; days here are local standard days.
"""

from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np
import pvlib
from numpy.typing import NDArray

FILES = ("723170TYA.CSV", "703165TY.csv")


@dataclass(frozen=True)
class TypicalYear:
    latitude: float
    longitude: float
    elevation: float
    hourly_temperature: NDArray[np.float64]  # degC, (8760,)
    hourly_dew_point: NDArray[np.float64]  # degC, (8760,)
    tmax: NDArray[np.float64]  # degC, (365,) and so below
    tmin: NDArray[np.float64]
    rh_mean: NDArray[np.float64]  # %
    wind_10m: NDArray[np.float64]  # m s-1
    shortwave: NDArray[np.float64]  # MJ m-2 d-1


@cache
def typical_year(name: str) -> TypicalYear:
    path = Path(pvlib.__file__).parent / "data" / name
    table, head = pvlib.iotools.read_tmy3(path, coerce_year=1990, map_variables=True)

    def days(column: str) -> NDArray[np.float64]:
        return table[column].to_numpy(dtype=np.float64).reshape(365, 24)

    temperature = days("temp_air")
    return TypicalYear(
        latitude=head["latitude"],
        longitude=head["longitude"],
        elevation=head["altitude"],
        hourly_temperature=temperature.ravel(),
        hourly_dew_point=days("temp_dew").ravel(),
        tmax=temperature.max(axis=1),
        tmin=temperature.min(axis=1),
        rh_mean=days("relative_humidity").mean(axis=1),
        wind_10m=days("wind_speed").mean(axis=1),
        shortwave=days("ghi").mean(axis=1) * 0.0864,
    )
