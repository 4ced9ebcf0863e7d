"""The records of a station's days: the site, the measured day, and what the day amounts to."""

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from app.science import Days, Floats


@dataclass(frozen=True)
class Site:
    """Where a station stands and what stands under it.

    Arguments: `latitude_deg` [-90..90, north positive], `longitude_deg` [-180..180, east
    positive], `elevation_m` [-450..6000], `utc_offset_h` fixed standard offset [-12..14],
    `wind_height_m` [0.5..100], `reference_surface` (clipped, watered grass under the
    radiometers), `arid`, `coastal`, Angstrom coefficients `angstrom_a`, `angstrom_b` [0..1, sum
    at most 1].
    Errors: ValueError naming the field, the value and the allowed range.
    Source: FAO Irrigation and Drainage Paper 56 (1998), eq 35, 48, 50 for the coefficients.
    """

    latitude_deg: float
    longitude_deg: float
    elevation_m: float
    utc_offset_h: float
    wind_height_m: float = 2.0
    reference_surface: bool = False
    arid: bool = False
    coastal: bool = False
    angstrom_a: float = 0.25
    angstrom_b: float = 0.50

    def __post_init__(self) -> None:
        for name, low, high in (
            ("latitude_deg", -90.0, 90.0),
            ("longitude_deg", -180.0, 180.0),
            ("elevation_m", -450.0, 6000.0),
            ("utc_offset_h", -12.0, 14.0),
            ("wind_height_m", 0.5, 100.0),
            ("angstrom_a", 0.0, 1.0),
            ("angstrom_b", 0.0, 1.0),
        ):
            value = getattr(self, name)
            if not low <= value <= high:
                raise ValueError(f"{name} is {value}; it must lie between {low:g} and {high:g}")
        total = self.angstrom_a + self.angstrom_b
        if not 0.0 < total <= 1.0:
            raise ValueError(
                f"angstrom_a + angstrom_b is {total:g}; their sum must lie above 0 and at most 1"
            )


@dataclass(frozen=True)
class DailyWeather:
    """What a station measured, one value a day; every array has shape (days,), NaN is missing.

    Arguments: `date` [datetime64[D]]; `tmax`, `tmin`, `tmean`, `dew_point` [degC]; `rh_max`,
    `rh_min`, `rh_mean` [%]; `vapour_pressure`, `pressure` [kPa]; `wind` [m s-1 at the site's
    wind height]; `shortwave_down`, `shortwave_up`, `longwave_down`, `longwave_up`,
    `net_radiation`, `soil_heat_flux`, `sensible_heat`, `latent_heat` [MJ m-2 d-1]; `sunshine`
    [h]; `rain` [mm].
    Errors: ValueError naming the field whose shape differs from that of `date`.
    """

    date: Days
    tmax: Floats
    tmin: Floats
    tmean: Floats
    rh_max: Floats
    rh_min: Floats
    rh_mean: Floats
    vapour_pressure: Floats
    dew_point: Floats
    wind: Floats
    shortwave_down: Floats
    shortwave_up: Floats
    longwave_down: Floats
    longwave_up: Floats
    net_radiation: Floats
    soil_heat_flux: Floats
    sensible_heat: Floats
    latent_heat: Floats
    sunshine: Floats
    pressure: Floats
    rain: Floats

    def __post_init__(self) -> None:
        for field in fields(self):
            dtype = "datetime64[D]" if field.name == "date" else np.float64
            values = np.asarray(getattr(self, field.name), dtype=dtype)
            if values.shape != np.shape(self.date) or values.ndim != 1:
                raise ValueError(
                    f"{field.name} has shape {values.shape}; it must be one value a day, "
                    f"shape {np.shape(self.date)}"
                )
            object.__setattr__(self, field.name, values)

    @classmethod
    def missing(cls, date: Days) -> "DailyWeather":
        """Days (days,) on which nothing was measured; fill with `dataclasses.replace`."""
        days = np.asarray(date, dtype="datetime64[D]")
        empty = {f.name: np.full(days.shape, np.nan) for f in fields(cls) if f.name != "date"}
        return cls(date=days, **empty)


@dataclass(frozen=True)
class StationDays:
    """What a station's days amount to; every array has shape (days,), NaN where not to be had.

    `rung` int8 (0 none) of the net radiation; `why_not` text codes for the higher rungs (see
    `explain_rung`); `rn`, `rn_uncertainty`, `rn_measured` (best of rungs 1-3), `rn_modelled`
    (rung 5), `rs`, `rso`, `ra` [MJ m-2 d-1]; `vapour_pressure` [kPa] and `humidity_rung` int8
    (1..5); `wind_2m` [m s-1] and `wind_rung` int8 (1 measured, 3 assumed); `eto`, `etr`,
    `eto_uncertainty`, `rain` [mm]; `rh_min_used` [%]; `tmax`, `tmin` [degC]; `flags` text:
    space-separated `check=figure`.
    """

    date: Days
    rung: NDArray[np.int8]
    why_not: NDArray[np.object_]
    rn: Floats
    rn_uncertainty: Floats
    rn_measured: Floats
    rn_modelled: Floats
    vapour_pressure: Floats
    humidity_rung: NDArray[np.int8]
    wind_2m: Floats
    wind_rung: NDArray[np.int8]
    rs: Floats
    rso: Floats
    ra: Floats
    eto: Floats
    etr: Floats
    eto_uncertainty: Floats
    rh_min_used: Floats
    tmax: Floats
    tmin: Floats
    rain: Floats
    flags: NDArray[np.object_]
