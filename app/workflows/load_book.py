"""Load a book: check it whole, then put in what is new and change what differs."""

from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import UTC, date, datetime, timedelta
from functools import partial
from typing import Any

from sqlalchemy import select
from sqlalchemy.orm import Session

from app import handbook
from app.book.parts import Part
from app.book.references import Known, reference_problems
from app.book.schema import (
    WEEKDAYS,
    Book,
    BookError,
    FarmPart,
    FieldPart,
    IrrigationPart,
    RainPart,
)
from app.book.season import SeasonPart
from app.storage import book as rows
from app.storage.events import VOID, events_by_origin, head_of
from app.storage.recipients import put_recipient
from app.storage.tables import (
    WHOLE,
    Block,
    Event,
    Farm,
    Field,
    IrrigationSystem,
    Season,
    Soil,
    Source,
    Station,
)
from app.workflows import agronomy
from app.workflows.crop import crop_season
from app.workflows.put_supply import put_supply

VARIABLES = ("energy", "temperature", "wind", "rain")
MOVED = timedelta(days=30)
"""A crop is not planted twice on a block within this time; its date has been corrected."""
ORIGIN = "book:"
"""What the origin of an event begins with that a book brought."""


@dataclass
class Loaded:
    """How many parts were added, changed, and found the same, by kind."""

    added: dict[str, int] = field(default_factory=dict)
    changed: dict[str, int] = field(default_factory=dict)
    same: int = 0

    def count(self, kind: str, outcome: str) -> None:
        """One more part of a kind: outcome is added, changed or same."""
        if outcome == "same":
            self.same += 1
        else:
            tally = self.added if outcome == "added" else self.changed
            tally[kind] = tally.get(kind, 0) + 1


def load_book(session: Session, book: Book, who: str) -> Loaded:
    """Put a book into the store; raises BookError, and changes nothing, if a name leads nowhere."""
    problems = reference_problems(book, _known(session)) or _science_problems(book)
    if problems:
        raise BookError(problems)
    loaded = Loaded()
    _stations(session, book, who, loaded)
    _shared(session, Soil, book.soils, who, loaded, rows.soil_blocks)
    _shared(session, IrrigationSystem, book.systems, who, loaded, rows.system_blocks)
    for farm in book.farms:
        _farm(session, farm, who, loaded)
    keys = _Keys(session)
    for part in book.fields:
        _field(session, part, keys, who, loaded)
    session.flush()
    for supply in book.supplies:
        loaded.count("supplies", put_supply(session, supply, who))
    blocks = _blocks(session)
    plantings = {(season.field, season.planting) for season in book.seasons}
    for season in book.seasons:
        _season(session, season, blocks, plantings, who, loaded)
    _events(session, book, blocks, who, loaded)
    return loaded


def _science_problems(book: Book) -> list[str]:
    """What science would refuse: a profile, a system, a season that makes no sense as a whole."""
    trials: list[tuple[str, Callable[[], object]]] = [
        *((f"stations {p.key}", partial(agronomy.site, _plain(p))) for p in book.stations),
        *((f"stations {p.key}", partial(agronomy.net_wind, _plain(p))) for p in book.stations),
        *((f"soils {p.key}", partial(agronomy.profile, _plain(p))) for p in book.soils),
        *(
            (f"systems {p.key}", partial(agronomy.application_system, _plain(p)))
            for p in book.systems
        ),
        *(
            (f"seasons {n} ({p.field})", partial(crop_season, _plain(p), p.planting))
            for n, p in enumerate(book.seasons, 1)
        ),
    ]
    lines = []
    for place, trial in trials:
        try:
            trial()
        except (ValueError, handbook.NotPublishedError) as error:
            lines.append(f"{place}: {error}")
    return lines


def _plain(part: Part) -> dict[str, Any]:
    return part.model_dump(mode="json")


def _known(session: Session) -> Known:
    fields: dict[str, set[str]] = {}
    for field_key, block_key in session.execute(select(Field.key, Block.key).join(Field.blocks)):
        fields.setdefault(field_key, set())
        if block_key != WHOLE:
            fields[field_key].add(block_key)
    return Known(
        stations=frozenset(rows.keys_of(session, Station)),
        soils=frozenset(rows.keys_of(session, Soil)),
        systems=frozenset(rows.keys_of(session, IrrigationSystem)),
        farms=frozenset(rows.keys_of(session, Farm)),
        fields={key: frozenset(blocks) for key, blocks in fields.items()},
        crops=frozenset(handbook.crops()),
        textures=frozenset(handbook.soil_textures()),
        wettings=frozenset(handbook.wettings()),
    )


def _stations(session: Session, book: Book, who: str, loaded: Loaded) -> None:
    for part in book.stations:
        row, outcome = _put(session, Station, part, who)
        loaded.count("stations", outcome)
        if outcome == "changed":
            since = rows.first_contribution(session, row.id)
            if since is not None:
                rows.dirty_station(session, row.id, since)


