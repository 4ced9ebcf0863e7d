"""What the day loop needs and the state of the soil does not change, computed beforehand."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from app.science import Bools, Floats
from app.science.crop.curve import Curve
from app.science.crop.season import CropSeason
from app.science.soil import evaporation
from app.science.soil.balance import Blocks, Days, State, Terms
from app.science.soil.profile import Profile
from app.science.soil.root_zone import P_ETC, P_SLOPE
from app.science.soil.runoff import dry_curve_number, wet_curve_number, wetness_bounds

# A curve number so low that no rain runs off, for blocks without one.
NO_RUNOFF = 1.0


@dataclass(frozen=True, kw_only=True)
class Supplies:
    """Water and energy of each day, each (days, blocks): eto, rain, irrigation (net),
    capillary_rise, correction [mm]; irrigation_fw [-], NaN for no event; u2 [m s-1]; rh_min [%]."""

    eto: Floats
    rain: Floats
    irrigation: Floats
    irrigation_fw: Floats
    capillary_rise: Floats
    correction: Floats
    u2: Floats
    rh_min: Floats


@dataclass(frozen=True, kw_only=True)
class Openings:
    """State before the first day, each (blocks,): depletion_mm, or NaN for depletion_fraction of
    TAW; subsoil_fraction of the subsoil's TAW; layer_mm; roots, wetted fraction of the root zone;
    under_canopy bool."""

    depletion_mm: Floats
    depletion_fraction: Floats
    subsoil_fraction: Floats
    layer_mm: Floats
    roots: Floats
    under_canopy: Bools


def soil_held(profiles: Sequence[Profile], depth: Floats) -> tuple[Floats, Floats]:
    """TAW and water between field capacity and saturation [mm] down to `depth` [m].

    profiles: one a block; depth (days, blocks). Returns two such arrays; the same as
    `Profile.taw` and `Profile.saturation_excess`, over all blocks at once.
    """
    count = max(len(profile.layers) for profile in profiles)
    taw, saturation = np.zeros(depth.shape), np.zeros(depth.shape)
    top = np.zeros(len(profiles))
    for i in range(count):
        bottom, available, above = np.array([_layer(profile, i) for profile in profiles]).T
        thick = np.minimum(np.maximum(depth - top, 0.0), np.maximum(bottom - top, 0.0))
        taw += 1000.0 * available * thick
        saturation += 1000.0 * above * thick
        top = bottom
    return taw, saturation


def _layer(profile: Profile, i: int) -> tuple[float, float, float]:
    """Bottom, available water and saturation excess of layer `i`; the last one has no bottom."""
    last = len(profile.layers) - 1
    layer = profile.layers[min(i, last)]
    bottom = layer.bottom_m if i < last else 1e9
    if i > last:
        return bottom, 0.0, 0.0
    available = layer.field_capacity - layer.wilting_point
    return bottom, available, layer.saturation - layer.field_capacity


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
    whole = np.where(np.isnan(openings.depletion_mm), openings.depletion_fraction * taw[0], 0.0)
    depletion = np.where(np.isnan(openings.depletion_mm), whole, openings.depletion_mm)
    slow = np.array([profile.drainage_days for profile in profiles], dtype=np.float64)
    blocks = _blocks(seasons, profiles, openings.roots, slow, p_slope, dual)
    return Terms(
        blocks=blocks,
        days=_days(dual, curve, supplies, openings, taw, saturation, reachable),
        opening=State(
            depletion=np.clip(depletion, -saturation[0] * (slow > 0.0), taw[0]),
            subsoil=np.clip(openings.subsoil_fraction, 0.0, 1.0) * (reachable - taw[0]),
            layer=np.clip(openings.layer_mm, 0.0, blocks.tew),
            draining=np.zeros(slow.shape),
        ),
        has_runoff=any(profile.curve_number is not None for profile in profiles),
        has_slow_drainage=bool((slow > 0.0).any()),
        has_correction=bool((supplies.correction != 0.0).any()),
        drain_before_et=drain_before_et,
    )


def _blocks(
    seasons: Sequence[CropSeason],
    profiles: Sequence[Profile],
    roots: Floats,
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
        roots=roots,
        wet_at=wet_at,
        wet_span=dry_at - wet_at,
        cn_wet=cn_wet,
        cn_fall=cn_wet - cn_dry,
        drainage_days=slow,
    )


def _days(
    dual: Bools,
    curve: Curve,
    supplies: Supplies,
    openings: Openings,
    taw: Floats,
    saturation: Floats,
    reachable: Floats,
) -> Days:
    k, eto = curve.coefficient, np.maximum(supplies.eto, 0.0)  # dew is no demand
    kc_max = evaporation.kc_max(k, supplies.u2, supplies.rh_min, curve.height)
    cover = evaporation.cover_fraction(k, kc_max, curve.height, curve.kc_min)
    fw, by_irrigation = evaporation.wetted_fraction_series(supplies.rain, supplies.irrigation_fw)
    shaded = openings.under_canopy & (by_irrigation > 0.0)
    sunlit = np.where(shaded, evaporation.under_canopy(fw, cover), fw)
    exposed = np.where(dual, evaporation.exposed_wetted_fraction(cover, sunlit), 1.0)
    # New roots take over the share of the subsoil they enter.
    before = np.vstack([taw[:1], taw[:-1]])
    below = reachable - before
    new_roots = np.divide(taw - before, below, out=np.zeros(taw.shape), where=below > 1e-9)
    return Days(
        rain=supplies.rain,
        wet=supplies.rain * openings.roots + supplies.irrigation + supplies.capillary_rise,
        surface=supplies.rain + supplies.irrigation / fw,
        transpiration=k * eto,
        evaporation=np.where(dual, (kc_max - k) * eto, 0.0),
        evaporation_most=exposed * kc_max * eto,
        exposed=exposed,
        taw=taw,
        new_roots=np.clip(new_roots, 0.0, 1.0),
        saturation=saturation,
        correction=supplies.correction,
    )
