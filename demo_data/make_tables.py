"""Who farms what in the invented valley: soils, systems, farms, fields, crops. Numbers are typical."""

from typing import Any

STATIONS: list[dict[str, Any]] = [
    {"key": "tarrow-north", "name": "Tarrow North", "latitude_deg": 43.712, "longitude_deg": -108.412,
     "elevation_m": 742, "utc_offset_h": -7, "wind_height_m": 2, "reference_surface": True},
    {"key": "ferrin-bench", "name": "Ferrin Bench", "latitude_deg": 43.668, "longitude_deg": -108.551,
     "elevation_m": 868, "utc_offset_h": -7, "wind_height_m": 10},
    {"key": "sand-lane", "name": "Sand Lane", "latitude_deg": 43.781, "longitude_deg": -108.298,
     "elevation_m": 701, "utc_offset_h": -7},
]


def lab(bottom: float, fc: float, wp: float, sat: float) -> dict[str, float]:
    return {"bottom_m": bottom, "field_capacity": fc, "wilting_point": wp, "saturation": sat}


def texture(bottom: float, name: str) -> dict[str, Any]:
    return {"bottom_m": bottom, "texture": name}


SOILS: list[dict[str, Any]] = [
    {"key": "valley-loam", "name": "Valley loam", "layers": [texture(2.0, "loam")]},
    {"key": "river-silt", "name": "River silt loam over sandy loam",
     "layers": [texture(0.9, "silt_loam"), texture(2.0, "sandy_loam")]},
    {"key": "pivot-sandy-loam", "name": "Sandy loam of the north pivots",
     "layers": [texture(2.0, "sandy_loam")]},
    {"key": "pivot-blowout", "name": "Sand blowout in the north pivots",
     "layers": [texture(0.4, "loamy_sand"), texture(2.0, "sand")]},
    {"key": "bench-silt", "name": "Bench silt loam (lab, 2024)", "rew_mm": 9, "curve_number": 78,
     "layers": [lab(0.3, 0.30, 0.13, 0.48), lab(0.8, 0.31, 0.145, 0.47), lab(2.0, 0.28, 0.13, 0.45)]},
    {"key": "quarry-gravel", "name": "Quarry loam on gravel (lab, 2023)", "rew_mm": 8,
     "layers": [lab(0.5, 0.245, 0.11, 0.44), lab(1.0, 0.15, 0.065, 0.38), lab(2.0, 0.10, 0.04, 0.34)]},
    {"key": "lane-sand", "name": "Lane loamy sand", "layers": [texture(2.0, "loamy_sand")]},
    {"key": "slough-clay", "name": "Slough silty clay loam over clay", "curve_number": 82,
     "drainage_days": 2, "layers": [texture(0.6, "silty_clay_loam"), texture(2.0, "clay")]},
    {"key": "meadow-clay-loam", "name": "Meadow clay loam (lab, 2025)", "rew_mm": 9,
     "drainage_days": 1, "layers": [lab(0.4, 0.36, 0.20, 0.50), lab(2.0, 0.37, 0.215, 0.49)]},
    {"key": "orchard-loam", "name": "Orchard loam over sandy loam",
     "layers": [texture(0.7, "loam"), texture(2.5, "sandy_loam")]},
    {"key": "terrace-stony", "name": "Stony terrace (lab, 2022)", "rew_mm": 7,
     "layers": [lab(0.6, 0.20, 0.09, 0.41), lab(2.0, 0.16, 0.075, 0.38)]},
]

