"""One day of a ledger with every figure on the way, for the page that opens it."""

from dataclasses import dataclass

import numpy as np

from app.science.soil.balance import Blocks, balance_day
from app.science.soil.block import BlockLedger, BlockPlan, BlockWeather
from app.science.soil.evaporation import evaporation_reduction
from app.science.soil.root_zone import depletion_fraction, stress_coefficient
from app.science.soil.stack import stack_plans
from app.science.soil.terms import surface


@dataclass(frozen=True, kw_only=True)
class DayWorking:
    """Figures of one day in the order they are made; depths [mm], coefficients and fractions [-].

    What the day opens with: `opening`, `subsoil_opening`, `layer_opening`. What roots take over:
    `growth`. Water: `rain`, `retention` (S of the curve number, inf without one), `runoff`,
    `roots` (wetted root fraction), `rain_outside`, `irrigation`, `given_rise`, `most_rise`,
    `rise`, `depletion_wet` (after the day's water). Surface: `fw`, `cover`, `exposed` (few),
    `layer_wet` (after the day's water), `tew`, `rew`, `kr`. Coefficients: `k` (Kcb, or Kc when
    single), `kc_max`, `mulched` (factor), `ke_energy` = Kr (Kc max - Kcb), `ke_most` = few Kc
    max, `ke_water` (what the layer holds), `ke`. Stress: `etc`, `p_table`, `p`, `taw`, `raw`,
    `ks_water`, `salt`, `ks`. Then `evaporation`, `transpiration`, `et`, `excess` (above field
    capacity), `percolation`, `correction`, `depletion`, `subsoil`, `layer`.
    """

    dual: bool
    eto: float
    opening: float
    subsoil_opening: float
    layer_opening: float
    growth: float
    rain: float
    retention: float
    runoff: float
    roots: float
    rain_outside: float
    irrigation: float
    given_rise: float
    most_rise: float
    rise: float
    depletion_wet: float
    fw: float
    cover: float
    exposed: float
    layer_wet: float
    tew: float
    rew: float
    kr: float
    k: float
    kc_max: float
    mulched: float
    ke_energy: float
    ke_most: float
    ke_water: float
    ke: float
    asked: float
    etc: float
    p_table: float
    p: float
    taw: float
    raw: float
    ks_water: float
    salt: float
    ks: float
    evaporation: float
    transpiration: float
    et: float
    excess: float
    draining: float
    drainage_days: float
    percolation: float
    correction: float
    depletion: float
    subsoil: float
    layer: float
    root_depth: float
    stage: int
    in_season: bool


def day_working(
    plan: BlockPlan, weather: BlockWeather, ledger: BlockLedger, place: int
) -> DayWorking:
    """Day `place` of a plan's ledger, worked out again from the close of the day before.

    plan and weather as for `block_ledgers`, ledger what that gave of them. Raises ValueError for
    a day the plan does not have.
    """
    if not 0 <= place < plan.days:
        raise ValueError(f"the plan has {plan.days} days, not a day {place}")
    stack = stack_plans([plan], [weather])
    terms = stack.terms()
    state = _opening(ledger, place) if place else [float(part[0]) for part in terms.opening]
    opening, subsoil, layer, _ = state
    block = type(terms.blocks)(*(float(values[0]) for values in terms.blocks))
    day = type(terms.days)(*(float(values[place, 0]) for values in terms.days))
    close, columns = balance_day(min, max, terms, block, day, type(terms.opening)(*state))
    evaporation, transpiration, ks, raw, percolation, growth, runoff, rise, correction = (
        float(value) for value in columns[4:]
    )
    dual = plan.season.coefficients == "dual"
    ground = surface(np.array([dual]), stack.curve, stack.supplies, stack.openings)
    kc_max, cover, fw, exposed = (float(values[place, 0]) for values in ground)
    supplies, curve = stack.supplies, stack.curve
    eto = max(float(supplies.eto[place, 0]), 0.0)
    wet = opening + growth - (day.wet - runoff * block.roots) - rise
    layer_wet = max(layer - (day.surface - runoff), 0.0)
    rew = block.tew - block.drying
    kr = float(evaporation_reduction(layer_wet, block.tew, rew))
    mulched = float(stack.openings.mulched[0])
    k = float(curve.coefficient[place, 0])
    ke_energy = kr * (kc_max - k) * mulched if dual else 0.0
    ke_most = exposed * kc_max * mulched if dual else 0.0
    moist = max(block.tew - layer_wet, 0.0) * exposed
    ke_water = moist / eto if eto else np.inf
    ke = min(ke_energy, ke_most, ke_water)
    asked = day.transpiration + ke * eto
    after = wet + evaporation + transpiration
    return DayWorking(
        dual=dual,
        eto=eto,
        opening=opening,
        subsoil_opening=subsoil,
        layer_opening=layer,
        growth=growth,
        rain=day.rain,
        retention=_retention(block, layer) if terms.has_runoff else np.inf,
        runoff=runoff,
        roots=block.roots,
        rain_outside=(day.rain - runoff) * (1.0 - block.roots),
        irrigation=float(supplies.irrigation[place, 0]),
        given_rise=float(supplies.capillary_rise[place, 0]),
        most_rise=day.rise,
        rise=rise,
        depletion_wet=wet,
        fw=fw,
        cover=cover,
        exposed=exposed,
        layer_wet=layer_wet,
        tew=block.tew,
        rew=rew,
        kr=kr,
        k=k,
        kc_max=kc_max,
        mulched=mulched,
        ke_energy=ke_energy,
        ke_most=ke_most,
        ke_water=ke_water,
        ke=ke,
        etc=day.transpiration + evaporation,
        asked=asked,
        p_table=plan.season.depletion_fraction,
        p=float(depletion_fraction(plan.season.depletion_fraction, asked)),
        taw=day.taw,
        raw=raw,
        ks_water=float(stress_coefficient(wet, day.taw, raw)),
        salt=block.salt,
        ks=ks,
        evaporation=evaporation,
        transpiration=transpiration,
        et=evaporation + transpiration,
        excess=max(-after, 0.0),
        draining=float(close.draining),
        drainage_days=block.drainage_days,
        percolation=percolation,
        correction=correction,
        depletion=float(close.depletion),
        subsoil=float(close.subsoil),
        layer=float(close.layer),
        root_depth=float(curve.root_depth[place, 0]),
        stage=int(curve.stage[place, 0]),
        in_season=bool(curve.in_season[place, 0]),
    )


def _opening(ledger: BlockLedger, place: int) -> list[float]:
    before = (
        ledger.depletion_mm,
        ledger.subsoil_depletion_mm,
        np.nan_to_num(ledger.evaporation_layer_depletion_mm),
        ledger.draining_days,
    )
    return [float(values[place - 1]) for values in before]


def _retention(block: Blocks, layer: float) -> float:
    """S of the curve number at the wetness the layer opens with [mm] (NEH 630 chapter 10)."""
    dryness = min(max((layer - block.wet_at) / block.wet_span, 0.0), 1.0)
    return float(25400.0 / (block.cn_wet - block.cn_fall * dryness) - 254.0)
