"""From plans and weather to ledgers: the root-zone water balance of many blocks at once."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app.science import Floats
from app.science.outlook.ensemble import Ahead, ensemble_depletion, ensemble_depletions
from app.science.soil.balance import Balance, State, Terms, balance, balance_scalar
from app.science.soil.block import BlockLedger, BlockPlan, BlockWeather
from app.science.soil.stack import Stack, stack_plans

__all__ = [
    "Ahead",
    "BlockLedger",
    "BlockPlan",
    "BlockWeather",
    "Restart",
    "State",
    "block_ledgers",
    "closure_error",
    "ensemble_depletion",
    "ensemble_depletions",
    "state_after",
]


# Up to this many blocks plain floats are quicker than arrays (measured).
SCALAR_BLOCKS = 3
# Blocks stacked at a time, so that memory stays bounded.
CHUNK = 4096
WORDS = np.array(["late", "due", "soon", "wet", "easy"], dtype=object)
# Days of the day's own ET to the limit, for the standing at a past day's close.
DUE_DAYS, SOON_DAYS = 2, 5


@dataclass(frozen=True, kw_only=True)
class Restart:
    """Where a ledger goes on: `since`, the first day to compute, and the state at the close of
    the day before, in plain numbers (of `state_after`, or of stored ledger columns)."""

    since: np.datetime64
    state: State


def state_after(ledger: BlockLedger, day: np.datetime64) -> State:
    """State of `ledger` at the close of `day`; ValueError for a day it does not have."""
    place = int((day - ledger.date[0]).astype(np.int64))
    if not 0 <= place < ledger.date.size:
        raise ValueError(f"the ledger runs from {ledger.date[0]} to {ledger.date[-1]}, not {day}")
    return State(
        depletion=float(ledger.depletion_mm[place]),
        subsoil=float(ledger.subsoil_depletion_mm[place]),
        layer=float(np.nan_to_num(ledger.evaporation_layer_depletion_mm[place])),
        draining=float(ledger.draining_days[place]),
    )


def block_ledgers(
    plans: Sequence[BlockPlan],
    weather: Sequence[BlockWeather],
    restarts: Sequence[Restart | None] | None = None,
) -> list[BlockLedger]:
    """Ledgers of `plans` under `weather`, one each, in order.

    Plans may start and end on different days; each weather covers its plan's days. Blocks never
    touch each other: neither order nor company changes a figure. restarts: for each plan None, or
    where its ledger goes on from a saved state; that ledger holds the days from there on, bit for
    bit those of the ledger run whole. Raises ValueError naming block, column and date for lengths
    that differ, NaN, or negative depths, and for a restart outside its plan's days.
    Source: FAO-56 chapters 6 to 8 and Annex 8.
    """
    if len(plans) != len(weather):
        raise ValueError(f"{len(plans)} plans, but weather for {len(weather)}; give one each")
    starts = [None] * len(plans) if restarts is None else list(restarts)
    if len(starts) != len(plans):
        raise ValueError(f"{len(plans)} plans, but {len(starts)} restarts; give one each")
    ledgers: list[BlockLedger] = []
    for first in range(0, len(plans), CHUNK):
        part = slice(first, first + CHUNK)
        ledgers += _together(plans[part], weather[part], starts[part])
    return ledgers


def _together(
    plans: Sequence[BlockPlan],
    weather: Sequence[BlockWeather],
    restarts: Sequence[Restart | None],
) -> list[BlockLedger]:
    stack = stack_plans(plans, weather)
    terms = stack.terms()
    passed = [_passed(plan, restart) for plan, restart in zip(plans, restarts, strict=True)]
    if any(passed):
        stack, terms = stack.since(passed), terms.since(passed)
    terms = _restarted(terms, restarts)
    run = balance_scalar if len(plans) <= SCALAR_BLOCKS else balance
    columns: dict[str, Any] = {
        name: np.ascontiguousarray(values.T)
        for name, values in _columns(stack, terms, run(terms)).items()
    }
    columns["standing"] = close_standing(
        columns["depletion_mm"], columns["limit_mm"], columns["etc_potential_mm"]
    )
    return [
        _ledger(
            plan,
            sky,
            passed[b],
            float(terms.opening.depletion[b]),
            {name: values[b] for name, values in columns.items()},
        )
        for b, (plan, sky) in enumerate(zip(plans, weather, strict=True))
    ]


def _passed(plan: BlockPlan, restart: Restart | None) -> int:
    """Days of `plan` before its restart."""
    if restart is None:
        return 0
    days = int((restart.since.astype("datetime64[D]") - plan.date[0]).astype(np.int64))
    if not 0 <= days < plan.days:
        raise ValueError(
            f"a restart on {restart.since} lies outside its plan, {plan.date[0]} to {plan.date[-1]}"
        )
    return days


def _restarted(terms: Terms, restarts: Sequence[Restart | None]) -> Terms:
    opening = State(*(np.array(values, dtype=np.float64) for values in terms.opening))
    for b, restart in enumerate(restarts):
        if restart is not None:
            for values, saved in zip(opening, restart.state, strict=True):
                values[b] = saved
    return replace(terms, opening=opening)


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
        "capillary_rise_mm": stack.supplies.capillary_rise + result.rise,
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
        "draining_days": result.draining,
    }


def _limit(stack: Stack, taw: Floats, raw: Floats) -> Floats:
    """Depletion not to be passed: MAD (of the stage) x TAW, RAW where no MAD is set; all of TAW
    where no crop stands (off season of annuals), so that bare soil never calls for water."""
    seasons = [plan.season for plan in stack.plans]
    by_stage = [
        [season.mad, *(season.mad if m is None else m for m in season.mad_by_stage or (None,) * 4)]
        for season in seasons
    ]
    allowed = np.array(by_stage, dtype=np.float64).T
    mad = np.take_along_axis(allowed, stack.curve.stage.astype(np.int64), axis=0)
    standing = stack.curve.in_season | np.array([season.perennial for season in seasons])
    return np.where(standing, np.where(np.isnan(mad), raw, mad * taw), taw)


def _ledger(
    plan: BlockPlan, sky: BlockWeather, passed: int, opening: float, columns: dict[str, Any]
) -> BlockLedger:
    days = plan.days - passed
    own = {name: values[:days] for name, values in columns.items()}
    gross = np.asarray(plan.irrigation_gross, dtype=np.float64)
    if gross.shape != (plan.days,):
        raise ValueError(f"irrigation_gross has shape {gross.shape}; the plan has {plan.days} days")
    gross = gross[passed:]
    return BlockLedger(
        opening_depletion_mm=opening,
        date=plan.date[passed:],
        rung=np.asarray(sky.rung, dtype=np.int8)[passed:],
        rn_mj_m2=np.asarray(sky.rn, dtype=np.float64)[passed:],
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