SYSTEMS: list[dict[str, Any]] = [
    {"key": "pivot-low", "name": "Pivot, low spray", "kind": "centre pivot", "efficiency": 0.90,
     "rate_mm_h": 0.46, "least_mm": 8, "most_mm": 32, "cover_days": 2},
    {"key": "pivot-high", "name": "Pivot, impact heads and end gun", "kind": "centre pivot",
     "efficiency": 0.80, "rate_mm_h": 0.42, "least_mm": 10, "most_mm": 32, "cover_days": 2},
    {"key": "wheel-line", "name": "Wheel line, two sets a day", "kind": "side-roll sprinkler",
     "efficiency": 0.75, "rate_mm_h": 6.1, "least_mm": 30, "most_mm": 72, "interval_days": 6,
     "cover_days": 4, "hours_per_day": 23},
    {"key": "hand-move", "name": "Hand-move laterals", "kind": "hand-move sprinkler",
     "efficiency": 0.72, "rate_mm_h": 5.2, "least_mm": 25, "most_mm": 62, "interval_days": 4,
     "cover_days": 2, "hours_per_day": 22},
    {"key": "solid-set", "name": "Solid set", "kind": "solid-set sprinkler", "efficiency": 0.78,
     "rate_mm_h": 4.2, "least_mm": 8, "most_mm": 40},
    {"key": "furrow-siphon", "name": "Siphon tubes, every furrow", "kind": "furrow",
     "efficiency": 0.62, "rate_mm_h": 7.5, "wetting": "furrow_every_wide_bed", "least_mm": 50,
     "most_mm": 120, "interval_days": 6, "cover_days": 2},
    {"key": "furrow-alternate", "name": "Gated pipe, every other furrow", "kind": "furrow",
     "efficiency": 0.68, "rate_mm_h": 6.0, "wetting": "furrow_alternate", "least_mm": 35,
     "most_mm": 90, "interval_days": 5, "cover_days": 2},
    {"key": "border-canal", "name": "Borders from the canal", "kind": "border", "efficiency": 0.70,
     "rate_mm_h": 26, "wetting": "border", "least_mm": 60, "most_mm": 140, "interval_days": 7,
     "cover_days": 2},
    {"key": "drip-beds", "name": "Drip tape on beds", "kind": "drip", "efficiency": 0.90,
     "rate_mm_h": 1.6, "wetting": "trickle", "wetted_fraction": 0.4, "under_canopy": True,
     "root_wetted_fraction": 0.65, "least_mm": 3, "most_mm": 26, "hours_per_day": 20},
    {"key": "drip-vines", "name": "Drip line, one a row", "kind": "drip", "efficiency": 0.92,
     "rate_mm_h": 0.9, "wetting": "trickle", "wetted_fraction": 0.3, "under_canopy": True,
     "root_wetted_fraction": 0.4, "least_mm": 4, "most_mm": 26},
    {"key": "micro-orchard", "name": "Micro-sprinklers under trees", "kind": "micro-sprinkler",
     "efficiency": 0.86, "rate_mm_h": 2.8, "wetted_fraction": 0.7, "root_wetted_fraction": 0.75,
     "least_mm": 10, "most_mm": 56, "cover_days": 1},
]

FARMS: list[dict[str, Any]] = [
    {"key": "hollin", "name": "Hollin Farm", "grower": "Ada Brennick"},
    {"key": "tern-creek", "name": "Tern Creek", "grower": "Jory Maddick"},
    {"key": "quarry-flat", "name": "Quarry Flat", "grower": "Elisa Torvane"},
    {"key": "lower-lane", "name": "Lower Lane", "grower": "Ramón Quillera"},
    {"key": "orchard-road", "name": "Orchard Road", "grower": "Teodora Vasken"},
    {"key": "low-meadow", "name": "Low Meadow Dairy", "grower": "Pell Hasselby"},
]

