"""Stations, soils, systems and farms of the invented valley. Numbers are typical ones."""

from typing import Any

STATIONS: list[dict[str, Any]] = [
    {
        "key": "tarrow-north",
        "name": "Tarrow North",
        "latitude_deg": 43.712,
        "longitude_deg": -108.412,
        "elevation_m": 742,
        "utc_offset_h": -7,
        "wind_height_m": 2,
        "reference_surface": True,
    },
    {
        "key": "ferrin-bench",
        "name": "Ferrin Bench",
        "latitude_deg": 43.668,
        "longitude_deg": -108.551,
        "elevation_m": 868,
        "utc_offset_h": -7,
        "wind_height_m": 10,
    },
    {
        "key": "sand-lane",
        "name": "Sand Lane",
        "latitude_deg": 43.781,
        "longitude_deg": -108.298,
        "elevation_m": 701,
        "utc_offset_h": -7,
    },
]


def lab(bottom: float, fc: float, wp: float, sat: float) -> dict[str, float]:
    return {"bottom_m": bottom, "field_capacity": fc, "wilting_point": wp, "saturation": sat}


def texture(bottom: float, name: str) -> dict[str, Any]:
    return {"bottom_m": bottom, "texture": name}


SOILS: list[dict[str, Any]] = [
    {"key": "valley-loam", "name": "Valley loam", "layers": [texture(2.0, "loam")]},
    {
        "key": "river-silt",
        "name": "River silt loam over sandy loam",
        "layers": [texture(0.9, "silt_loam"), texture(2.0, "sandy_loam")],
    },
    {
        "key": "pivot-sandy-loam",
        "name": "Sandy loam of the north pivots",
        "layers": [texture(2.0, "sandy_loam")],
    },
    {
        "key": "pivot-blowout",
        "name": "Sand blowout in the north pivots",
        "layers": [texture(0.4, "loamy_sand"), texture(2.0, "sand")],
    },
    {
        "key": "bench-silt",
        "name": "Bench silt loam (lab, 2024)",
        "rew_mm": 9,
        "curve_number": 78,
        "layers": [
            lab(0.3, 0.30, 0.13, 0.48),
            lab(0.8, 0.31, 0.145, 0.47),
            lab(2.0, 0.28, 0.13, 0.45),
        ],
    },
    {
        "key": "quarry-gravel",
        "name": "Quarry loam on gravel (lab, 2023)",
        "rew_mm": 8,
        "layers": [
            lab(0.5, 0.245, 0.11, 0.44),
            lab(1.0, 0.15, 0.065, 0.38),
            lab(2.0, 0.10, 0.04, 0.34),
        ],
    },
    {"key": "lane-sand", "name": "Lane loamy sand", "layers": [texture(2.0, "loamy_sand")]},
    {
        "key": "slough-clay",
        "name": "Slough silty clay loam over clay",
        "curve_number": 82,
        "drainage_days": 2,
        "layers": [texture(0.6, "silty_clay_loam"), texture(2.0, "clay")],
    },
    {
        "key": "meadow-clay-loam",
        "name": "Meadow clay loam (lab, 2025)",
        "rew_mm": 9,
        "drainage_days": 2,
        "layers": [lab(0.4, 0.36, 0.20, 0.50), lab(2.0, 0.37, 0.215, 0.49)],
    },
    {
        "key": "orchard-loam",
        "name": "Orchard loam over sandy loam",
        "layers": [texture(0.7, "loam"), texture(2.5, "sandy_loam")],
    },
    {
        "key": "terrace-stony",
        "name": "Stony terrace (lab, 2022)",
        "rew_mm": 7,
        "layers": [lab(0.6, 0.20, 0.09, 0.41), lab(2.0, 0.16, 0.075, 0.38)],
    },
]

SYSTEMS: list[dict[str, Any]] = [
    {
        "key": "pivot-low",
        "name": "Pivot, low spray",
        "kind": "centre pivot",
        "efficiency": 0.90,
        "rate_mm_h": 0.46,
        "least_mm": 8,
        "most_mm": 32,
        "cover_days": 2,
    },
    {
        "key": "pivot-high",
        "name": "Pivot, impact heads and end gun",
        "kind": "centre pivot",
        "efficiency": 0.80,
        "rate_mm_h": 0.42,
        "least_mm": 10,
        "most_mm": 32,
        "cover_days": 2,
    },
    {
        "key": "wheel-line",
        "name": "Wheel line, two sets a day",
        "kind": "side-roll sprinkler",
        "efficiency": 0.75,
        "rate_mm_h": 6.1,
        "least_mm": 30,
        "most_mm": 72,
        "interval_days": 3,
        "cover_days": 3,
        "hours_per_day": 23,
    },
    {
        "key": "hand-move",
        "name": "Hand-move laterals",
        "kind": "hand-move sprinkler",
        "efficiency": 0.72,
        "rate_mm_h": 5.2,
        "least_mm": 25,
        "most_mm": 62,
        "interval_days": 2,
        "cover_days": 2,
        "hours_per_day": 22,
    },
    {
        "key": "solid-set",
        "name": "Solid set",
        "kind": "solid-set sprinkler",
        "efficiency": 0.78,
        "rate_mm_h": 4.2,
        "least_mm": 8,
        "most_mm": 40,
    },
    {
        "key": "furrow-siphon",
        "name": "Siphon tubes, every furrow",
        "kind": "furrow",
        "efficiency": 0.62,
        "rate_mm_h": 7.5,
        "wetting": "furrow_every_wide_bed",
        "least_mm": 50,
        "most_mm": 120,
        "interval_days": 3,
        "cover_days": 2,
    },
    {
        "key": "furrow-alternate",
        "name": "Gated pipe, every other furrow",
        "kind": "furrow",
        "efficiency": 0.68,
        "rate_mm_h": 6.0,
        "wetting": "furrow_alternate",
        "least_mm": 35,
        "most_mm": 90,
        "interval_days": 3,
        "cover_days": 2,
    },
    {
        "key": "border-canal",
        "name": "Borders from the canal",
        "kind": "border",
        "efficiency": 0.70,
        "rate_mm_h": 26,
        "wetting": "border",
        "least_mm": 60,
        "most_mm": 140,
        "interval_days": 5,
        "cover_days": 2,
    },
    {
        "key": "drip-beds",
        "name": "Drip tape on beds",
        "kind": "drip",
        "efficiency": 0.90,
        "rate_mm_h": 1.6,
        "wetting": "trickle",
        "wetted_fraction": 0.4,
        "under_canopy": True,
        "root_wetted_fraction": 0.65,
        "least_mm": 3,
        "most_mm": 26,
        "hours_per_day": 20,
    },
    {
        "key": "drip-vines",
        "name": "Drip line, one a row",
        "kind": "drip",
        "efficiency": 0.92,
        "rate_mm_h": 0.9,
        "wetting": "trickle",
        "wetted_fraction": 0.3,
        "under_canopy": True,
        "root_wetted_fraction": 0.55,
        "least_mm": 4,
        "most_mm": 26,
    },
    {
        "key": "micro-orchard",
        "name": "Micro-sprinklers under trees",
        "kind": "micro-sprinkler",
        "efficiency": 0.86,
        "rate_mm_h": 2.8,
        "wetted_fraction": 0.7,
        "root_wetted_fraction": 0.75,
        "least_mm": 10,
        "most_mm": 56,
        "cover_days": 1,
    },
]


