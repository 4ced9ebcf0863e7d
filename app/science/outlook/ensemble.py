"""The range of a ledger's depletion: the same balance under many plausible inputs.

Members of many blocks lie side by side, (blocks, members), and go through one day loop: each
day's terms are made from the blocks' own when that day comes, so that only the closing depletions
and the draws are held for all days.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeVar

import numpy as np

from app.science import Bools, Floats
from app.science.energy.ladder import RUNGS, USUAL, rn_uncertainty
from app.science.soil.balance import Blocks, Days, State, Terms, balance_day
from app.science.soil.block import BlockPlan, BlockWeather
from app.science.soil.root_zone import P_ETC, P_LEAST, P_MOST, P_SLOPE
from app.science.soil.stack import Stack, stack_plans

# Distance [km] from gauge to field at which the error of rain has doubled (working value).
RAIN_DOUBLED_KM = 20.0
# Share of reference ET that follows net radiation where the caller gives none (working value;
# FAO-56 Examples 17 and 18 give 0.69 and 0.72).
RN_SHARE = 0.7
# No factor falls below this.
LEAST_FACTOR = 0.2
LOW, HIGH = 10.0, 90.0
EVEN_WIDTH = (HIGH - LOW) / 100.0
# Columns (blocks x members) of one day loop, so that its arrays stay in the processor's cache.
COLUMNS = 8192

Range = tuple[Floats, Floats]
One = TypeVar("One")


@dataclass(frozen=True, kw_only=True)
class Spread:
    """Standard deviations of what members differ by (working values).

    Season-long factors on Kc (`kc`), TAW (`taw`), efficiency and station rain, 0-1; `rain_mm` on a
    wet day [mm]; `energy` scales the uncertainty of each day's net radiation.
    """

    kc: float = 0.10
    taw: float = 0.10
    efficiency: float = 0.08
    rain: float = 0.15
    rain_mm: float = 1.0
    energy: float = 1.0


@dataclass(frozen=True)
class Ahead:
    """What the weather ahead may be: `eto` and `rain` [mm] (h, columns), NaN where the plan's own
    weather holds, from day `first` of the plan on. Members take the columns evenly."""

    first: int
    eto: Floats
    rain: Floats


WORKING = Spread()


def ensemble_depletion(
    plan: BlockPlan,
    weather: BlockWeather,
    seed: int,
    members: int = 200,
    rn_share: Floats | None = None,
    *,
    rain_distance_km: float = 0.0,
    initial_unknown: bool = False,
    initial_width_mm: float = 0.0,
    ahead: Ahead | None = None,
    spread: Spread = WORKING,
) -> Range:
    """10th and 90th percentile [mm] of each day's closing depletion, each (days,).

    plan and weather as for a ledger. seed: whole number made from block and date; the same inputs
    give the same bits, and days added at the end leave earlier days alone. rn_share (days,) 0-1:
    share of ETo that follows net radiation, default 0.7. rain_distance_km from gauge to field.
    initial_unknown: the opening depletion lies anywhere in 0-100 % of RAW. initial_width_mm: else
    from p10 to p90 of what is known of it, at or above 0 [mm]. ahead: sequences that replace the
    plan's weather and its uncertainty on the days ahead. spread: how far members differ. Widened
    where needed to hold the ledger's own depletion.
    Raises ValueError as `block_ledgers` does. Source: working values of the methods page.
    """
    return ensemble_depletions(
        [plan],
        [weather],
        [seed],
        members,
        [rn_share],
        rain_distance_km=[rain_distance_km],
        initial_unknown=[initial_unknown],
        initial_width_mm=[initial_width_mm],
        ahead=[ahead],
        spread=spread,
    )[0]


def ensemble_depletions(
    plans: Sequence[BlockPlan],
    weather: Sequence[BlockWeather],
    seeds: Sequence[int],
    members: int = 200,
    rn_share: Sequence[Floats | None] | None = None,
    *,
    rain_distance_km: Sequence[float] | None = None,
    initial_unknown: Sequence[bool] | None = None,
    initial_width_mm: Sequence[float] | None = None,
    ahead: Sequence[Ahead | None] | None = None,
    spread: Spread = WORKING,
) -> list[Range]:
    """`ensemble_depletion` of many blocks at once, in order, bit for bit the same as one by one.

    Every argument holds one entry a plan; None takes the default for all. Raises ValueError for
    differing numbers of entries.
    """
    count = len(plans)
    shares = _each(rn_share, None, count, "rn_share")
    distances = _each(rain_distance_km, 0.0, count, "rain_distance_km")
    unknown = _each(initial_unknown, False, count, "initial_unknown")
    widths = _each(initial_width_mm, 0.0, count, "initial_width_mm")
    skies = _each(ahead, None, count, "ahead")
    _each(weather, None, count, "weather")
    _each(seeds, 0, count, "seeds")
    ranges: list[Range] = []
    step = max(1, COLUMNS // (members + 1))
    for first in range(0, count, step):
        part = slice(first, first + step)
        group = _Group(plans[part], weather[part], members, spread)
        for b, seed in enumerate(seeds[part]):
            i = first + b
            group.draw(b, seed, shares[i], distances[i], skies[i])
        ranges += group.ranges(
            np.array(unknown[part], dtype=np.bool_), np.array(widths[part], dtype=np.float64)
        )
    return ranges


def _each(values: Sequence[One] | None, default: One, count: int, name: str) -> Sequence[One]:
    if values is None:
        return [default] * count
    if len(values) != count:
        raise ValueError(f"{name} has {len(values)} entries for {count} plans; give one each")
    return values


class _Group:
    """Blocks run together: their stack, and what tells the members apart.

    Season-long factors (blocks, members); factor on demand and rain by day (days, blocks,
    members). Member 0 departs from nothing: it is the ledger itself.
    """

    def __init__(
        self,
        plans: Sequence[BlockPlan],
        weather: Sequence[BlockWeather],
        members: int,
        spread: Spread,
    ) -> None:
        self.plans, self.weather, self.members, self.spread = plans, weather, members, spread
        self.stack: Stack = stack_plans(plans, weather)
        self.base: Terms = self.stack.terms()
        days, blocks = self.base.days.rain.shape
        self.taw = np.ones((blocks, members + 1))
        self.efficiency = np.ones((blocks, members + 1))
        self.most = np.ones((days, blocks, 1))
        self.anywhere = np.full((blocks, members + 1), 0.5)
        self.demand = np.ones((days, blocks, members + 1))
        self.rain = np.zeros((days, blocks, members + 1))

    def draw(
        self,
        b: int,
        seed: int,
        rn_share: Floats | None,
        rain_distance_km: float,
        ahead: Ahead | None,
    ) -> None:
        """Draw the members of block `b`."""
        plan, sky, members, spread = self.plans[b], self.weather[b], self.members, self.spread
        lots = np.random.Generator(np.random.PCG64(seed))
        season = np.zeros((5, members + 1))
        season[:, 1:] = lots.standard_normal((5, members))
        self.anywhere[b, 1:] = lots.random(members)
        daily = np.zeros((plan.days, 2, members + 1))
        daily[:, :, 1:] = lots.standard_normal((plan.days, 2, members))
        self.taw[b] = _factor(spread.taw * season[1])
        self.efficiency[b] = _factor(spread.efficiency * season[2])
        self.most[: plan.days, b, 0] = _most_efficient(plan)
        energy = _energy(sky, rn_share, spread.energy * season[4], spread.energy * daily[:, 0])
        rain = self.rain[: plan.days, b]
        wet = sky.rain > 0.0
        rain[wet] = _rain(sky.rain[wet], rain_distance_km, season[3], daily[wet, 1], spread)
        if ahead is not None and ahead.eto.shape[1]:
            _put_ahead(ahead, sky, energy, rain)
        np.multiply(_factor(spread.kc * season[0]), energy, out=self.demand[: plan.days, b])

    def ranges(self, unknown: Bools, width: Floats) -> list[Range]:
        """Each block's 10th and 90th percentile, by as many members as were drawn; `unknown`
        (blocks,): openings that lie anywhere in 0-100 % of RAW; `width` (blocks,) [mm]: from p10
        to p90 of the others."""
        depletion = self._run(unknown, width)
        own = depletion[:, :, 0].copy()
        low, high = _percentiles(depletion)
        low, high = np.minimum(low, own), np.maximum(high, own)
        return [
            (low[: plan.days, b].copy(), high[: plan.days, b].copy())
            for b, plan in enumerate(self.plans)
        ]

    def _run(self, unknown: Bools, width: Floats) -> Floats:
        """Closing depletions (days, blocks, members); they take the place of the demand drawn."""
        block = Blocks(*(values[:, None] for values in self.base.blocks))
        columns = [values[:, :, None] for values in self.base.days]
        state = self._opening(unknown, width)
        for i, closing in enumerate(self.demand):
            own = Days(*[values[i] for values in columns])
            day = self._day(i, own, block.roots)
            state, _ = balance_day(np.minimum, np.maximum, self.base, block, day, state)
            closing[:] = state.depletion
        return self.demand

    def _opening(self, unknown: Bools, width: Floats) -> State:
        base = self.base
        told = np.array([plan.initial_depletion_mm is not None for plan in self.plans])
        own = base.opening.depletion[:, None] * np.where(told[:, None], 1.0, self.taw)
        # Evenly spread: p10 to p90 is EVEN_WIDTH of the whole.
        known = own + (self.anywhere - 0.5) * (width[:, None] / EVEN_WIDTH)
        known = np.maximum(known, np.minimum(own, 0.0))
        most = base.days.taw[0][:, None] * self.taw
        p = np.clip(base.blocks.p_base - P_SLOPE * P_ETC, P_LEAST, P_MOST)
        anywhere = self.anywhere * p[:, None] * most
        return State(
            depletion=np.where(unknown[:, None], anywhere, np.minimum(known, most)),
            subsoil=base.opening.subsoil[:, None] * self.taw,
            layer=np.broadcast_to(base.opening.layer[:, None], self.taw.shape),
            draining=np.broadcast_to(base.opening.draining[:, None], self.taw.shape),
        )

    def _day(self, i: int, own: Days, roots: Floats) -> Days:
        """Terms of day `i`, (blocks, members) or (blocks, 1), from the blocks' own (blocks, 1)."""
        irrigation = self.stack.supplies.irrigation[i][:, None]
        rise = self.stack.supplies.capillary_rise[i][:, None]
        rain, demand = self.rain[i], self.demand[i]
        concentrated, wet = own.surface - own.rain, irrigation
        if irrigation.any():
            efficiency = np.minimum(self.efficiency, self.most[i])
            concentrated, wet = concentrated * efficiency, irrigation * efficiency
        return own._replace(
            rain=rain,
            wet=rain * roots + wet + rise,
            surface=rain + concentrated,
            transpiration=own.transpiration * demand,
            evaporation=own.evaporation * demand,
            evaporation_most=own.evaporation_most * demand,
            taw=own.taw * self.taw,
            saturation=own.saturation * self.taw,
            below=own.below * self.taw,
        )


