"""Rounds, fields, ledgers and advice."""

from dataclasses import asdict
from datetime import date
from typing import Annotated, Any

from fastapi import APIRouter, Query
from pydantic import BaseModel

from app import wording
from app.storage import pages as store
from app.storage import pages_field as store_field
from app.storage.pages import RoundsRow
from app.web.access import AsViewer
from app.web.api.events import refused
from app.web.api.schemas import AdviceOut, FieldOut, LedgerOut, RoundsField, RoundsOut
from app.web.needs import AsDatabase, AsKey, AsToday, Clean
from app.web.pages.fields import choose, own_blocks
from app.web.rounds_view import urgency
from app.workflows.managed import managed, one_a_field
from app.workflows.once import EntryError

router = APIRouter(prefix="/api/v1")
ADVICE = (
    "number", "standing", "unsure", "day", "net_mm", "gross_mm", "hours", "volume_m3",
    "limit_day", "reason", "depletion_mm", "depletion_p10_mm", "depletion_p90_mm", "limit_mm",
    "taw_mm", "change_mm", "rung", "data_until",
)  # fmt: skip


def advice_of(row: RoundsRow) -> dict[str, Any] | None:
    """The advice of a row as it was issued, None without one."""
    issued = row.issued or row
    return {name: getattr(issued, name) for name in ADVICE} if row.number is not None else None


@router.get("/rounds", tags=["rounds"])
def rounds(db: AsDatabase, viewer: AsViewer, today: AsToday) -> RoundsOut:
    """Every field with its advice of the morning, most urgent first."""
    with db.read() as session:
        morning = store.last_morning(session, today)
        rows = [row for row, _ in one_a_field(store.rounds_rows(session, morning, viewer.farms))]
    return RoundsOut(
        today=today,
        morning=morning,
        caution=wording.CAUTION,
        fields=[
            RoundsField(
                key=row.field_key,
                name=row.field_name,
                farm=row.farm_key,
                area_ha=row.area_ha,
                block=row.block_key,
                crop=row.crop,
                planting=row.planting,
                advice=advice_of(row),
                decision=row.decision._asdict() if row.decision else None,
            )
            for row in sorted(rows, key=urgency)
        ],
    )


@router.get("/fields", tags=["fields"])
def fields(db: AsDatabase, viewer: AsViewer, today: AsToday) -> list[FieldOut]:
    """Every field of the book."""
    with db.read() as session:
        rows = store.rounds_rows(session, None, viewer.farms)
        sources = store.current(store.sources(session, today, viewer.farms))
    return [_field(rows, sources, key) for key in dict.fromkeys(row.field_key for row in rows)]


@router.get("/fields/{key}", tags=["fields"])
def field(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey) -> FieldOut:
    """One field of the book."""
    own_blocks(db, viewer, key)
    with db.read() as session:
        rows = store.rounds_rows(session, None, viewer.farms, key)
        sources = store.current(store.sources(session, today, viewer.farms))
    return _field(rows, sources, key)


def _field(
    rows: list[RoundsRow], sources: dict[tuple[int, str], store.SourceRow], key: str
) -> FieldOut:
    blocks = [row for row in rows if row.field_key == key]
    first = blocks[0]
    return FieldOut(
        key=key,
        name=first.field_name,
        farm=first.farm_key,
        area_ha=first.area_ha,
        managed_by=first.managed_by,
        blocks=[
            {"key": row.block_key, "name": row.block_name, "system": row.system_name}
            for row in blocks
        ],
        sources={
            variable: source.station_key
            for (number, variable), source in sources.items()
            if number == first.field_id
        },
    )


@router.get("/fields/{key}/ledger", tags=["fields"])
def ledger(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    block: str | None = None,
    first: Annotated[date | None, Query(description="first day")] = None,
    last: Annotated[date | None, Query(description="last day")] = None,
) -> LedgerOut:
    """The daily root-zone water balance of a block, every term."""
    blocks = own_blocks(db, viewer, key)
    with db.read() as session:
        if block is None:
            morning = store.last_morning(session, today)
            block = managed(store.rounds_rows(session, morning, viewer.farms, key)).block_key
        chosen = choose(blocks, block)
        days = store_field.ledger_days(session, chosen.id, first, last)
    hidden = ("block_id", "season_id")
    return LedgerOut(
        field=key,
        block=chosen.key,
        caution=wording.CAUTION,
        days=[{name: day[name] for name in day if name not in hidden} for day in days],
    )


@router.get("/fields/{key}/advice", tags=["fields"])
def advice(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, block: str | None = None
) -> list[AdviceOut]:
    """The advice that stands for each block (or one), with its outlook."""
    blocks = own_blocks(db, viewer, key)
    chosen = blocks if block is None else [choose(blocks, block)]
    with db.read() as session:
        found = [store_field.last_advice(session, item.id, today) for item in chosen]
    return [
        AdviceOut.model_validate(
            {**row, "says": wording.reason(row["reason"], row["figures"], row["day"], today)}
        )
        for row in found
        if row is not None
    ]


class TriedDay(BaseModel):
    """A day ahead: depletion at its close as things stand and as tried, and the limit [mm]."""

    day: date
    depletion_mm: float
    tried_mm: float
    limit_mm: float


class WhatIfOut(BaseModel):
    """The days ahead as tried, and when either course closes past the limit."""

    days: list[TriedDay]
    passes: date | None
    tried_passes: date | None
    net_mm: float
    caution: str


@router.get("/fields/{key}/what-if", tags=["fields"])
def what_if(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    day: date,
    gross_mm: Annotated[float, Query(ge=0, le=500)] = 0.0,
    rain_mm: Annotated[float, Query(ge=0, le=500)] = 0.0,
    block: Annotated[Clean | None, Query(max_length=80)] = None,
) -> WhatIfOut:
    """The days ahead with water or rain tried on one of them; nothing is stored."""
    from app.workflows.what_if import what_if as tried

    blocks = own_blocks(db, viewer, key)
    chosen = choose(blocks, block or blocks[0].key)
    try:
        with db.read() as session:
            found = tried(session, chosen.id, today, day, gross_mm, rain_mm)
    except EntryError as error:
        raise refused(error) from None
    return WhatIfOut.model_validate(asdict(found) | {"caution": wording.CAUTION})
