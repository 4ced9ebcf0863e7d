"""The range of a ledger's depletion: the same balance under many plausible inputs."""

from dataclasses import replace

import numpy as np

from app.science import Floats
from app.science.energy.ladder import RUNGS, rn_uncertainty
from app.science.soil.balance import Blocks, Days, Terms, balance
from app.science.soil.block import BlockPlan, BlockWeather
from app.science.soil.root_zone import P_ETC, P_LEAST, P_MOST, P_SLOPE
from app.science.soil.stack import stack_plans
from app.science.soil.terms import Supplies

# Standard deviations of the season-long factors, and of rain on a wet day (working values).
KC_SHARE, TAW_SHARE, EFFICIENCY_SHARE = 0.10, 0.10, 0.08
RAIN_SHARE, RAIN_MM = 0.15, 1.0
# Distance [km] from gauge to field at which the error of rain has doubled (working value).
RAIN_DOUBLED_KM = 20.0
# Share of reference ET that follows net radiation where the caller gives none (working value;
# FAO-56 Examples 17 and 18 give 0.69 and 0.72).
RN_SHARE = 0.7
# No factor falls below this.
LEAST_FACTOR = 0.2
LOW, HIGH = 10.0, 90.0


def ensemble_depletion(
    plan: BlockPlan,
    weather: BlockWeather,
    seed: int,
    members: int = 200,
    rn_share: Floats | None = None,
    *,
    rain_distance_km: float = 0.0,
    initial_unknown: bool = False,
    eto_members: Floats | None = None,
    rain_members: Floats | None = None,
) -> tuple[Floats, Floats]:
    """10th and 90th percentile [mm] of each day's closing depletion, each (days,).

    plan and weather as for a ledger. seed: whole number made from block and date; the same inputs
    give the same bits, and days added at the end leave earlier days alone. rn_share (days,) 0-1:
    share of ETo that follows net radiation, default 0.7. rain_distance_km from gauge to field.
    initial_unknown: the opening depletion lies anywhere in 0-100 % of RAW. eto_members and
    rain_members (days, members) [mm]: sequences that replace the plan's weather where not NaN
    (past years for the days ahead). Widened where needed to hold the ledger's own depletion.
    Raises ValueError as `block_ledgers` does. Source: working values of the methods page.
    """
    draw = np.random.Generator(np.random.PCG64(seed))
    season = _centred(draw.standard_normal((5, members)))
    anywhere = np.concatenate(([0.5], draw.random(members)))
    daily = _centred(draw.standard_normal((plan.days, 2, members)))
    stack = stack_plans([plan], [weather])
    base = stack.terms()
    kc = _factor(KC_SHARE * season[0])
    taw = _factor(TAW_SHARE * season[1])
    efficiency = _efficiency(plan, _factor(EFFICIENCY_SHARE * season[2]))
    energy = _energy(weather, rn_share, season[4], daily[:, 0]) * _replaced(
        eto_members, weather.eto
    )
    rain = _rain(weather.rain, rain_distance_km, season[3], daily[:, 1])
    if rain_members is not None:
        told = _with_median(rain_members, weather.rain)
        rain = np.where(np.isnan(told), rain, told)
    opening = base.depletion * (taw if plan.initial_depletion_mm is None else np.ones_like(taw))
    terms = _members(base, stack.supplies, opening, kc * energy, taw, efficiency, rain)
    if initial_unknown:
        p = np.clip(base.blocks.p_base[0] - P_SLOPE * P_ETC, P_LEAST, P_MOST)
        terms = replace(terms, depletion=anywhere * p * terms.days.taw[0])
    depletion = balance(terms).depletion
    low, high = np.percentile(depletion, [LOW, HIGH], axis=1)
    return np.minimum(low, depletion[:, 0]), np.maximum(high, depletion[:, 0])


def _centred(draws: Floats) -> Floats:
    """The draws with a member 0 in front that departs from nothing: the ledger itself."""
    return np.concatenate((np.zeros((*draws.shape[:-1], 1)), draws), axis=-1)