# A crop as it is grown in the valley: month and day of planting (green-up for what stays), stages.
# "since" is the year before the one it is named for.
CROPS: dict[str, dict[str, Any]] = {
    "maize": {"crop": "maize_grain", "planting": "05-02", "stage_days": [30, 40, 50, 35],
              "root_depth_min_m": 0.2, "root_depth_max_m": 1.2, "mad": 0.5},
    "silage": {"crop": "maize_grain", "planting": "05-10", "stage_days": [25, 40, 45, 12],
               "root_depth_min_m": 0.2, "root_depth_max_m": 1.2, "kcb_end": 0.9,
               "note": "silage, cut green"},
    "sweet-corn": {"crop": "maize_sweet", "planting": "05-20", "stage_days": [20, 30, 25, 10],
                   "root_depth_min_m": 0.2, "root_depth_max_m": 0.9, "mad": 0.45},
    "wheat": {"crop": "wheat_winter_nonfrozen", "planting": "since-10-01",
              "stage_days": [40, 165, 60, 30], "root_depth_min_m": 0.3, "root_depth_max_m": 1.5,
              "mad": 0.6},
    "spring-wheat": {"crop": "wheat_spring", "planting": "03-29", "stage_days": [20, 30, 45, 25],
                     "root_depth_min_m": 0.2, "root_depth_max_m": 1.2},
    "barley": {"crop": "barley", "planting": "03-27", "stage_days": [20, 30, 45, 25],
               "root_depth_min_m": 0.2, "root_depth_max_m": 1.2},
    "alfalfa": {"crop": "alfalfa_hay_averaged", "planting": "03-30", "coefficients": "single",
                "stage_days": [10, 30, 145, 30], "root_depth_max_m": 1.6, "mad": 0.55},
    "potato": {"crop": "potato", "planting": "04-22", "stage_days": [30, 30, 55, 25],
               "root_depth_min_m": 0.2, "root_depth_max_m": 0.6, "mad": 0.35},
    "onion": {"crop": "onion_dry", "planting": "03-31", "stage_days": [30, 40, 60, 25],
              "root_depth_min_m": 0.15, "root_depth_max_m": 0.45, "mad": 0.3},
    "tomato": {"crop": "tomato", "planting": "05-18", "stage_days": [25, 35, 45, 25],
               "root_depth_min_m": 0.25, "root_depth_max_m": 1.0, "note": "transplants"},
    "beet": {"crop": "sugarbeet", "planting": "04-08", "stage_days": [40, 45, 70, 30],
             "root_depth_min_m": 0.2, "root_depth_max_m": 1.1},
    "bean": {"crop": "beans_dry", "planting": "05-30", "stage_days": [20, 30, 35, 20],
             "root_depth_min_m": 0.2, "root_depth_max_m": 0.8},
    "apple": {"crop": "apple_cherry_pear_cover_frost", "planting": "04-08",
              "stage_days": [25, 50, 95, 35], "root_depth_max_m": 1.2},
    "young-apple": {"crop": "apple_cherry_pear_bare_frost", "planting": "04-08",
                    "stage_days": [25, 50, 95, 35], "root_depth_max_m": 0.8, "height_m": 2.2,
                    "kcb_ini": 0.2, "kcb_mid": 0.55, "kcb_end": 0.4, "note": "third leaf"},
    "grapes": {"crop": "grapes_wine", "planting": "04-24", "stage_days": [25, 50, 60, 40],
               "root_depth_max_m": 1.3, "mad": 0.5},
    "peach": {"crop": "stone_fruit_bare_frost", "planting": "04-02", "stage_days": [25, 55, 75, 45],
              "root_depth_max_m": 1.2},
    "pasture": {"crop": "pasture_rotated", "planting": "03-26", "coefficients": "single",
                "stage_days": [10, 25, 160, 30], "root_depth_max_m": 0.9},
}

