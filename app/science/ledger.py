"""From plans and weather to ledgers: the root-zone water balance of many blocks at once."""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from app.science.crop.season import CropSeason
from app.science.soil.profile import Profile

Floats = NDArray[np.float64]
Days = NDArray[np.datetime64]


@dataclass(frozen=True, kw_only=True)
class BlockPlan:
    """One block, one season, `days` days from `start`.

    irrigation_gross, irrigation_net (days,) [mm]; irrigation_fw (days,) wetted fraction of the
    event, NaN for no event. under_canopy: trickle under the canopy, fw (1 - 2/3 fc).
    root_wetted_fraction 0.05-1. initial_depletion_mm, or initial_depletion_fraction of TAW.
    initial_subsoil_depletion_fraction 0-1. initial_evaporation_depletion_mm. correction,
    capillary_rise (days,) [mm], None for zeros.
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


@dataclass(frozen=True, kw_only=True)
class BlockWeather:
    """Weather of a plan's days, NaN-free: eto [mm], rain [mm], u2 [m s-1], rh_min [%], rung
    (int8) and rn [MJ m-2 d-1], each (days,)."""

    eto: Floats
    rain: Floats
    u2: Floats
    rh_min: Floats
    rung: NDArray[np.int8]
    rn: Floats


@dataclass(frozen=True, kw_only=True)
class BlockLedger:
    """The ledger of one block: one array (days,) per column; NaN where a column has no meaning
    (kcb, ke, evaporation_layer_depletion_mm with single coefficients; p10, p90 before the
    ensemble). opening_depletion_mm is the depletion before the first day."""

    opening_depletion_mm: float
    date: Days
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
    standing: NDArray[np.object_] = field()


def block_ledgers(plans: Sequence[BlockPlan], weather: Sequence[BlockWeather]) -> list[BlockLedger]:
    """Ledgers of `plans` under `weather`, one each, in order."""
    raise NotImplementedError


def ensemble_depletion(
    plan: BlockPlan, weather: BlockWeather, seed: int, members: int = 200
) -> tuple[Floats, Floats]:
    """p10 and p90 of the depletion."""
    raise NotImplementedError


def closure_error(ledger: BlockLedger) -> float:
    """Largest absolute error of the daily balance [mm]."""
    raise NotImplementedError
