"""The daily root-zone water balance: the only day loop of the project.

`balance_day` is the balance of one day, written once. `balance` runs it over arrays of blocks,
`balance_scalar` over plain floats for one block; both give the same bits. All that does not
depend on the state of the soil is computed beforehand (`app.science.soil.terms`).

Order of a day, wetting early (FAO-56 Annex 8): roots grow; rain less runoff, net irrigation and
capillary rise come in; Kr and Ks from the depletions after that; evapotranspiration, cut so that
neither layer goes below empty; drainage; correction by a reading.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields, replace
from typing import Any, NamedTuple

import numpy as np

from app.science import Floats
from app.science.soil.root_zone import P_LEAST, P_MOST
from app.science.soil.runoff import ABSTRACTION

# Blocks worked on at a time, so that a day's arrays stay in the processor's cache.
CHUNK = 4096

# What a branch that no block uses gives; the arrays hold zeros already.
UNUSED = 0.0


class Blocks(NamedTuple):
    """What stays the same all season, each (blocks,)."""

    tew: Any  # total evaporable water [mm]
    drying: Any  # TEW - REW [mm], above 0
    p_base: Any  # p at no ET: table p + slope * 5 [-]
    p_slope: Any  # fall of p for each mm of unstressed ETc [mm-1]
    roots: Any  # wetted fraction of the root zone [-]
    wet_at: Any  # evaporation layer depletion at which the soil counts as wet [mm]
    wet_span: Any  # from there to where it counts as dry [mm], above 0
    cn_wet: Any  # curve number wet [-]
    cn_fall: Any  # curve number wet less dry [-]
    drainage_days: Any  # 0 for drainage on the day
    salt: Any  # factor of salinity on transpiration, 1 for none [-]


class Days(NamedTuple):
    """What does not depend on the state of the soil, each (days, blocks)."""

    rain: Any  # [mm]
    wet: Any  # rain on the root zone, net irrigation and capillary rise [mm]
    surface: Any  # rain and irrigation where it falls on the evaporation layer [mm]
    transpiration: Any  # Kcb ETo (Kc ETo with single coefficients), unstressed [mm]
    evaporation: Any  # (Kc max - Kcb) ETo [mm]
    evaporation_most: Any  # few Kc max ETo [mm]
    exposed: Any  # few [-]
    taw: Any  # [mm]
    new_roots: Any  # share of the subsoil store that roots take over that day [-]
    below: Any  # opening depletion of the subsoil below the day's roots [mm], inf if not by layer
    rise: Any  # most that can rise from the water table [mm]
    saturation: Any  # water between field capacity and saturation [mm]
    correction: Any  # [mm], positive wets


class State(NamedTuple):
    """What a day hands to the next, each (blocks,) or plain numbers.

    A balance run on from a saved state gives the same bits as one run whole.
    """

    depletion: Any  # of the root zone [mm]
    subsoil: Any  # depletion of the subsoil store [mm]
    layer: Any  # depletion of the evaporation layer [mm]
    draining: Any  # days in a row above field capacity


@dataclass(frozen=True, kw_only=True)
class Terms:
    """Everything the day loop needs: blocks, days, the state they open with and which branches
    are used.

    opening (blocks,): the state before the first day. has_runoff, has_slow_drainage,
    has_correction, has_layers (of the subsoil), has_table: False skips a branch no block uses.
    drain_before_et: the order of FAO-56 Example 38 as printed.
    """

    blocks: Blocks
    days: Days
    opening: State
    has_runoff: bool = False
    has_slow_drainage: bool = False
    has_correction: bool = False
    has_layers: bool = False
    has_table: bool = False
    drain_before_et: bool = False

    def since(self, passed: Sequence[int]) -> "Terms":
        """The terms without each block's first `passed` days; the opening is left as it is."""
        return replace(self, days=Days(*(without_first(values, passed) for values in self.days)))


def without_first(values: Any, passed: Sequence[int]) -> Any:
    """Columns (days, blocks) moved up by each block's `passed` days; the last day stands in where
    a column has run out."""
    most = values.shape[0] - 1
    rows = np.arange(values.shape[0] - min(passed))[:, None] + np.array(passed)
    return np.take_along_axis(values, np.minimum(rows, most), axis=0)


@dataclass(frozen=True, kw_only=True)
class Balance:
    """Each (days, blocks): end of day depletions [mm] of root zone, subsoil store and evaporation
    layer; days in a row above field capacity; evaporation and transpiration [mm]; Ks [-]; RAW
    [mm]; deep percolation, depletion taken over by new roots, runoff, rise from the water table,
    correction applied [mm]."""

    depletion: Floats
    subsoil: Floats
    layer: Floats
    draining: Floats
    evaporation: Floats
    transpiration: Floats
    ks: Floats
    raw: Floats
    percolation: Floats
    growth: Floats
    runoff: Floats
    rise: Floats
    correction: Floats


COLUMNS = tuple(column.name for column in fields(Balance))


