"""The fields of the invented valley, what grew on them, who waters them and what went wrong."""

from typing import Any, NamedTuple

# farm: station of its fields, and how its grower waters: the part of the limit waited for, the part
# of the depletion refilled, days lost between deciding and watering
GROWERS: dict[str, dict[str, Any]] = {
    "hollin": {"station": "tarrow-north", "wait": 0.85, "refill": 0.95, "delay": 0},
    "tern-creek": {"station": "tarrow-north", "wait": 0.70, "refill": 1.08, "delay": 0},
    "quarry-flat": {"station": "ferrin-bench", "wait": 1.0, "refill": 0.95, "delay": 1},
    "lower-lane": {"station": "sand-lane", "wait": 0.90, "refill": 1.0, "delay": 1},
    "orchard-road": {"station": "ferrin-bench", "wait": 0.80, "refill": 0.90, "delay": 0},
    "low-meadow": {"station": "tarrow-north", "wait": 0.75, "refill": 1.15, "delay": 0},
}

# name, ha, soil, system, how water is entered, crops of 2025 and 2026, standing aimed at
TABLE = """
# hollin
Long Piece      | 52.6 |pivot-sandy-loam|pivot-low       |gross |beet        |maize      |late
Far Piece       | 48.3 |pivot-sandy-loam|pivot-low       |gross |maize       |potato     |due
Home Pivot      | 36.8 |valley-loam     |pivot-low       |hours |spring-wheat|maize      |easy
Railway Pivot   | 57.9 |valley-loam     |pivot-high      |hours |potato      |wheat      |easy
East Drip       |  8.4 |river-silt      |drip-beds       |volume|tomato      |tomato     |due
West Drip       |  9.1 |river-silt      |drip-beds       |volume|onion       |tomato     |soon
Kiln Field      | 21.7 |valley-loam     |wheel-line      |hours |maize       |bean       |soon
# tern-creek
Mill Bottom     | 11.2 |river-silt      |solid-set       |hours |potato      |onion      |late
Home Field      | 24.0 |valley-loam     |wheel-line      |hours |beet        |wheat      |easy
Weir Ground     | 16.3 |river-silt      |solid-set       |hours |onion       |potato     |due
Heron Strip     |  6.8 |river-silt      |solid-set       |net   |spring-wheat|onion      |due
Sluice Field    | 19.5 |valley-loam     |furrow-siphon   |volume|maize       |beet       |easy
Gravel Pit Piece|  9.4 |quarry-gravel   |hand-move       |hours |bean        |sweet-corn |soon
Creek Bend      | 13.7 |river-silt      |hand-move       |hours |alfalfa     |alfalfa    |easy
# quarry-flat
Quarry Flat 1   | 30.4 |quarry-gravel   |wheel-line      |hours |alfalfa     |alfalfa    |late
Quarry Flat 2   | 28.9 |bench-silt      |wheel-line      |hours |alfalfa     |alfalfa    |easy
Stone Barn      | 41.5 |bench-silt      |pivot-high      |gross |spring-wheat|potato     |soon
Upper Bench     | 44.2 |bench-silt      |pivot-high      |gross |potato      |wheat      |easy
Windbreak       | 18.6 |bench-silt      |furrow-alternate|volume|maize       |bean       |soon
Cutting Ground  | 15.2 |quarry-gravel   |wheel-line      |net   |barley      |maize      |due
Long Terrace    | 22.3 |bench-silt      |furrow-siphon   |volume|bean        |beet       |easy
# lower-lane
Back Forty      | 16.2 |slough-clay     |furrow-siphon   |volume|wheat       |beet       |soon
Sand Strip      |  7.6 |lane-sand       |hand-move       |hours |bean        |maize      |soon
Cottonwood      | 12.9 |river-silt      |furrow-siphon   |gross |maize       |beet       |easy
Levee Field     | 20.1 |pivot-sandy-loam|wheel-line      |hours |alfalfa     |alfalfa    |easy
Dry Slough      | 25.8 |slough-clay     |furrow-alternate|volume|beet        |bean       |soon
Lane End        |  5.5 |lane-sand       |solid-set       |hours |onion       |onion      |due
Old Yard        |  3.4 |river-silt      |drip-beds       |hours |tomato      |onion      |due
# orchard-road
North Rows      | 14.6 |orchard-loam    |micro-orchard   |hours |apple       |apple      |soon
South Rows      | 12.1 |orchard-loam    |micro-orchard   |hours |apple       |apple      |easy
Young Block     |  6.3 |orchard-loam    |drip-vines      |volume|young-apple |young-apple|easy
Vine Terrace    |  9.8 |terrace-stony   |drip-vines      |hours |grapes      |grapes     |easy
Hill Vines      |  7.2 |terrace-stony   |drip-vines      |hours |grapes      |grapes     |easy
Peach Corner    |  4.1 |orchard-loam    |micro-orchard   |volume|peach       |peach      |soon
# low-meadow
Low Meadow      | 26.4 |meadow-clay-loam|border-canal    |gross |pasture     |pasture    |wet
Calf Pasture    |  8.8 |meadow-clay-loam|border-canal    |gross |pasture     |pasture    |wet
Long Alfalfa    | 33.7 |meadow-clay-loam|border-canal    |volume|alfalfa     |alfalfa    |easy
Bridge Alfalfa  | 19.9 |slough-clay     |border-canal    |volume|alfalfa     |alfalfa    |late
Silage Flat     | 38.5 |valley-loam     |pivot-low       |gross |silage      |silage     |easy
Parlour Field   | 17.4 |meadow-clay-loam|furrow-siphon   |gross |barley      |silage     |easy
"""