# key, name, ha, soil, system, how water is entered, 2025, 2026, where it stands on the demo's morning
HOLLIN = [
    ("long-piece", "Long Piece", 52.6, "pivot-sandy-loam", "pivot-low", "gross", "beet", "maize", "late"),
    ("far-piece", "Far Piece", 48.3, "pivot-sandy-loam", "pivot-low", "gross", "maize", "potato", "due"),
    ("home-pivot", "Home Pivot", 36.8, "valley-loam", "pivot-low", "hours", "spring-wheat", "maize", "easy"),
    ("railway-pivot", "Railway Pivot", 57.9, "valley-loam", "pivot-high", "hours", "potato", "wheat", "done"),
    ("east-drip", "East Drip", 8.4, "river-silt", "drip-beds", "volume", "tomato", "tomato", "due"),
    ("west-drip", "West Drip", 9.1, "river-silt", "drip-beds", "volume", "onion", "tomato", "easy"),
    ("kiln-field", "Kiln Field", 21.7, "valley-loam", "wheel-line", "hours", "maize", "bean", "easy"),
]
TERN_CREEK = [
    ("mill-bottom", "Mill Bottom", 11.2, "river-silt", "solid-set", "hours", "potato", "onion", "late"),
    ("home-field", "Home Field", 24.0, "valley-loam", "wheel-line", "hours", "beet", "wheat", "done"),
    ("weir-ground", "Weir Ground", 16.3, "river-silt", "solid-set", "hours", "onion", "potato", "soon"),
    ("heron-strip", "Heron Strip", 6.8, "river-silt", "solid-set", "net", "spring-wheat", "onion", "due"),
    ("sluice-field", "Sluice Field", 19.5, "valley-loam", "furrow-siphon", "volume", "maize", "beet", "soon"),
    ("gravel-pit", "Gravel Pit Piece", 9.4, "quarry-gravel", "hand-move", "hours", "bean", "sweet-corn", "due"),
    ("creek-bend", "Creek Bend", 13.7, "river-silt", "hand-move", "hours", "alfalfa", "alfalfa", "easy"),
]
QUARRY_FLAT = [
    ("quarry-1", "Quarry Flat 1", 30.4, "quarry-gravel", "wheel-line", "hours", "alfalfa", "alfalfa", "late"),
    ("quarry-2", "Quarry Flat 2", 28.9, "bench-silt", "wheel-line", "hours", "alfalfa", "alfalfa", "soon"),
    ("stone-barn", "Stone Barn", 41.5, "bench-silt", "pivot-high", "gross", "spring-wheat", "potato", "easy"),
    ("upper-bench", "Upper Bench", 44.2, "bench-silt", "pivot-high", "gross", "potato", "wheat", "done"),
    ("windbreak", "Windbreak", 18.6, "bench-silt", "furrow-alternate", "volume", "maize", "bean", "soon"),
    ("cutting-ground", "Cutting Ground", 15.2, "quarry-gravel", "wheel-line", "net", "barley", "maize", "due"),
    ("long-terrace", "Long Terrace", 22.3, "bench-silt", "furrow-siphon", "volume", "bean", "beet", "easy"),
]
LOWER_LANE = [
    ("back-forty", "Back Forty", 16.2, "slough-clay", "furrow-siphon", "volume", "wheat", "beet", "soon"),
    ("sand-strip", "Sand Strip", 7.6, "lane-sand", "hand-move", "hours", "bean", "maize", "due"),
    ("cottonwood", "Cottonwood", 12.9, "river-silt", "furrow-siphon", "gross", "maize", "beet", "easy"),
    ("levee-field", "Levee Field", 20.1, "pivot-sandy-loam", "wheel-line", "hours", "alfalfa", "alfalfa", "easy"),
    ("dry-slough", "Dry Slough", 25.8, "slough-clay", "furrow-alternate", "volume", "beet", "bean", "easy"),
    ("lane-end", "Lane End", 5.5, "lane-sand", "solid-set", "hours", "onion", "onion", "soon"),
    ("old-yard", "Old Yard", 3.4, "river-silt", "drip-beds", "hours", "tomato", "onion", "easy"),
]
ORCHARD_ROAD = [
    ("north-rows", "North Rows", 14.6, "orchard-loam", "micro-orchard", "hours", "apple", "apple", "soon"),
    ("south-rows", "South Rows", 12.1, "orchard-loam", "micro-orchard", "hours", "apple", "apple", "easy"),
    ("young-block", "Young Block", 6.3, "orchard-loam", "micro-orchard", "volume", "young-apple", "young-apple", "easy"),
    ("vine-terrace", "Vine Terrace", 9.8, "terrace-stony", "drip-vines", "hours", "grapes", "grapes", "easy"),
    ("hill-vines", "Hill Vines", 7.2, "terrace-stony", "drip-vines", "hours", "grapes", "grapes", "soon"),
    ("peach-corner", "Peach Corner", 4.1, "orchard-loam", "micro-orchard", "volume", "peach", "peach", "due"),
]
LOW_MEADOW = [
    ("low-meadow", "Low Meadow", 26.4, "meadow-clay-loam", "border-canal", "gross", "pasture", "pasture", "wet"),
    ("calf-pasture", "Calf Pasture", 8.8, "meadow-clay-loam", "border-canal", "gross", "pasture", "pasture", "wet"),
    ("long-alfalfa", "Long Alfalfa", 33.7, "meadow-clay-loam", "border-canal", "volume", "alfalfa", "alfalfa", "easy"),
    ("bridge-alfalfa", "Bridge Alfalfa", 19.9, "slough-clay", "border-canal", "volume", "alfalfa", "alfalfa", "late"),
    ("silage-flat", "Silage Flat", 38.5, "valley-loam", "pivot-low", "gross", "silage", "silage", "soon"),
    ("parlour-field", "Parlour Field", 17.4, "meadow-clay-loam", "furrow-siphon", "gross", "barley", "silage", "easy"),
]

