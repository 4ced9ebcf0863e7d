"""What the day loop needs and the state of the soil does not change, computed beforehand."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from app.science import Bools, Floats
from app.science.crop.curve import Curve
from app.science.crop.season import CropSeason
from app.science.soil import evaporation
from app.science.soil.balance import Blocks, Days, State, Terms
from app.science.soil.capillary import RisingSoil, rise_to_roots
from app.science.soil.profile import Profile
from app.science.soil.root_zone import P_ETC, P_SLOPE
from app.science.soil.runoff import dry_curve_number, wet_curve_number, wetness_bounds

# A curve number so low that no rain runs off, for blocks without one.
NO_RUNOFF = 1.0


@dataclass(frozen=True, kw_only=True)
class Supplies:
    """Water and energy of each day, each (days, blocks): eto, rain, irrigation (net),
    capillary_rise, correction [mm]; irrigation_fw [-], NaN for no event; water_table [m below the
    surface], NaN for none; u2 [m s-1]; rh_min [%]."""

    eto: Floats
    rain: Floats
    irrigation: Floats
    irrigation_fw: Floats
    capillary_rise: Floats
    correction: Floats
    water_table: Floats
    u2: Floats
    rh_min: Floats


@dataclass(frozen=True, kw_only=True)
class Openings:
    """State before the first day, each (blocks,): depletion_mm, or NaN for depletion_fraction of
    TAW; subsoil_fraction of the subsoil's TAW; layer_mm; roots, wetted fraction of the root zone;
    under_canopy and weighted (wetted fraction of irrigation and rain by their depths) bool; salt,
    factor of salinity; open_ground, fraction not under plastic; mulched, factor of organic mulch
    on evaporation. rising (blocks), the soil above a water table or None; layer_shares
    (blocks), opening depletion of each soil layer or None."""

    depletion_mm: Floats
    depletion_fraction: Floats
    subsoil_fraction: Floats
    layer_mm: Floats
    roots: Floats
    under_canopy: Bools
    weighted: Bools
    salt: Floats
    open_ground: Floats
    mulched: Floats
    rising: Sequence[RisingSoil | None]
    layer_shares: Sequence[tuple[float, ...] | None]


def soil_held(profiles: Sequence[Profile], depth: Floats) -> tuple[Floats, Floats]:
    """TAW and water between field capacity and saturation [mm] down to `depth` [m].

    profiles: one a block; depth (days, blocks). Returns two such arrays; the same as
    `Profile.taw` and `Profile.saturation_excess`, over all blocks at once.
    """
    available = [[x.field_capacity - x.wilting_point for x in p.layers] for p in profiles]
    above = [[x.saturation - x.field_capacity for x in p.layers] for p in profiles]
    return _held(profiles, depth, available), _held(profiles, depth, above)


def subsoil_by_layer(
    profiles: Sequence[Profile],
    shares: Sequence[tuple[float, ...] | None],
    depth: Floats,
    deepest: Floats,
) -> Floats:
    """Opening depletion [mm] of the soil between `depth` and `deepest` [m].

    shares: depletion 0-1 of TAW of each layer, or None (gives 0). depth (days, blocks), deepest
    (1, blocks). Returns (days, blocks).
    """
    contents = [
        [
            share * (x.field_capacity - x.wilting_point)
            for x, share in zip(p.layers, told or (0.0,) * len(p.layers), strict=True)
        ]
        for p, told in zip(profiles, shares, strict=True)
    ]
    held = _held(profiles, np.vstack([deepest, np.minimum(depth, deepest)]), contents)
    return np.asarray(held[:1] - held[1:])


def _held(profiles: Sequence[Profile], depth: Floats, contents: list[list[float]]) -> Floats:
    """Water [mm] down to `depth` [m] of layers that hold `contents` [m3 m-3]."""
    total, top = np.zeros(depth.shape), np.zeros(len(profiles))
    for i in range(max(len(profile.layers) for profile in profiles)):
        bottom = np.array([_bottom(profile, i) for profile in profiles])
        content = np.array([held[i] if i < len(held) else 0.0 for held in contents])
        thick = np.minimum(np.maximum(depth - top, 0.0), np.maximum(bottom - top, 0.0))
        total += 1000.0 * content * thick
        top = bottom
    return total


def _bottom(profile: Profile, i: int) -> float:
    """Bottom [m] of layer `i`; the last one has none."""
    return profile.layers[i].bottom_m if i < len(profile.layers) - 1 else 1e9


def make_terms(
    seasons: Sequence[CropSeason],
    profiles: Sequence[Profile],
    curve: Curve,
    supplies: Supplies,
    openings: Openings,
    *,
    p_slope: float = P_SLOPE,
    drain_before_et: bool = False,
) -> Terms:
    """Terms of the day loop for many blocks.

    seasons and profiles one a block; curve and supplies (days, blocks); openings (blocks,).
    p_slope 0 keeps the table's p; drain_before_et is the order Example 38 of FAO-56 prints.
    Source: FAO-56 eq 71, 72, 75, 76, 82 and 83.
    """
    dual = np.array([season.coefficients == "dual" for season in seasons])
    taw, saturation = soil_held(profiles, curve.root_depth)
    deepest = np.array([[season.root_max_m for season in seasons]])
    reachable = np.maximum(soil_held(profiles, deepest)[0][0], taw[0]) * openings.roots
    taw *= openings.roots
    saturation *= openings.roots
    layered = np.array([shares is not None for shares in openings.layer_shares])
    below = openings.roots * subsoil_by_layer(
        profiles, openings.layer_shares, curve.root_depth, np.maximum(deepest, curve.root_depth[0])
    )
    even = np.clip(openings.subsoil_fraction, 0.0, 1.0) * (reachable - taw[0])
    whole = np.where(np.isnan(openings.depletion_mm), openings.depletion_fraction * taw[0], 0.0)
    depletion = np.where(np.isnan(openings.depletion_mm), whole, openings.depletion_mm)
    slow = np.array([profile.drainage_days for profile in profiles], dtype=np.float64)
    blocks = _blocks(seasons, profiles, openings, slow, p_slope, dual)
    days = _days(dual, curve, supplies, openings, taw, saturation)
    return Terms(
        blocks=blocks,
        days=days._replace(
            new_roots=np.where(layered, 0.0, _new_roots(taw, reachable)),
            below=np.where(layered, below, np.inf),
        ),
        opening=State(
            depletion=np.clip(depletion, -saturation[0] * (slow > 0.0), taw[0]),
            subsoil=np.where(layered, below[0], even),
            layer=np.clip(openings.layer_mm, 0.0, blocks.tew),
            draining=np.zeros(slow.shape),
        ),
        has_runoff=any(profile.curve_number is not None for profile in profiles),
        has_slow_drainage=bool((slow > 0.0).any()),
        has_correction=bool((supplies.correction != 0.0).any()),
        has_layers=bool(layered.any()),
        has_table=bool((days.rise > 0.0).any()),
        drain_before_et=drain_before_et,
    )


def _new_roots(taw: Floats, reachable: Floats) -> Floats:
    """Share of the subsoil that each day's new roots enter."""
    before = np.vstack([taw[:1], taw[:-1]])
    below = reachable - before
    share = np.divide(taw - before, below, out=np.zeros(taw.shape), where=below > 1e-9)
    return np.clip(share, 0.0, 1.0)