class FieldRow(NamedTuple):
    """A line of the table."""

    farm: str
    key: str
    name: str
    area: float
    soil: str
    system: str
    entered: str
    crop_2025: str
    crop_2026: str
    aim: str


def field_rows() -> list[FieldRow]:
    """The table read."""
    rows, farm = [], ""
    for line in TABLE.strip().splitlines():
        if line.startswith("#"):
            farm = line[1:].strip()
            continue
        name, area, *rest = (cell.strip() for cell in line.split("|"))
        rows.append(FieldRow(farm, name.lower().replace(" ", "-"), name, float(area), *rest))
    return rows


SOURCES: dict[str, list[dict[str, Any]]] = {
    "quarry-flat-1": [{"variable": "energy", "station": "tarrow-north"}],
    "quarry-flat-2": [{"variable": "energy", "station": "tarrow-north"}],
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
        {
            "key": "home-pivot-sandy",
            "name": "Sandy side",
            "area_ha": 9.6,
            "soil": "pivot-sandy-loam",
        },
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
        ("2025-05-30", "2025-06-04", "first cutting"),
        ("2025-07-05", "2025-07-10", "second cutting"),
        ("2025-08-12", "2025-08-17", "third cutting"),
        ("2026-05-28", "2026-06-02", "first cutting"),
        ("2026-07-02", "2026-07-06", "second cutting"),
        ("2026-08-10", "2026-08-15", "third cutting"),
    ],
    "far-piece": [("2026-07-16", "2026-07-17", "blight spray")],
    "weir-ground": [
        ("2025-07-08", "2025-07-09", "thrips spray"),
        ("2026-07-15", "2026-07-15", "blight spray"),
    ],
    "north-rows": [
        ("2026-06-22", "2026-06-24", "thinning crew"),
        ("2026-07-18", "2026-07-20", "thinning crew"),
    ],
    "peach-corner": [("2026-07-20", "2026-07-27", "picking")],
}

# no water on these days: a pivot broken, a pump out, a canal bank slipped
BROKEN: dict[str, list[tuple[str, str, str]]] = {
    "railway-pivot": [("2026-05-27", "2026-06-03", "gearbox broken")],
    "long-piece": [("2026-07-10", "2026-07-13", "pivot stopped, panel fault")],
    "quarry-flat-1": [
        ("2025-07-14", "2025-07-22", "mainline burst"),
        ("2026-07-07", "2026-07-13", "bales still on the field"),
    ],
    "bridge-alfalfa": [("2026-07-09", "2026-07-13", "canal bank slipped")],
}