def balance_day(
    lo: Callable[[Any, Any], Any],
    hi: Callable[[Any, Any], Any],
    terms: Terms,
    block: Blocks,
    day: Days,
    state: State,
) -> tuple[State, tuple[Any, ...]]:
    """One day of the balance; returns the new state and the day's columns, those of `Balance`.

    lo, hi: smaller and larger of two (of floats or of arrays). Source: FAO-56 eq 71,
    74, 77 to 80, 84, 85, 88; NEH 630 chapter 10.
    """
    depletion, subsoil, layer, run = state
    taw = day.taw
    # Roots grow and take over the depletion of the soil they enter.
    growth = subsoil * day.new_roots
    if terms.has_layers:  # percolation fills a subsoil known by layer from its top
        growth = growth + hi(subsoil - day.below, 0.0)
    subsoil = subsoil - growth
    depletion = depletion + growth
    # Water comes in.
    runoff: Any = UNUSED
    wet, surface = day.wet, day.surface
    if terms.has_runoff:
        dryness = lo(hi((layer - block.wet_at) / block.wet_span, 0.0), 1.0)
        held = 25400.0 / (block.cn_wet - block.cn_fall * dryness) - 254.0
        over = hi(day.rain - ABSTRACTION * held, 0.0)
        runoff = over * over / hi(day.rain + (1.0 - ABSTRACTION) * held, 1e-9)
        wet = wet - runoff * block.roots
        surface = surface - runoff
    depletion = depletion - wet
    rise: Any = UNUSED
    if terms.has_table:
        rise = lo(day.rise, hi(depletion, 0.0))
        depletion = depletion - rise
    layer = hi(layer - surface, 0.0)
    percolation: Any = UNUSED
    if terms.drain_before_et:
        drained = hi(depletion, 0.0)
        percolation = drained - depletion
        depletion = drained
    # Evaporation, from the layer's water and the energy left by the crop.
    moist = hi(block.tew - layer, 0.0)
    reduction = lo(moist / block.drying, 1.0)
    evaporation = lo(reduction * day.evaporation, day.evaporation_most)
    evaporation = lo(evaporation, moist * day.exposed)
    # Transpiration, reduced by stress; both within what the root zone holds.
    p = block.p_base - block.p_slope * (day.transpiration + evaporation)
    raw = lo(hi(p, P_LEAST), P_MOST) * taw
    left = hi(taw - depletion, 0.0)
    ks = lo(left / (taw - raw), 1.0) * block.salt
    evaporation = lo(evaporation, left)
    transpiration = lo(ks * day.transpiration, left - evaporation)
    layer = layer + evaporation / day.exposed
    depletion = depletion + (evaporation + transpiration)
    # Drainage of what is above field capacity.
    if not terms.drain_before_et:
        drained = hi(depletion, 0.0)
        excess = drained - depletion
        if terms.has_slow_drainage:
            run = (run + 1.0) * (excess > 0.0)
            share = hi(block.drainage_days + 2.0 - run, 1.0)
            held = lo(excess, day.saturation) * (1.0 - 1.0 / share)
            percolation = excess - held
            depletion = drained - held
            run = run * (block.drainage_days > 0.0)
        else:
            percolation = excess
            depletion = drained
    subsoil = hi(subsoil - percolation, 0.0)
    # A reading corrects the close, within what the soil can hold.
    correction: Any = UNUSED
    if terms.has_correction:
        wettest = -(day.saturation * (block.drainage_days > 0.0))
        driest = hi(depletion, taw)
        corrected = hi(lo(depletion - day.correction, driest), lo(depletion, wettest))
        correction = depletion - corrected
        depletion = corrected
    state = State(depletion, subsoil, layer, run)
    columns = (
        *state,
        evaporation,
        transpiration,
        ks,
        raw,
        percolation,
        growth,
        runoff,
        rise,
        correction,
    )
    return state, columns


def balance(terms: Terms) -> Balance:
    """Water balance of many blocks at once; blocks never touch each other.

    terms: (days, blocks) arrays as in `Terms`, NaN-free. Returns arrays of the same shape.
    """
    days, blocks = terms.days.rain.shape
    out = np.zeros((len(COLUMNS), days, blocks))
    for first in range(0, blocks, CHUNK):
        part = slice(first, min(first + CHUNK, blocks))
        block = Blocks(*(values[part] for values in terms.blocks))
        columns = [values[:, part] for values in terms.days]
        rows = [column[:, part] for column in out]
        state = State(*(values[part] for values in terms.opening))
        for i in range(days):
            day = Days(*[values[i] for values in columns])
            state, result = balance_day(np.minimum, np.maximum, terms, block, day, state)
            for row, values in zip(rows, result, strict=True):
                if values is not UNUSED:
                    row[i] = values
    return Balance(**dict(zip(COLUMNS, out, strict=True)))


def balance_scalar(terms: Terms) -> Balance:
    """The same balance in plain floats, block by block: quicker for one or a few blocks."""
    days, blocks = terms.days.rain.shape
    out = np.zeros((len(COLUMNS), days, blocks))
    for b in range(blocks):
        block = Blocks(*(float(values[b]) for values in terms.blocks))
        state = State(*(float(values[b]) for values in terms.opening))
        rows = []
        for values in zip(*(column[:, b].tolist() for column in terms.days), strict=True):
            state, result = balance_day(min, max, terms, block, Days(*values), state)
            rows.append(result)
        out[:, :, b] = np.array(rows, dtype=np.float64).reshape(days, len(COLUMNS)).T
    return Balance(**dict(zip(COLUMNS, out, strict=True)))
