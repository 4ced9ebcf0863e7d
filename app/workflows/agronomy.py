"""From the book's parts and the handbook to the frozen objects that science works on."""

from collections.abc import Sequence
from datetime import date
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app import handbook
from app.science import Floats
from app.science.advice.stage_plan import StagePlan, stage_plan
from app.science.advice.system import ApplicationSystem
from app.science.crop.bare_soil import kc_ini_own_soil, season_of_wetting
from app.science.crop.position import positions
from app.science.crop.season import CropSeason
from app.science.energy.net_sensor import WindFactor
from app.science.energy.station_day import Site
from app.science.soil import texture
from app.science.soil.block import BlockPlan, BlockWeather
from app.science.soil.capillary import RisingSoil
from app.science.soil.evaporation import emitter_fraction, lines_fraction
from app.science.soil.profile import Layer, Profile
from app.science.soil.root_zone import leaching_requirement, salinity_stress
from app.science.soil.salinity import soil_salinity
from app.science.soil.texture import texture_layer


def as_date(day: np.datetime64) -> date:
    """A numpy day as a date."""
    return date.fromisoformat(str(day.astype("datetime64[D]")))


COUNTED = {"presumed", "reported", "metered", "measured"}
"""What is said to be done and counts as water on the field; what is only advised does not."""

PURPOSE_SHARE = {"frost": 0.0, "cooling": 0.0}
"""Share of an event's net depth that reaches the roots, by purpose; 1 where not named."""


def site(details: dict[str, Any]) -> Site:
    """A station's site."""
    return Site(
        latitude_deg=details["latitude_deg"],
        longitude_deg=details["longitude_deg"],
        elevation_m=details["elevation_m"],
        utc_offset_h=details["utc_offset_h"],
        wind_height_m=details["wind_height_m"],
        reference_surface=details["reference_surface"],
        arid=details["arid"],
        coastal=details["coastal"],
    )


def net_wind(details: dict[str, Any]) -> tuple[WindFactor, WindFactor] | None:
    """Wind factors of a station's net sensor, of readings above zero and of the others; None
    without a certificate."""
    stated = details.get("net_wind")
    if stated is None:
        return None
    above, below = (
        WindFactor() if stated[name] is None else WindFactor(**stated[name])
        for name in ("positive", "negative")
    )
    return above, below


def profile(details: dict[str, Any]) -> Profile:
    """A soil's profile: lab values where given, else of the texture class or of sand and clay."""
    layers = [_layer(part) for part in details["layers"]]
    evaporable = 1000 * (layers[0].field_capacity - 0.5 * layers[0].wilting_point)
    tew = details["tew_mm"] or evaporable * details["evaporation_depth_m"]
    return Profile(
        layers=tuple(layers),
        evaporation_depth_m=details["evaporation_depth_m"],
        rew_mm=_readily_evaporable(details, tew),
        tew_mm=details["tew_mm"],
        curve_number=details["curve_number"],
        drainage_days=details["drainage_days"],
    )


def _layer(part: dict[str, Any]) -> Layer:
    told: Any = handbook.soil_texture(part["texture"]) if part["texture"] else None
    if part.get("sand") is not None:
        told = texture_layer(
            part["bottom_m"], part["sand"], part["clay"], part["organic_matter"], part["gravel"]
        )
    held = [
        part[name] if part[name] is not None or told is None else getattr(told, name)
        for name in ("field_capacity", "wilting_point", "saturation")
    ]
    if held[2] is None:
        held[2] = min(0.95, held[0] + 0.15)
    return Layer(part["bottom_m"], *held)


def rising_soil(details: dict[str, Any]) -> RisingSoil | None:
    """The soil above a water table: of the deepest layer with sand and clay; None without."""
    for part in reversed(details["layers"]):
        if part.get("sand") is not None:
            return texture.rising_soil(part["sand"], part["clay"], part["organic_matter"])
    return None


def water_table(field: dict[str, Any], days: NDArray[np.datetime64]) -> Floats | None:
    """Depth of the water table on each day [m], NaN out of reach; None where none is declared."""
    declared = sorted(field.get("water_table", []), key=lambda part: str(part["since"]))
    if not declared:
        return None
    depth = np.full(days.shape, np.nan)
    for part in declared:
        depth[days >= np.datetime64(part["since"], "D")] = (
            np.nan if part["depth_m"] is None else part["depth_m"]
        )
    return depth


def _readily_evaporable(details: dict[str, Any], tew: float) -> float:
    """REW as given; else of the top layer's texture, or the middle of the handbook's medium soils
    where only lab values are known, and then at most nine tenths of TEW."""
    if details["rew_mm"] is not None:
        return float(details["rew_mm"])
    texture = details["layers"][0]["texture"]
    return min(handbook.soil_texture(texture or "loam").rew_mm, 0.9 * tew)


