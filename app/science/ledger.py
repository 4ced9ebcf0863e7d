"""From plans and weather to ledgers: the root-zone water balance of many blocks at once."""

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app.science import Floats
from app.science.outlook.ensemble import ensemble_depletion, ensemble_depletions
from app.science.soil.balance import Balance, Terms, balance, balance_scalar
from app.science.soil.block import BlockLedger, BlockPlan, BlockWeather
from app.science.soil.stack import Stack, stack_plans

__all__ = [
    "BlockLedger",
    "BlockPlan",
    "BlockWeather",
    "block_ledgers",
    "closure_error",
    "ensemble_depletion",
    "ensemble_depletions",
]


# Up to this many blocks plain floats are quicker than arrays (measured).
SCALAR_BLOCKS = 3
# Blocks stacked at a time, so that memory stays bounded.
CHUNK = 4096
WORDS = np.array(["late", "due", "soon", "wet", "easy"], dtype=object)
# Days of the day's own ET to the limit, for the standing at a past day's close.
DUE_DAYS, SOON_DAYS = 2, 5


def block_ledgers(plans: Sequence[BlockPlan], weather: Sequence[BlockWeather]) -> list[BlockLedger]:
    """Ledgers of `plans` under `weather`, one each, in order.

    Plans may start and end on different days; each weather covers its plan's days. Blocks never
    touch each other: neither order nor company changes a figure. Raises ValueError naming block,
    column and date for lengths that differ, NaN, or negative depths.
    Source: FAO-56 chapters 6 to 8 and Annex 8.
    """
    if len(plans) != len(weather):
        raise ValueError(f"{len(plans)} plans, but weather for {len(weather)}; give one each")
    ledgers: list[BlockLedger] = []
    for first in range(0, len(plans), CHUNK):
        part = slice(first, first + CHUNK)
        ledgers += _together(plans[part], weather[part])
    return ledgers


def _together(plans: Sequence[BlockPlan], weather: Sequence[BlockWeather]) -> list[BlockLedger]:
    stack = stack_plans(plans, weather)
    terms = stack.terms()
    run = balance_scalar if len(plans) <= SCALAR_BLOCKS else balance
    columns: dict[str, Any] = {
        name: np.ascontiguousarray(values.T)
        for name, values in _columns(stack, terms, run(terms)).items()
    }
    columns["standing"] = close_standing(
        columns["depletion_mm"], columns["limit_mm"], columns["etc_potential_mm"]
    )
    return [
        _ledger(plan, sky, float(terms.opening.depletion[b]), {k: v[b] for k, v in columns.items()})
        for b, (plan, sky) in enumerate(zip(plans, weather, strict=True))
    ]


def _columns(stack: Stack, terms: Terms, result: Balance) -> dict[str, Floats]:
    """The ledger's computed columns, each (days, blocks)."""
    eto, days = stack.supplies.eto, terms.days
    seasons = [plan.season for plan in stack.plans]
    dual = np.array([season.coefficients == "dual" for season in seasons])
    demand = eto > 0.0
    over = np.where(demand, eto, 1.0)
    infiltrated = days.rain - result.runoff
    et_actual = result.evaporation + result.transpiration
    dry_day = result.ks * stack.curve.coefficient
    return {
        "eto_mm": eto,
        "kcb": np.where(dual, stack.curve.coefficient, np.nan),
        "ke": np.where(dual, np.where(demand, result.evaporation / over, 0.0), np.nan),
        "ks": result.ks,
        "kc_actual": np.where(demand, et_actual / over, dry_day),
        "etc_potential_mm": days.transpiration + result.evaporation,
        "et_actual_mm": et_actual,
        "rain_mm": days.rain,
        "rain_outside_roots_mm": infiltrated * (1.0 - terms.blocks.roots),
        "runoff_mm": result.runoff,
        "irrigation_net_mm": stack.supplies.irrigation,
        "capillary_rise_mm": stack.supplies.capillary_rise,
        "deep_percolation_mm": result.percolation,
        "root_growth_depletion_mm": result.growth,
        "correction_mm": result.correction,
        "root_depth_m": stack.curve.root_depth,
        "taw_mm": days.taw,
        "raw_mm": result.raw,
        "limit_mm": _limit(stack, days.taw, result.raw),
        "depletion_mm": result.depletion,
        "subsoil_depletion_mm": result.subsoil,
        "evaporation_layer_depletion_mm": np.where(dual, result.layer, np.nan),
    }


def _limit(stack: Stack, taw: Floats, raw: Floats) -> Floats:
    """Depletion not to be passed: MAD x TAW, RAW where no MAD is set; all of TAW where no crop
    stands (off season of annuals), so that bare soil never calls for water."""
    seasons = [plan.season for plan in stack.plans]
    mad = np.array([season.mad for season in seasons], dtype=np.float64)
    standing = stack.curve.in_season | np.array([season.perennial for season in seasons])
    return np.where(standing, np.where(np.isnan(mad), raw, mad * taw), taw)


def _ledger(
    plan: BlockPlan, sky: BlockWeather, opening: float, columns: dict[str, Any]
) -> BlockLedger:
    days = plan.days
    own = {name: values[:days] for name, values in columns.items()}
    gross = np.asarray(plan.irrigation_gross, dtype=np.float64)
    if gross.shape != (days,):
        raise ValueError(f"irrigation_gross has shape {gross.shape}; the plan has {days} days")
    return BlockLedger(
        opening_depletion_mm=opening,
        date=plan.date,
        rung=np.asarray(sky.rung, dtype=np.int8),
        rn_mj_m2=np.asarray(sky.rn, dtype=np.float64),
        irrigation_gross_mm=gross,
        application_loss_mm=gross - own["irrigation_net_mm"],
        depletion_p10_mm=np.full(days, np.nan),
        depletion_p90_mm=np.full(days, np.nan),
        **own,
    )


def close_standing(depletion: Floats, limit: Floats, etc: Floats) -> NDArray[np.object_]:
    """Standing at each day's close, its own unstressed ET repeated and every day a chance.

    depletion, limit, etc [mm], one shape. Returns late, due, soon, wet or easy, in this order of
    precedence; NaN gives easy.
    """
    holds = [
        depletion > limit,
        depletion + DUE_DAYS * etc > limit,
        depletion + SOON_DAYS * etc > limit,
        depletion <= 0.0,
    ]
    return np.asarray(WORDS[np.select(holds, range(4), default=4)])


def closure_error(ledger: BlockLedger) -> float:
    """Largest absolute difference [mm] between a day's closing depletion and its own terms.

    Zero but for rounding: depletion = the day before's + root growth - (rain - runoff - rain
    outside roots) - net irrigation - capillary rise + ET + deep percolation - correction.
    """
    before = np.concatenate(([ledger.opening_depletion_mm], ledger.depletion_mm[:-1]))
    rain = ledger.rain_mm - ledger.runoff_mm - ledger.rain_outside_roots_mm
    expected = (
        before
        + ledger.root_growth_depletion_mm
        - rain
        - ledger.irrigation_net_mm
        - ledger.capillary_rise_mm
        + ledger.et_actual_mm
        + ledger.deep_percolation_mm
        - ledger.correction_mm
    )
    return float(np.max(np.abs(ledger.depletion_mm - expected)))
