"""Constants of the energy room: value, unit, source, one a line.

FAO-56 is FAO Irrigation and Drainage Paper 56 (1998); ASCE-EWRI is The ASCE Standardized Reference
Evapotranspiration Equation (2005), whose figures are from memory, confirmed by its Appendix C rows;
BSRN is Global Network recommended QC tests V2.0. "Working value" has no published source.
"""

from dataclasses import dataclass
from typing import Literal

KELVIN = 273.16  # K at 0 degC, FAO-56 eq 39 and ASCE-EWRI eq 17
SOLAR_CONSTANT_HOUR = 4.92  # MJ m-2 h-1, ASCE-EWRI eq 21; 60 x 0.0820 of FAO-56 eq 21
SOLAR_CONSTANT_W = 1361.0  # W m-2, for the BSRN limits (present-day figure, from memory)
MM_PER_MJ = 0.408  # mm per MJ m-2, inverse of 2.45 MJ kg-1, FAO-56 table 3
GRASS_ALBEDO = 0.23  # -, FAO-56 eq 38
GRASS_EMISSIVITY = 0.98  # -, ladder rung 2, working value
WATTS_TO_MJ_DAY = 0.0864  # MJ m-2 d-1 per W m-2, 86400 s
STEFAN_BOLTZMANN_W = 5.67e-8  # W m-2 K-4, BSRN section on longwave
PSYCHROMETER_VENTILATED = 0.000662  # degC-1, FAO-56 eq 16, ventilated instrument
WIND_FLOOR = 0.5  # m s-1, FAO-56 Annex 5 and ASCE-EWRI Appendix D, least wind in the equation
WIND_ASSUMED = 2.0  # m s-1, FAO-56 chapter 3, where no wind is known
ARID_DEW_POINT_OFFSET = 2.0  # K below Tmin, FAO-56 Annex 6 and eq 64
K_RS_INTERIOR = 0.16  # degC-0.5, FAO-56 eq 50
K_RS_COASTAL = 0.19  # degC-0.5, FAO-56 eq 50
RH_LIMIT = 105.0  # %, ASCE-EWRI Appendix D: more than 3-5 % above 100 is a sensor fault
LOW_SUN = 0.3  # rad, ASCE-EWRI hourly: below it cloudiness is carried over
POLAR_NIGHT_CLOUD_RATIO = 0.7  # -, Rs/Rso where there is no sun to tell it, working value


@dataclass(frozen=True)
class Standard:
    """The figures in which FAO-56 and ASCE-EWRI differ.

    Arguments: `name`; `sigma_day` [MJ m-2 d-1 K-4]; `sigma_hour` [MJ m-2 h-1 K-4]; `slope_factor`
    [kPa degC], times exp(17.27 T/(T+237.3))/(T+237.3)^2; `least_clear_sky_ratio` [-], the floor
    of Rs/Rso in net longwave.
    """

    name: str
    sigma_day: float
    sigma_hour: float
    slope_factor: float
    least_clear_sky_ratio: float


FAO56 = Standard("FAO-56", 4.903e-9, 4.903e-9 / 24.0, 4098.0 * 0.6108, 0.0)  # eq 13, 39
ASCE = Standard("ASCE-EWRI", 4.901e-9, 2.042e-10, 2503.0, 0.3)  # eq 5, 17, 18, 44, 45


Surface = Literal["short", "tall"]


@dataclass(frozen=True)
class SurfaceFigures:
    """Numerator `cn` [K mm s3 Mg-1 per step], denominator `cd` [s m-1], `soil_share` G/Rn [-]."""

    cn: float
    cd: float
    soil_share: float


DAILY = {
    "short": SurfaceFigures(900.0, 0.34, 0.0),  # ASCE-EWRI table 1; FAO-56 eq 6
    "tall": SurfaceFigures(1600.0, 0.38, 0.0),  # ASCE-EWRI table 1
}
HOURLY_DAY = {
    "short": SurfaceFigures(37.0, 0.24, 0.1),  # ASCE-EWRI table 1
    "tall": SurfaceFigures(66.0, 0.25, 0.04),  # ASCE-EWRI table 1
}
HOURLY_NIGHT = {
    "short": SurfaceFigures(37.0, 0.96, 0.5),  # ASCE-EWRI table 1
    "tall": SurfaceFigures(66.0, 1.7, 0.2),  # ASCE-EWRI table 1
}
HOURLY_CD_FAO56 = 0.34  # s m-1, FAO-56 eq 53, day and night
