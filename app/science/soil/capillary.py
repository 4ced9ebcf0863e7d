"""Water that rises from a water table to the roots."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats
from app.science.crop.season import check_range

# FAO-56 chapter 8: capillary rise is about zero where the water table lies more than about 1 m
# below the roots.
REACH_M = 1.0
# Metres of water per kPa.
METRES_PER_KPA = 1.0 / 9.81


@dataclass(frozen=True, kw_only=True)
class RisingSoil:
    """The soil between water table and roots: saturated conductivity [mm d-1], 0.01-20000; air
    entry tension [m of water], 0.01-5; pore size index 0.02-3 (the slope of log content on log
    tension); reach [m], the farthest distance to the roots at which rise still counts, 0-10.
    Raises ValueError naming the field.
    """

    conductivity_mm_d: float
    air_entry_m: float
    pore_index: float
    reach_m: float = REACH_M

    def __post_init__(self) -> None:
        check_range("conductivity_mm_d", self.conductivity_mm_d, 0.01, 20000.0)
        check_range("air_entry_m", self.air_entry_m, 0.01, 5.0)
        check_range("pore_index", self.pore_index, 0.02, 3.0)
        check_range("reach_m", self.reach_m, 0.0, 10.0)


def steady_rise(
    distance_m: ArrayLike, conductivity_mm_d: ArrayLike, air_entry_m: ArrayLike, n: ArrayLike
) -> Floats:
    """Greatest steady flow upwards [mm d-1] over `distance_m` from a water table to dry roots.

    conductivity_mm_d saturated, at most which rises; air_entry_m [m]; n > 1: conductivity falls
    as (tension / air entry)^-n. At no distance the saturated conductivity. Shapes broadcast; NaN
    in, NaN out. Source: closed form of the steady flow for K = a h^-n, Soil Science 85:228-232
    (1958), from memory: q = a (pi / (n sin(pi / n)) / z)^n.
    """
    z, most, power = floats(distance_m), floats(conductivity_mm_d), floats(n)
    reach = np.pi / (power * np.sin(np.pi / power)) * floats(air_entry_m)
    ratio = reach / np.maximum(z, 1e-9)
    return np.asarray(most * np.minimum(ratio, 1.0) ** power)


def rise_to_roots(
    soil: RisingSoil, water_table_m: ArrayLike, root_depth_m: ArrayLike, demand_mm: ArrayLike
) -> Floats:
    """Most that can rise to the roots in a day [mm].

    water_table_m below the surface, NaN for none (gives 0); root_depth_m [m]; demand_mm: the
    day's unstressed transpiration, more than which a steady flow does not bring; shapes broadcast.
    NaN roots or demand, NaN out. Source: `steady_rise` with n = 2 + 3 x pore index (conductivity
    of Saxton & Rawls 2006 along their retention curve), nothing beyond the soil's reach.
    """
    table, roots, demand = floats(water_table_m), floats(root_depth_m), floats(demand_mm)
    distance = np.where(np.isnan(table), np.inf, table) - roots
    flow = steady_rise(
        distance, soil.conductivity_mm_d, soil.air_entry_m, 2.0 + 3.0 * soil.pore_index
    )
    return np.asarray(np.where(distance > soil.reach_m, 0.0 * demand, np.minimum(flow, demand)))
