"""A plain field and plain weather, for tests that change one thing at a time."""

import numpy as np

from app.science.crop.season import CropSeason
from app.science.ledger import BlockPlan, BlockWeather
from app.science.soil.profile import Layer, Profile

START = np.datetime64("2025-06-01")


def _spread(days: int, values: dict[int, float] | None) -> np.ndarray:
    series = np.zeros(days)
    for day, value in (values or {}).items():
        series[day] = value
    return series


def field(
    days: int,
    *,
    net: dict[int, float] | None = None,
    fw: float = 1.0,
    correction: dict[int, float] | None = None,
    rise: dict[int, float] | None = None,
    coefficients: str = "dual",
    k: float = 1.0,
    mad: float | None = None,
    root_m: float = 1.2,
    saturation: float = 0.45,
    drainage_days: float = 0.0,
    curve_number: float | None = None,
    roots: float = 1.0,
    perennial: bool = True,
    depletion_fraction: float = 0.0,
    subsoil: float = 0.0,
    layer_mm: float = 0.0,
    under_canopy: bool = False,
) -> BlockPlan:
    """A field of constant coefficient `k` on a uniform soil (0.30, 0.15 m3 m-3)."""
    irrigation = _spread(days, net)
    season = CropSeason(
        planting=START,
        stage_days=(5, 30, 200, 0),
        coefficients=coefficients,
        k_ini=k,
        k_mid=k,
        k_end=k,
        height_max_m=0.5,
        root_min_m=0.2,
        root_max_m=root_m,
        depletion_fraction=0.5,
        mad=mad,
        perennial=perennial,
        climate_adjustment="none",
    )
    return BlockPlan(
        season=season,
        profile=Profile(
            layers=(Layer(3.0, 0.30, 0.15, saturation),),
            rew_mm=8.0,
            curve_number=curve_number,
            drainage_days=drainage_days,
        ),
        start=START,
        days=days,
        irrigation_gross=irrigation / 0.8,
        irrigation_net=irrigation,
        irrigation_fw=np.where(irrigation > 0.0, fw, np.nan),
        under_canopy=under_canopy,
        root_wetted_fraction=roots,
        initial_depletion_fraction=depletion_fraction,
        initial_subsoil_depletion_fraction=subsoil,
        initial_evaporation_depletion_mm=layer_mm,
        correction=_spread(days, correction),
        capillary_rise=_spread(days, rise),
    )


def weather(days: int, *, eto: float = 5.0, rain: dict[int, float] | None = None) -> BlockWeather:
    """Constant weather at the table's climate (u2 2 m/s, RHmin 45 %)."""
    return BlockWeather(
        eto=np.full(days, eto),
        rain=_spread(days, rain),
        u2=np.full(days, 2.0),
        rh_min=np.full(days, 45.0),
        rung=np.ones(days, dtype=np.int8),
        rn=np.full(days, 12.0),
    )
