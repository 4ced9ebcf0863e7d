"""From the book's parts and the handbook to the frozen objects that science works on."""

from datetime import date
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app import handbook
from app.science.advice.system import ApplicationSystem
from app.science.crop.season import CropSeason
from app.science.energy.net_sensor import WindFactor
from app.science.energy.station_day import Site
from app.science.soil.profile import Layer, Profile


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
    """A soil's profile: lab values where given, else of the texture class."""
    layers = []
    for part in details["layers"]:
        texture = handbook.soil_texture(part["texture"]) if part["texture"] else None
        held = [
            part[name] if part[name] is not None or texture is None else getattr(texture, name)
            for name in ("field_capacity", "wilting_point", "saturation")
        ]
        if held[2] is None:
            held[2] = min(0.95, held[0] + 0.15)
        layers.append(Layer(part["bottom_m"], *held))
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


def _readily_evaporable(details: dict[str, Any], tew: float) -> float:
    """REW as given; else of the top layer's texture, or the middle of the handbook's medium soils
    where only lab values are known, and then at most nine tenths of TEW."""
    if details["rew_mm"] is not None:
        return float(details["rew_mm"])
    texture = details["layers"][0]["texture"]
    return min(handbook.soil_texture(texture or "loam").rew_mm, 0.9 * tew)


def crop_season(details: dict[str, Any], planting: date) -> CropSeason:
    """A season: the handbook's row of its crop, under what the book overrides."""
    usable = handbook.usable(details["crop"], details["coefficients"])
    row = usable.row
    kind = "kcb" if details["coefficients"] == "dual" else "kc"
    k_ini, k_mid, k_end = (
        _over(details[f"{kind}_{stage}"], published)
        for stage, published in zip(("ini", "mid", "end"), usable.coefficients, strict=True)
    )
    return CropSeason(
        planting=np.datetime64(planting, "D"),
        stage_days=tuple(details["stage_days"] or usable.stage_days),
        coefficients=details["coefficients"],
        k_ini=k_ini,
        k_mid=k_mid,
        k_end=k_end,
        kc_min=_over(details["kc_min"], 0.15),
        height_max_m=_over(details["height_m"], row.height_max_m),
        root_min_m=_over(details["root_depth_min_m"], row.root_depth_min_m),
        root_max_m=_over(details["root_depth_max_m"], row.root_depth_max_m),
        depletion_fraction=_over(details["depletion_fraction"], row.depletion_fraction),
        mad=details["mad"],
        perennial=row.perennial,
        climate_adjustment=details["climate_adjustment"],
        end=np.datetime64(details["end"], "D") if details["end"] else None,
    )


def _over(given: float | None, published: float) -> float:
    return published if given is None else given


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
    """Fraction of the surface a system wets: its own, else the handbook's."""
    own = details["wetted_fraction"]
    return float(own if own is not None else handbook.wetting(details["wetting"]).fw_mid)


def gross_and_net(
    amount: float, unit: str, purpose: str, system: dict[str, Any], area_ha: float
) -> tuple[float, float]:
    """Gross and net depth [mm] of an event as entered.

    Metered volume / area, or rate x hours, or depth; net is gross x efficiency, times the share
    its purpose leaves for the roots.
    """
    efficiency = system["efficiency"]
    if unit == "net_mm":
        gross = amount / efficiency
    elif unit == "hours":
        gross = amount * system["rate_mm_h"]
    elif unit == "volume_m3":
        gross = amount / (10 * area_ha)
    else:
        gross = amount
    return gross, gross * efficiency * PURPOSE_SHARE.get(purpose, 1.0)


def keep_off_mask(details: dict[str, Any], days: NDArray[np.datetime64]) -> NDArray[np.bool_]:
    """True on the days a field may be irrigated."""
    allowed = np.ones(days.shape, np.bool_)
    for span in details["keep_offs"]:
        first, last = np.datetime64(span["first"], "D"), np.datetime64(span["last"], "D")
        allowed &= ~((days >= first) & (days <= last))
    return allowed
