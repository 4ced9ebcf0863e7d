"""Statements for the book: parts put in by key, and what a change makes dirty."""

from collections.abc import Iterable
from datetime import UTC, date, datetime
from typing import Any, TypeVar

from sqlalchemy import func, select, update
from sqlalchemy.orm import Session

from app.storage.tables import (
    Block,
    BookChange,
    Contribution,
    Farm,
    Field,
    IrrigationSystem,
    Soil,
    Source,
    Station,
)

BEGINNING = date(1900, 1, 1)
"""Before every record: dirty from here means all of it, and a source without a date began here."""

Keyed = TypeVar("Keyed", bound=Station | Soil | IrrigationSystem | Farm | Field)


def keys_of(session: Session, table: type[Keyed]) -> dict[str, int]:
    """Key to id of every row of a keyed table."""
    return {key: number for key, number in session.execute(select(table.key, table.id))}


def note_change(
    session: Session,
    who: str,
    kind: str,
    key: str,
    before: dict[str, Any] | None,
    after: dict[str, Any] | None,
) -> None:
    """Keep who changed what."""
    session.add(
        BookChange(at=datetime.now(UTC), who=who, kind=kind, key=key, before=before, after=after)
    )


def soil_blocks(session: Session, soil_id: int) -> list[int]:
    """Blocks on a soil."""
    return list(session.scalars(select(Block.id).where(Block.soil_id == soil_id)))


def system_blocks(session: Session, system_id: int) -> list[int]:
    """Blocks under an application system."""
    return list(session.scalars(select(Block.id).where(Block.system_id == system_id)))


def station_blocks(session: Session, station_id: int) -> list[int]:
    """Blocks of the fields that take any variable from a station."""
    fields = select(Source.field_id).where(Source.station_id == station_id)
    return list(session.scalars(select(Block.id).where(Block.field_id.in_(fields))))


def dirty_blocks(session: Session, blocks: Iterable[int], since: date) -> None:
    """Mark ledgers as to be recomputed from a day, or from the earlier day already marked."""
    _dirty(session, Block, blocks, since)


def dirty_station(session: Session, station_id: int, since: date) -> None:
    """Mark a station's days as to be recomputed from a day, or from the earlier one marked."""
    _dirty(session, Station, [station_id], since)


def _dirty(
    session: Session, table: type[Station] | type[Block], ids: Iterable[int], since: date
) -> None:
    numbers = list(ids)
    if not numbers:
        return
    session.execute(
        update(table)
        .where(table.id.in_(numbers))
        .where((table.dirty_from.is_(None)) | (table.dirty_from > since))
        .values(dirty_from=since)
    )


def first_contribution(session: Session, station_id: int) -> date | None:
    """First day any intake brought rows for."""
    return session.scalar(
        select(func.min(Contribution.day)).where(Contribution.station_id == station_id)
    )


def find(session: Session, table: type[Keyed], key: str) -> Keyed | None:
    """The row of a key, or None."""
    return session.scalar(select(table).where(table.key == key))