def _shared(
    session: Session,
    table: type[Soil] | type[IrrigationSystem],
    parts: list[Any],
    who: str,
    loaded: Loaded,
    blocks_of: Callable[[Session, int], list[int]],
) -> None:
    for part in parts:
        row, outcome = _put(session, table, part, who)
        loaded.count(table.__tablename__, outcome)
        if outcome == "changed":
            rows.dirty_blocks(session, blocks_of(session, row.id), rows.BEGINNING)


def _farm(session: Session, part: FarmPart, who: str, loaded: Loaded) -> None:
    """Put a farm in, and of its recipients those that the book changed since it was last loaded:
    what was changed on a page since then stays."""
    there = rows.find(session, Farm, part.key)
    said = [] if there is None else there.details.get("recipients", [])
    row, outcome = _put(session, Farm, part, who)
    loaded.count("farm", outcome)
    for recipient in part.recipients:
        plain = _plain(recipient)
        if plain not in said:
            weekday = WEEKDAYS.index(recipient.weekday)
            put_recipient(session, row.id, {**plain, "weekday": weekday}, who)


def _put(session: Session, table: type[rows.Keyed], part: Any, who: str) -> tuple[rows.Keyed, str]:
    details = _plain(part)
    row = rows.find(session, table, part.key)
    if row is not None and row.details == details:
        return row, "same"
    before = None if row is None else row.details
    if row is None:
        row = table(key=part.key, name=part.name, details=details)
        session.add(row)
    else:
        row.name, row.details = part.name, details
    session.flush()
    rows.note_change(session, who, table.__tablename__, part.key, before, details)
    return row, "added" if before is None else "changed"


class _Keys:
    """Key to number of what a field names."""

    def __init__(self, session: Session) -> None:
        self.farms = rows.keys_of(session, Farm)
        self.soils = rows.keys_of(session, Soil)
        self.systems = rows.keys_of(session, IrrigationSystem)
        self.stations = rows.keys_of(session, Station)


def _field(session: Session, part: FieldPart, keys: _Keys, who: str, loaded: Loaded) -> None:
    details = _plain(part)
    row = rows.find(session, Field, part.key)
    if row is not None and row.details == details:
        loaded.count("fields", "same")
        return
    before = None if row is None else row.details
    row = row or Field(key=part.key)
    row.name, row.details, row.area_ha = part.name, details, part.area_ha
    row.managed_by, row.farm_id = part.managed_by, keys.farms[part.farm]
    session.add(row)
    session.flush()
    _put_blocks(session, row, part, keys)
    _put_sources(session, row, part, keys)
    rows.note_change(session, who, "field", part.key, before, details)
    rows.dirty_blocks(session, [block.id for block in row.blocks], rows.BEGINNING)
    loaded.count("fields", "added" if before is None else "changed")


def _put_blocks(session: Session, row: Field, part: FieldPart, keys: _Keys) -> None:
    there = {block.key: block for block in row.blocks}
    wanted = [
        (b.key, b.name, b.area_ha, b.soil or part.soil, b.system or part.system)
        for b in part.blocks
    ] or [(WHOLE, part.name, part.area_ha, part.soil, part.system)]
    gone = sorted(set(there) - {key for key, *_ in wanted})
    if gone:
        raise BookError(
            [
                f"fields {part.key}, blocks: {', '.join(gone)} would vanish with its ledger;"
                " keep it, or give the field with the new blocks another key"
            ]
        )
    for key, name, area, soil, system in wanted:
        block = there.get(key) or Block(key=key)
        block.name, block.area_ha = name, area
        block.soil_id, block.system_id = keys.soils[soil], keys.systems[system]
        if block not in row.blocks:
            row.blocks.append(block)
    session.flush()


def _put_sources(session: Session, row: Field, part: FieldPart, keys: _Keys) -> None:
    wanted = {(variable, rows.BEGINNING): part.station for variable in VARIABLES}
    wanted.update({(s.variable, s.since or rows.BEGINNING): s.station for s in part.sources})
    for source in list(row.sources):
        if (source.variable, source.since) not in wanted:
            row.sources.remove(source)
            session.delete(source)
    there = {(source.variable, source.since): source for source in row.sources}
    for (variable, since), station in wanted.items():
        source = there.get((variable, since)) or Source(variable=variable, since=since)
        source.station_id = keys.stations[station]
        if source not in row.sources:
            row.sources.append(source)
    session.flush()


def _blocks(session: Session) -> dict[str, dict[str, Block]]:
    """Field key to block key to block."""
    found: dict[str, dict[str, Block]] = {}
    for key, block in session.execute(
        select(Field.key, Block).join(Field.blocks).order_by(Block.id)
    ):
        found.setdefault(key, {})[block.key] = block
    return found


def _named(blocks: dict[str, dict[str, Block]], part: Any) -> list[Block]:
    of_field = blocks[part.field]
    block = getattr(part, "block", None)
    return list(of_field.values()) if block is None else [of_field[block]]


