"""Do the parts of a book name only what exists, in the book, in the store or in the handbook?"""

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, field
from difflib import get_close_matches

from app.book.schema import Book


@dataclass(frozen=True)
class Known:
    """Keys already in the store, and identifiers of the handbook."""

    stations: frozenset[str] = frozenset()
    soils: frozenset[str] = frozenset()
    systems: frozenset[str] = frozenset()
    farms: frozenset[str] = frozenset()
    fields: dict[str, frozenset[str]] = field(default_factory=dict)
    """Field key to the keys of its blocks (empty where it is one whole)."""
    crops: frozenset[str] = frozenset()
    textures: frozenset[str] = frozenset()
    wettings: frozenset[str] = frozenset()


def reference_problems(book: Book, known: Known) -> list[str]:
    """One line for each name that leads nowhere or stands twice."""
    lines: list[str] = []

    def twice(kind: str, keys: Iterable[object]) -> None:
        for key, count in Counter(keys).items():
            if count > 1:
                lines.append(f"{kind} {_shown(key)}: stands {count} times; keep one")

    def leads(place: str, kind: str, key: str, there: Iterable[str]) -> None:
        if key not in (names := set(there)):
            close = get_close_matches(key, names, n=3)
            within = sorted(name for name in names if key in name and name not in close)
            near = ", ".join([*close, *within][:5])
            hint = f"; near: {near}" if near else ""
            lines.append(f"{place}: no {kind} {key!r}{hint}")

    stations = known.stations | {part.key for part in book.stations}
    soils = known.soils | {part.key for part in book.soils}
    systems = known.systems | {part.key for part in book.systems}
    farms = known.farms | {part.key for part in book.farms}
    fields = dict(known.fields)
    fields.update({part.key: frozenset(b.key for b in part.blocks) for part in book.fields})

    twice("stations", (part.key for part in book.stations))
    twice("soils", (part.key for part in book.soils))
    twice("systems", (part.key for part in book.systems))
    twice("farms", (part.key for part in book.farms))
    twice("fields", (part.key for part in book.fields))
    twice("supplies", (part.key for part in book.supplies))
    twice("hangs on a supply, field", (key for part in book.supplies for key in part.fields))
    twice("seasons", ((part.field, part.block, part.planting) for part in book.seasons))

    for station in book.stations:
        if station.teacher is not None:
            leads(f"stations {station.key}, teacher", "station", station.teacher, stations)
        if station.stands_in is not None:
            leads(f"stations {station.key}, stands_in", "field", station.stands_in, fields)
    for soil in book.soils:
        for number, layer in enumerate(soil.layers, 1):
            if layer.texture is not None:
                place = f"soils {soil.key}, layer {number}, texture"
                leads(place, "texture in the handbook", layer.texture, known.textures)
    for system in book.systems:
        place = f"systems {system.key}, wetting"
        leads(place, "wetting method in the handbook", system.wetting, known.wettings)
    for part in book.fields:
        here = f"fields {part.key}"
        leads(f"{here}, farm", "farm", part.farm, farms)
        leads(f"{here}, station", "station", part.station, stations)
        leads(f"{here}, soil", "soil", part.soil, soils)
        leads(f"{here}, system", "system", part.system, systems)
        twice(f"{here}, blocks", (block.key for block in part.blocks))
        twice(f"{here}, sources", ((s.variable, s.since) for s in part.sources))
        for source in part.sources:
            leads(f"{here}, sources, {source.variable}", "station", source.station, stations)
        for block in part.blocks:
            if block.soil is not None:
                leads(f"{here}, block {block.key}, soil", "soil", block.soil, soils)
            if block.system is not None:
                leads(f"{here}, block {block.key}, system", "system", block.system, systems)
        if part.managed_by not in {"driest", "median"}:
            leads(f"{here}, managed_by", "block", part.managed_by, fields[part.key])
        area = sum(block.area_ha for block in part.blocks)
        if part.blocks and abs(area - part.area_ha) > 0.02 * part.area_ha:
            lines.append(
                f"{here}, blocks: their areas add to {area:g} ha, the field has {part.area_ha:g} ha"
            )

    for supply in book.supplies:
        for key in supply.fields:
            leads(f"supplies {supply.key}, fields", "field", key, fields)
        for allocation in supply.allocations:
            if allocation.farm is not None:
                leads(f"supplies {supply.key}, allocations", "farm", allocation.farm, farms)

    def on_field(place: str, field_key: str, block: str | None) -> None:
        leads(f"{place}, field", "field", field_key, fields)
        if block is not None and field_key in fields:
            leads(f"{place}, block", "block", block, fields[field_key])

    for number, season in enumerate(book.seasons, 1):
        place = f"seasons {number} ({season.field})"
        on_field(place, season.field, season.block)
        if season.own_crop is None:
            leads(f"{place}, crop", "crop in the handbook", season.crop, known.crops)
    for number, irrigation in enumerate(book.irrigations, 1):
        on_field(f"irrigations {number} ({irrigation.field})", irrigation.field, irrigation.block)
    for number, rain in enumerate(book.rain, 1):
        on_field(f"rain {number} ({rain.field})", rain.field, None)
    return lines


def _shown(key: object) -> str:
    parts = key if isinstance(key, tuple) else (key,)
    return ", ".join(str(part) for part in parts if part is not None)