def _blocks(
    seasons: Sequence[CropSeason],
    profiles: Sequence[Profile],
    openings: Openings,
    slow: Floats,
    p_slope: float,
    dual: Bools,
) -> Blocks:
    tew = np.array([profile.tew for profile in profiles])
    rew = np.array([profile.rew_mm for profile in profiles], dtype=np.float64)
    table_p = np.array([season.depletion_fraction for season in seasons])
    average = np.array([profile.curve_number or NO_RUNOFF for profile in profiles])
    # Without an evaporation layer (single coefficients) the soil counts as of average wetness.
    told = dual & (average > NO_RUNOFF)
    cn_wet = np.where(told, wet_curve_number(average), average)
    cn_dry = np.where(told, dry_curve_number(average), average)
    wet_at, dry_at = wetness_bounds(tew, rew)
    return Blocks(
        tew=tew,
        drying=tew - rew,
        p_base=table_p + p_slope * P_ETC,
        p_slope=np.full(tew.shape, p_slope),
        roots=openings.roots,
        wet_at=wet_at,
        wet_span=dry_at - wet_at,
        cn_wet=cn_wet,
        cn_fall=cn_wet - cn_dry,
        drainage_days=slow,
        salt=openings.salt,
    )


def _days(
    dual: Bools,
    curve: Curve,
    supplies: Supplies,
    openings: Openings,
    taw: Floats,
    saturation: Floats,
) -> Days:
    k, eto = curve.coefficient, np.maximum(supplies.eto, 0.0)  # dew is no demand
    ground = surface(dual, curve, supplies, openings)
    kc_max, fw, exposed = ground.kc_max, ground.fw, ground.exposed
    damped = openings.mulched
    return Days(
        rain=supplies.rain,
        wet=supplies.rain * openings.roots + supplies.irrigation + supplies.capillary_rise,
        surface=supplies.rain + supplies.irrigation / fw,
        transpiration=k * eto,
        evaporation=np.where(dual, (kc_max - k) * eto, 0.0) * damped,
        evaporation_most=exposed * kc_max * eto * damped,
        exposed=exposed,
        taw=taw,
        new_roots=np.zeros(taw.shape),
        below=np.zeros(taw.shape),
        rise=_rise(openings.rising, supplies.water_table, curve.root_depth, k * eto),
        saturation=saturation,
        correction=supplies.correction,
    )