def _season(
    session: Session,
    part: SeasonPart,
    blocks: dict[str, dict[str, Block]],
    plantings: set[tuple[str, date]],
    who: str,
    loaded: Loaded,
) -> None:
    details = _plain(part)
    for block in _named(blocks, part):
        row = session.scalar(
            select(Season).where(Season.block_id == block.id, Season.planting == part.planting)
        )
        if row is not None and row.details == details:
            loaded.count("seasons", "same")
            continue
        row = row or _moved(session, block, part, plantings)
        loaded.count("seasons", "added" if row is None else "changed")
        _put_season(session, block, row, part, who)


def _put_season(
    session: Session, block: Block, row: Season | None, part: SeasonPart, who: str
) -> None:
    """The part as a season of the block, in place of `row` where there is one."""
    before, details = None if row is None else row.details, _plain(part)
    row = row or Season(block_id=block.id, planting=part.planting)
    since = min(part.planting, row.planting)
    row.planting, row.crop, row.details = part.planting, part.crop, details
    session.add(row)
    key = f"{part.field}/{block.key}/{part.planting}"
    rows.note_change(session, who, "season", key, before, details)
    rows.dirty_blocks(session, [block.id], since)


def put_season(session: Session, part: SeasonPart, was: date | None, who: str) -> None:
    """Put one season in, in place of the one planted on `was` where that is given.

    Raises BookError, and changes nothing, for names that lead nowhere and for what cannot grow.
    """
    book = Book.model_validate({"seasons": [part]})
    problems = reference_problems(book, _known(session)) or _science_problems(book)
    if problems:
        raise BookError(problems)
    for block in _named(_blocks(session), part):
        there = {
            row.planting: row
            for row in session.scalars(select(Season).where(Season.block_id == block.id))
        }
        row = there.get(was or part.planting)
        if row is not None and row.planting != part.planting and part.planting in there:
            raise BookError(
                [f"planting {part.planting}: another season was planted on that day; change that"]
            )
        if row is None or row.details != _plain(part):
            _put_season(session, block, row, part, who)


def _moved(
    session: Session, block: Block, part: SeasonPart, plantings: set[tuple[str, date]]
) -> Season | None:
    """The stored season whose planting date this part corrects: the same crop, at most `MOVED`
    apart, and no longer in the book under its own date."""
    near = session.scalars(
        select(Season)
        .where(Season.block_id == block.id, Season.crop == part.crop)
        .where(Season.planting.between(part.planting - MOVED, part.planting + MOVED))
        .order_by(Season.planting)
    )
    return next((row for row in near if (part.field, row.planting) not in plantings), None)


def _events(
    session: Session,
    book: Book,
    blocks: dict[str, dict[str, Block]],
    who: str,
    loaded: Loaded,
) -> None:
    ordinals: dict[tuple[str, int, date], int] = {}
    entries: list[tuple[str, IrrigationPart | RainPart]] = [
        *(("irrigation", part) for part in book.irrigations),
        *(("rain", part) for part in book.rain),
    ]
    now = datetime.now(UTC)
    said = events_by_origin(session, ORIGIN)
    dirty: dict[int, date] = {}
    for kind, part in entries:
        named = _named(blocks, part)
        area = sum(block.area_ha for block in named)
        for block in named:
            nth = ordinals[kind, block.id, part.day] = (
                ordinals.get((kind, block.id, part.day), 0) + 1
            )
            amount, unit = _amount(part, block.area_ha / area)
            event = Event(
                block_id=block.id,
                kind=kind,
                day=part.day,
                amount=amount,
                unit=unit,
                purpose=getattr(part, "purpose", "crop"),
                confirmation=getattr(part, "confirmation", "measured"),
                note=part.note,
                who=who,
                entered=now,
            )
            origin = f"{ORIGIN}{part.field}/{block.key}/{kind}/{part.day}/{nth}"
            outcome = _put_event(session, event, origin, said.get(origin, []))
            loaded.count("events", outcome)
            if outcome != "same":
                dirty[block.id] = min(part.day, dirty.get(block.id, part.day))
    for number, day in dirty.items():
        rows.dirty_blocks(session, [number], day)


def _amount(part: IrrigationPart | RainPart, share: float) -> tuple[float, str]:
    """The amount as entered, and its unit; a volume is shared over blocks by area."""
    if isinstance(part, RainPart):
        return part.rain_mm, "rain_mm"
    for unit in ("gross_mm", "net_mm", "hours"):
        value: float | None = getattr(part, unit)
        if value is not None:
            return value, unit
    assert part.volume_m3 is not None
    return part.volume_m3 * share, "volume_m3"


def _put_event(session: Session, event: Event, origin: str, versions: list[Event]) -> str:
    """Add the event unless the book said the same before; a changed entry supersedes."""
    if not versions:
        event.origin = origin
        session.add(event)
        return "added"
    last = versions[-1]
    compared = ("amount", "unit", "purpose", "confirmation", "note")
    if all(getattr(last, name) == getattr(event, name) for name in compared):
        return "same"
    head = head_of(session, last)
    if head.kind == VOID:
        return "same"
    event.origin, event.supersedes = f"{origin}~{len(versions) + 1}", head.id
    session.add(event)
    return "changed"