# farm: station of its fields, how its grower waters (part of the limit waited for, of the depletion
# refilled, days lost between deciding and watering), its fields
GROWERS: dict[str, dict[str, Any]] = {
    "hollin": {"station": "tarrow-north", "wait": 0.85, "refill": 0.95, "delay": 0, "fields": HOLLIN},
    "tern-creek": {"station": "tarrow-north", "wait": 0.70, "refill": 1.08, "delay": 0, "fields": TERN_CREEK},
    "quarry-flat": {"station": "ferrin-bench", "wait": 1.0, "refill": 0.95, "delay": 1, "fields": QUARRY_FLAT},
    "lower-lane": {"station": "sand-lane", "wait": 0.90, "refill": 1.0, "delay": 1, "fields": LOWER_LANE},
    "orchard-road": {"station": "ferrin-bench", "wait": 0.80, "refill": 0.90, "delay": 0, "fields": ORCHARD_ROAD},
    "low-meadow": {"station": "tarrow-north", "wait": 0.75, "refill": 1.15, "delay": 0, "fields": LOW_MEADOW},
}

SOURCES: dict[str, list[dict[str, Any]]] = {
    "quarry-1": [{"variable": "energy", "station": "tarrow-north"}],
    "quarry-2": [{"variable": "energy", "station": "tarrow-north"}],
    "cutting-ground": [{"variable": "energy", "station": "tarrow-north", "since": "2026-01-01"}],
    "north-rows": [{"variable": "energy", "station": "tarrow-north"}],
    "south-rows": [{"variable": "energy", "station": "tarrow-north"}],
    "creek-bend": [{"variable": "rain", "station": "sand-lane"}],
    "back-forty": [{"variable": "wind", "station": "tarrow-north"}],
    "low-meadow": [{"variable": "rain", "station": "ferrin-bench"}],
    "silage-flat": [{"variable": "rain", "station": "ferrin-bench"}],
}

BLOCKS: dict[str, list[dict[str, Any]]] = {
    "home-pivot": [
        {"key": "home-pivot-loam", "name": "Loam side", "area_ha": 22.4},
        {"key": "home-pivot-sandy", "name": "Sandy side", "area_ha": 9.6, "soil": "pivot-sandy-loam"},
        {"key": "home-pivot-blowout", "name": "Blowout", "area_ha": 4.8, "soil": "pivot-blowout"},
    ],
    "vine-terrace": [
        {"key": "vine-terrace-upper", "name": "Upper rows", "area_ha": 5.3},
        {"key": "vine-terrace-lower", "name": "Lower rows", "area_ha": 4.5, "soil": "orchard-loam"},
    ],
}
MANAGED_BY = {"home-pivot": "home-pivot-sandy", "vine-terrace": "driest"}

KEEP_OFFS: dict[str, list[tuple[str, str, str]]] = {
    "alfalfa": [
        ("2025-05-30", "2025-06-04", "first cutting"), ("2025-07-05", "2025-07-10", "second cutting"),
        ("2025-08-12", "2025-08-17", "third cutting"), ("2026-05-28", "2026-06-02", "first cutting"),
        ("2026-07-02", "2026-07-06", "second cutting"), ("2026-08-10", "2026-08-15", "third cutting"),
    ],
    "far-piece": [("2026-07-16", "2026-07-17", "blight spray")],
    "weir-ground": [("2025-07-08", "2025-07-09", "thrips spray"), ("2026-07-15", "2026-07-15", "blight spray")],
    "north-rows": [("2026-06-22", "2026-06-24", "thinning crew"), ("2026-07-18", "2026-07-20", "thinning crew")],
    "peach-corner": [("2026-07-20", "2026-07-27", "picking")],
}

# no water on these days: a pivot broken, a pump out, a canal bank slipped
BROKEN: dict[str, list[tuple[str, str, str]]] = {
    "railway-pivot": [("2026-05-27", "2026-06-03", "gearbox broken")],
    "quarry-1": [("2025-07-14", "2025-07-22", "mainline burst")],
    "long-piece": [("2026-07-11", "2026-07-13", "pivot stopped, panel fault")],
    "bridge-alfalfa": [("2026-07-07", "2026-07-13", "canal bank slipped")],
}