def _factor(departure: Floats) -> Floats:
    return np.maximum(1.0 + departure, LEAST_FACTOR)


def _put_ahead(ahead: Ahead, sky: BlockWeather, energy: Floats, rain: Floats) -> None:
    """Sequences in place of the factor on ETo and the rain of each member, on the days they hold;
    the first member keeps the plan's own."""
    members, columns = energy.shape[1] - 1, ahead.eto.shape[1]
    taken = np.arange(members) * columns // max(members, 1)
    days = slice(ahead.first, ahead.first + ahead.eto.shape[0])
    eto = sky.eto[days, None]
    told = ahead.eto[:, taken]
    known = (eto > 0.0) & ~np.isnan(told)
    np.divide(np.maximum(told, 0.0), eto, out=energy[days, 1:], where=known)
    energy[days, 0] = 1.0
    told = ahead.rain[:, taken]
    np.copyto(rain[days, 1:], told, where=~np.isnan(told))


def _energy(
    weather: BlockWeather, rn_share: Floats | None, season: Floats, daily: Floats
) -> Floats:
    """Factor of radiation on ETo (days, members): variance by rung, half persistent, half daily;
    days without a rung count as the usual for the date."""
    known = (weather.rung > 0) & (np.abs(weather.rn) > 0.0)
    spread = np.full(weather.eto.shape, RUNGS[USUAL].share)
    rn = np.abs(weather.rn[known])
    spread[known] = np.minimum(rn_uncertainty(weather.rung[known], rn) / rn, 1.0)
    share = np.full(weather.eto.shape, RN_SHARE) if rn_share is None else rn_share
    return _factor((spread * share)[:, None] * (season + daily) / np.sqrt(2.0))