def _with_median(sequences: Floats, own: Floats) -> Floats:
    return np.concatenate((own[:, None], sequences), axis=1)


def _factor(departure: Floats) -> Floats:
    return np.maximum(1.0 + departure, LEAST_FACTOR)


def _replaced(sequences: Floats | None, eto: Floats) -> Floats:
    """Factor that turns the plan's ETo into each member's sequence; 1 where there is none."""
    if sequences is None:
        return np.ones((eto.size, 1))
    told = _with_median(sequences, eto)
    ratio = np.divide(
        told, eto[:, None], out=np.ones(told.shape), where=(eto > 0.0)[:, None] & ~np.isnan(told)
    )
    return np.maximum(ratio, 0.0)


def _energy(
    weather: BlockWeather, rn_share: Floats | None, season: Floats, daily: Floats
) -> Floats:
    """Factor of radiation on ETo (days, members): variance by rung, half persistent, half daily;
    days without a rung count as the usual for the date."""
    usual = RUNGS[9].share
    known = (weather.rung > 0) & (np.abs(weather.rn) > 0.0)
    spread = np.full(weather.eto.shape, usual)
    rn = np.abs(weather.rn[known])
    spread[known] = np.minimum(rn_uncertainty(weather.rung[known], rn) / rn, 1.0)
    share = np.full(weather.eto.shape, RN_SHARE) if rn_share is None else rn_share
    return _factor((spread * share)[:, None] * (season + daily) / np.sqrt(2.0))


def _efficiency(plan: BlockPlan, factor: Floats) -> Floats:
    """Factor on net irrigation (days, members), never above what was applied gross."""
    net = np.asarray(plan.irrigation_net, dtype=np.float64)
    gross = np.maximum(np.asarray(plan.irrigation_gross, dtype=np.float64), net)
    most = np.divide(gross, net, out=np.ones(net.shape), where=net > 0.0)
    return np.minimum(factor, most[:, None])


def _rain(rain: Floats, distance_km: float, season: Floats, daily: Floats) -> Floats:
    """Field rain (days, members) [mm] from the station's: a season-long factor and a daily error
    on wet days; dry days stay dry."""
    wider = 1.0 + max(distance_km, 0.0) / RAIN_DOUBLED_KM
    field = rain[:, None] * _factor(RAIN_SHARE * wider * season) + RAIN_MM * wider * daily
    return np.where(rain[:, None] > 0.0, np.maximum(field, 0.0), 0.0)


def _members(
    base: Terms,
    supplies: Supplies,
    opening: Floats,
    demand: Floats,
    taw: Floats,
    efficiency: Floats,
    rain: Floats,
) -> Terms:
    """The one block's terms, once for each member."""
    day, shape = base.days, rain.shape
    roots = base.blocks.roots[0]
    concentrated = day.surface - day.rain
    days = Days(
        rain=rain,
        wet=rain * roots + supplies.irrigation * efficiency + supplies.capillary_rise,
        surface=rain + concentrated * efficiency,
        transpiration=day.transpiration * demand,
        evaporation=day.evaporation * demand,
        evaporation_most=day.evaporation_most * demand,
        exposed=np.broadcast_to(day.exposed, shape),
        taw=day.taw * taw,
        new_roots=np.broadcast_to(day.new_roots, shape),
        saturation=day.saturation * taw,
        correction=np.broadcast_to(day.correction, shape),
    )
    columns = shape[1:]
    return Terms(
        blocks=Blocks(*(np.broadcast_to(values, columns) for values in base.blocks)),
        days=days,
        depletion=np.minimum(opening, days.taw[0]),
        subsoil=base.subsoil[0] * taw,
        layer=np.broadcast_to(base.layer, columns),
        has_runoff=base.has_runoff,
        has_slow_drainage=base.has_slow_drainage,
        has_correction=base.has_correction,
    )