def letters_to(
    name: str, address: str, language: str, units: str, weekday: str, hour: int
) -> dict[str, Any]:
    """A recipient of a farm's letters."""
    return {
        "name": name,
        "address": f"{address}@example.org",
        "language": language,
        "units": units,
        "weekday": weekday,
        "hour": hour,
    }


ZONE = {"time_zone": "America/Denver", "advisor": "Dessa Arden"}
FARMS: list[dict[str, Any]] = [
    {
        "key": "hollin",
        "name": "Hollin Farm",
        "grower": "Ada Brennick",
        **ZONE,
        "recipients": [
            letters_to("Ada Brennick", "ada.brennick", "en", "us", "monday", 18),
            letters_to("Lázaro Fontenal", "lazaro.fontenal", "es", "metric", "monday", 18),
        ],
    },
    {
        "key": "tern-creek",
        "name": "Tern Creek",
        "grower": "Jory Maddick",
        **ZONE,
        "letters": "automatic",
        "recipients": [letters_to("Jory Maddick", "jory.maddick", "en", "metric", "tuesday", 5)],
    },
    {
        "key": "quarry-flat",
        "name": "Quarry Flat",
        "grower": "Elisa Torvane",
        **ZONE,
        "recipients": [letters_to("Elisa Torvane", "elisa.torvane", "en", "us", "sunday", 18)],
    },
    {
        "key": "lower-lane",
        "name": "Lower Lane",
        "grower": "Ramón Quillera",
        **ZONE,
        "recipients": [letters_to("Ramón Quillera", "ramon.quillera", "es", "us", "tuesday", 6)],
    },
    {
        "key": "orchard-road",
        "name": "Orchard Road",
        "grower": "Teodora Vasken",
        **ZONE,
        "recipients": [
            letters_to("Teodora Vasken", "teodora.vasken", "en", "metric", "sunday", 18)
        ],
    },
    {
        "key": "low-meadow",
        "name": "Low Meadow Dairy",
        "grower": "Pell Hasselby",
        **ZONE,
        "letters": "automatic",
        "recipients": [letters_to("Pell Hasselby", "pell.hasselby", "en", "us", "tuesday", 18)],
    },
]

# field capacity, wilting point, readily evaporable water (FAO-56 Table 19, middle of the ranges)
TEXTURES: dict[str, tuple[float, float, float]] = {
    "sand": (0.12, 0.045, 4.5),
    "loamy_sand": (0.15, 0.065, 6.0),
    "sandy_loam": (0.23, 0.11, 8.0),
    "loam": (0.25, 0.12, 9.0),
    "silt_loam": (0.29, 0.15, 9.5),
    "silty_clay_loam": (0.335, 0.205, 9.5),
    "clay": (0.36, 0.22, 10.0),
}

# wetted part of the ground (FAO-56 Table 20)
WETTING = {
    "sprinkler": 1.0,
    "border": 1.0,
    "furrow_every_wide_bed": 0.5,
    "furrow_alternate": 0.4,
    "trickle": 0.35,
}

# short by a third of what its fields use in July
SUPPLIES: list[dict[str, Any]] = [
    {
        "key": "creek-ditch",
        "name": "Creek ditch",
        "flow_m3_h": 1000,
        "flows": [{"since": "2026-07-01", "flow_m3_h": 850}],
        "conveyance_loss": 0.08,
        "tariff": [
            {"name": "night lift", "hours": 9, "price_m3": 0.03},
            {"name": "day lift", "hours": 10, "price_m3": 0.07},
        ],
        "turn": {"first": "2026-04-01", "every_days": 7, "for_days": 2},
        "sets_a_day": 5,
        "fields": [
            "mill-bottom",
            "weir-ground",
            "heron-strip",
            "gravel-pit-piece",
            "creek-bend",
            "sand-strip",
            "lane-end",
        ],
    }
]