def _rain(rain: Floats, distance_km: float, season: Floats, daily: Floats, by: Spread) -> Floats:
    """Field rain (wet days, members) [mm] from the station's: a season-long factor and a daily
    error; dry days stay dry."""
    wider = 1.0 + max(distance_km, 0.0) / RAIN_DOUBLED_KM
    field = rain[:, None] * _factor(by.rain * wider * season) + by.rain_mm * wider * daily
    return np.maximum(field, 0.0)


def _most_efficient(plan: BlockPlan) -> Floats:
    """Largest factor on net irrigation (days,): never above what was applied gross."""
    net = np.asarray(plan.irrigation_net, dtype=np.float64)
    gross = np.maximum(np.asarray(plan.irrigation_gross, dtype=np.float64), net)
    return np.divide(gross, net, out=np.ones(net.shape), where=net > 0.0)


def _percentiles(values: Floats) -> Range:
    """10th and 90th percentile over the last axis, linear between ranks; sorts `values`."""
    values.sort(axis=-1)
    places = [share / 100.0 * (values.shape[-1] - 1) for share in (LOW, HIGH)]
    low, high = (
        values[..., int(place)]
        + (place - int(place)) * (values[..., int(np.ceil(place))] - values[..., int(place)])
        for place in places
    )
    return low, high