class Surface(NamedTuple):
    """The soil's surface, each (days, blocks) [-]: most Kc after wetting, ground cover fc, wetted
    fraction fw, and few, the fraction both exposed and wetted (1 with single coefficients)."""

    kc_max: Floats
    cover: Floats
    fw: Floats
    exposed: Floats


def surface(dual: Bools, curve: Curve, supplies: Supplies, openings: Openings) -> Surface:
    """The surface of each day; curve and supplies (days, blocks), dual and openings (blocks,).

    Source: FAO-56 eq 72, 75, 76 and table 20.
    """
    k = curve.coefficient
    kc_max = evaporation.kc_max(k, supplies.u2, supplies.rh_min, curve.height)
    reckoned = evaporation.cover_fraction(k, kc_max, curve.height, curve.kc_min)
    cover = np.where(np.isnan(curve.cover), reckoned, curve.cover)
    event = _events(supplies, openings.weighted)
    fw, by_irrigation = evaporation.wetted_fraction_series(supplies.rain, event)
    shaded = openings.under_canopy & (by_irrigation > 0.0)
    sunlit = np.where(shaded, evaporation.under_canopy(fw, cover), fw)
    sunlit = np.where(curve.in_season, np.minimum(sunlit, openings.open_ground), sunlit)
    exposed = np.where(dual, evaporation.exposed_wetted_fraction(cover, sunlit), 1.0)
    return Surface(kc_max, cover, fw, exposed)


def _events(supplies: Supplies, weighted: Bools) -> Floats:
    """Wetted fraction of each day's irrigation, NaN for none; where blocks say so, weighted with
    the day's wetting rain."""
    own = supplies.irrigation_fw
    both = weighted & ~np.isnan(own) & (supplies.rain >= evaporation.WETTING_RAIN_MM)
    if not both.any():
        return own
    depths = np.stack([supplies.irrigation, supplies.rain])
    mean = evaporation.weighted_fraction(depths, np.stack([own, np.ones(own.shape)]))
    return np.where(both, mean, own)


def _rise(
    soils: Sequence[RisingSoil | None], table: Floats, root_depth: Floats, demand: Floats
) -> Floats:
    """Most that can rise from the water table [mm], (days, blocks)."""
    rise = np.zeros(table.shape)
    for b, soil in enumerate(soils):
        if soil is not None:
            rise[:, b] = rise_to_roots(soil, table[:, b], root_depth[:, b], demand[:, b])
    return rise
