"""One block's plan, weather and ledger."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.science import Days as Dates
from app.science import Floats
from app.science.crop.season import CropSeason, check_range
from app.science.soil.capillary import RisingSoil
from app.science.soil.evaporation import SAME_DAY
from app.science.soil.profile import Profile


@dataclass(frozen=True, kw_only=True)
class BlockPlan:
    """One block, one season, `days` days from `start`.

    irrigation_gross, irrigation_net (days,) [mm]; irrigation_fw (days,) wetted fraction of the
    event, NaN for no event. under_canopy: trickle under the canopy. root_wetted_fraction 0.05-1:
    share of the area whose roots are wetted by irrigation; TAW and RAW times it.
    initial_depletion_mm, or None for initial_depletion_fraction of TAW; at most TAW.
    initial_subsoil_depletion_fraction 0-1, 0 is field capacity. correction (days,) [mm], positive
    wets, and capillary_rise (days,) [mm]; None for zeros.

    salt_factor 0-1: stress coefficient of salinity (`salinity_stress`), times that of water.
    water_table_m (days,): depth of a water table below the surface [m], NaN where none is known,
    with rising_soil, the soil above it. subsoil_layer_depletion: opening depletion 0-1 of TAW of
    each layer of the profile, for roots that grow into them; it takes the place of
    initial_subsoil_depletion_fraction. same_day: wetted fraction of a day with irrigation and
    wetting rain: "irrigation", that of the irrigation, or "weighted", the mean of its fraction
    and 1 by the depths of both. degree_days_before: sum before `start` of a season by degree
    days, from planting, or from the last stage seen or cutting before `start`. Raises ValueError
    naming the field.
    """

    season: CropSeason
    profile: Profile
    start: np.datetime64
    days: int
    irrigation_gross: Floats
    irrigation_net: Floats
    irrigation_fw: Floats
    under_canopy: bool = False
    root_wetted_fraction: float = 1.0
    initial_depletion_mm: float | None = None
    initial_depletion_fraction: float = 0.0
    initial_subsoil_depletion_fraction: float = 0.0
    initial_evaporation_depletion_mm: float = 0.0
    correction: Floats | None = None
    capillary_rise: Floats | None = None
    salt_factor: float = 1.0
    water_table_m: Floats | None = None
    rising_soil: RisingSoil | None = None
    subsoil_layer_depletion: tuple[float, ...] | None = None
    same_day: str = "irrigation"
    degree_days_before: float = 0.0

    def __post_init__(self) -> None:
        check_range("days", self.days, 1, 20000)
        check_range("root_wetted_fraction", self.root_wetted_fraction, 0.05, 1.0)
        check_range("initial_depletion_fraction", self.initial_depletion_fraction, 0.0, 1.0)
        check_range(
            "initial_subsoil_depletion_fraction", self.initial_subsoil_depletion_fraction, 0.0, 1.0
        )
        check_range(
            "initial_evaporation_depletion_mm", self.initial_evaporation_depletion_mm, 0.0, 1000.0
        )
        if self.initial_depletion_mm is not None:
            check_range("initial_depletion_mm", self.initial_depletion_mm, -5000.0, 5000.0)
        check_range("degree_days_before", self.degree_days_before, 0.0, 20000.0)
        check_range("salt_factor", self.salt_factor, 0.0, 1.0)
        if self.same_day not in SAME_DAY:
            raise ValueError(f"same_day is {self.same_day!r}; choose {' or '.join(SAME_DAY)}")
        if self.water_table_m is not None and self.rising_soil is None:
            raise ValueError("water_table_m needs rising_soil, the soil above the water table")
        if self.subsoil_layer_depletion is not None:
            count, layers = len(self.subsoil_layer_depletion), len(self.profile.layers)
            if count != layers:
                raise ValueError(
                    f"subsoil_layer_depletion has {count} values; the profile has {layers} layers"
                )
            for share in self.subsoil_layer_depletion:
                check_range("subsoil_layer_depletion", share, 0.0, 1.0)

    @property
    def date(self) -> Dates:
        """The plan's days, (days,) datetime64[D]."""
        first = self.start.astype("datetime64[D]")
        return np.arange(first, first + np.timedelta64(self.days, "D"), dtype="datetime64[D]")


@dataclass(frozen=True, kw_only=True)
class BlockWeather:
    """Weather of a plan's days, NaN-free, each (days,): eto and rain [mm], u2 [m s-1], rh_min [%],
    rung of the energy (int8), rn net radiation [MJ m-2 d-1] (may be NaN: it is only carried), and
    tmax, tmin [degC], needed by seasons that go by degree days, else None."""

    eto: Floats
    rain: Floats
    u2: Floats
    rh_min: Floats
    rung: NDArray[np.int8]
    rn: Floats
    tmax: Floats | None = None
    tmin: Floats | None = None


@dataclass(frozen=True, kw_only=True)
class BlockLedger:
    """The ledger of one block: one array (days,) per column.

    NaN where a column has no meaning: kcb, ke and evaporation_layer_depletion_mm with single
    coefficients, depletion_p10_mm and depletion_p90_mm until the ensemble fills them.
    opening_depletion_mm is the depletion before the first day. draining_days: days in a row above
    field capacity, of a soil that drains over days. standing is that of the day's own
    close, its ET repeated and every day taken as a chance.
    """

    opening_depletion_mm: float
    date: Dates
    rung: NDArray[np.int8]
    rn_mj_m2: Floats
    eto_mm: Floats
    kcb: Floats
    ke: Floats
    ks: Floats
    kc_actual: Floats
    etc_potential_mm: Floats
    et_actual_mm: Floats
    rain_mm: Floats
    rain_outside_roots_mm: Floats
    runoff_mm: Floats
    irrigation_gross_mm: Floats
    application_loss_mm: Floats
    irrigation_net_mm: Floats
    capillary_rise_mm: Floats
    deep_percolation_mm: Floats
    root_growth_depletion_mm: Floats
    correction_mm: Floats
    root_depth_m: Floats
    taw_mm: Floats
    raw_mm: Floats
    limit_mm: Floats
    depletion_mm: Floats
    depletion_p10_mm: Floats
    depletion_p90_mm: Floats
    subsoil_depletion_mm: Floats
    evaporation_layer_depletion_mm: Floats
    draining_days: Floats
    standing: NDArray[np.object_]