def application_system(details: dict[str, Any]) -> ApplicationSystem:
    """What a system can deliver."""
    return ApplicationSystem(
        efficiency=details["efficiency"],
        rate_mm_h=details["rate_mm_h"],
        least_mm=details["least_mm"],
        most_mm=details["most_mm"],
        interval_days=details["interval_days"],
        cover_days=details["cover_days"],
        hours_per_day=details["hours_per_day"],
    )


def wetted_fraction(details: dict[str, Any]) -> float:
    """Fraction of the surface a system wets: its own, of its lines, else the handbook's."""
    own = details["wetted_fraction"]
    if details.get("lines"):
        own = lines_fraction(
            [
                emitter_fraction(
                    line["emitters_per_plant"],
                    line["spacing_m"],
                    line["strip_m"],
                    line["plant_area_m2"],
                )
                for line in details["lines"]
            ]
        )
    return float(own if own is not None else handbook.wetting(details["wetting"]).fw_mid)


def initial_wetting(
    crop: CropSeason, details: dict[str, Any], soil: Profile, system: dict[str, Any]
) -> CropSeason:
    """The season with its initial coefficient by how often its soil is wetted, where stated."""
    told = details.get("initial_wetting")
    if told is None or crop.coefficients != "single":
        return crop
    kc = kc_ini_own_soil(
        told["every_days"],
        told["eto_mm"],
        soil.tew,
        soil.rew_mm,
        told["depth_mm"],
        wetted_fraction(system),
    )
    return season_of_wetting(crop, float(kc))


def gross_and_net(
    amount: float,
    unit: str,
    purpose: str,
    system: dict[str, Any],
    area_ha: float,
    area_share: float = 1.0,
) -> tuple[float, float]:
    """Gross and net depth [mm] of an event as entered, over the whole block.

    Metered volume / area, or rate x hours, or depth, the latter two on `area_share` of the block;
    net is gross x efficiency, times the share its purpose leaves for the roots.
    """
    efficiency = system["efficiency"]
    if unit == "net_mm":
        gross = amount / efficiency * area_share
    elif unit == "hours":
        gross = amount * system["rate_mm_h"] * area_share
    elif unit == "volume_m3":
        gross = amount / (10 * area_ha)
    else:
        gross = amount * area_share
    return gross, gross * efficiency * PURPOSE_SHARE.get(purpose, 1.0)


def keep_off_mask(
    details: dict[str, Any],
    days: NDArray[np.datetime64],
    said: Sequence[tuple[date, date]] = (),
) -> NDArray[np.bool_]:
    """True on the days a field may be irrigated: by its book, and by what was `said` since."""
    allowed = np.ones(days.shape, np.bool_)
    for span in details["keep_offs"]:
        first, last = np.datetime64(span["first"], "D"), np.datetime64(span["last"], "D")
        allowed &= ~((days >= first) & (days <= last))
    for begins, ends in said:
        allowed &= ~((days >= np.datetime64(begins)) & (days <= np.datetime64(ends)))
    return allowed


def plan_by_stage(
    crop: CropSeason, plan: BlockPlan, weather: BlockWeather, details: dict[str, Any], taw: Floats
) -> StagePlan | None:
    """A season's plan for the last days of `plan`, as many as `taw` has; None without one."""
    warm = crop.degree_days
    warmth = None
    if warm is not None and weather.tmax is not None and weather.tmin is not None:
        warmth = warm.daily(weather.tmax, weather.tmin)[:, None]
    place = positions(
        [crop], plan.date[:, None], warmth=warmth, warmth_before=[plan.degree_days_before]
    )
    return stage_plan(
        place.stage[plan.days - taw.size :, 0],
        taw,
        details["refill_to_mm"],
        details.get("refill_to_by_stage"),
        details.get("et_target_by_stage"),
        details.get("floor_by_stage"),
    )


def salt_factor(field: dict[str, Any], season: dict[str, Any]) -> float:
    """Stress coefficient of the salinity that a field's water leaves, 1 where nothing is known of
    the water or of the crop."""
    crop, water = _salt_row(season), field.get("water_ec_ds_m")
    if water is None or crop is None or crop.salinity_slope_pct_per_ds_m is None:
        return 1.0
    ece = soil_salinity(water, field["leaching_fraction"])
    slope, ky = crop.salinity_slope_pct_per_ds_m, crop.ky_seasonal or 1.0
    return float(salinity_stress(ece, _threshold(crop), slope, ky))


def leaching(field: dict[str, Any], season: dict[str, Any]) -> float:
    """Leaching requirement 0-0.9 of a field's water for its crop; 0 where one is not known."""
    crop, water = _salt_row(season), field.get("water_ec_ds_m")
    if water is None or crop is None:
        return 0.0
    return float(leaching_requirement(water, _threshold(crop)))


def _salt_row(season: dict[str, Any]) -> handbook.CropRow | None:
    row = handbook.crops().get(season["crop"]) if not season.get("own_crop") else None
    return row if row is not None and row.ece_threshold_ds_m is not None else None


def _threshold(crop: handbook.CropRow) -> float:
    assert crop.ece_threshold_ds_m is not None
    return crop.ece_threshold_ds_m
