"""Statements for shared supplies."""

from datetime import date

from sqlalchemy import delete, func, select
from sqlalchemy.orm import Session

from app.storage.scope import Farms
from app.storage.tables import Block, Farm, Field, LedgerDay
from app.storage.tables_supply import Supply, SupplyField


def supplies(session: Session, farms: Farms) -> list[Supply]:
    """The supplies all of whose fields are of these farms, by name: a plan tells of every one."""
    statement = select(Supply).order_by(Supply.name)
    if farms is not None:
        others = (
            select(SupplyField.supply_id)
            .join(Field, Field.id == SupplyField.field_id)
            .join(Farm, Farm.id == Field.farm_id)
            .where(Farm.key.not_in(sorted(farms)))
        )
        statement = statement.where(Supply.id.not_in(others))
    return list(session.scalars(statement))


def blocks_on(session: Session, supply: int) -> list[tuple[int, str, str, str]]:
    """Blocks that hang on a supply: number, field's key and name, farm's key."""
    statement = (
        select(Block.id, Field.key, Field.name, Farm.key)
        .join(Field, Field.id == Block.field_id)
        .join(SupplyField, SupplyField.field_id == Field.id)
        .join(Farm, Farm.id == Field.farm_id)
        .where(SupplyField.supply_id == supply)
        .order_by(Farm.key, Field.name, Block.id)
    )
    return [(n, key, name, farm) for n, key, name, farm in session.execute(statement)]


def hang(session: Session, supply: int, fields: list[int]) -> None:
    """Hang these fields on a supply, and no others; from another supply they are taken."""
    session.execute(
        delete(SupplyField).where(
            (SupplyField.supply_id == supply) | SupplyField.field_id.in_(fields)
        )
    )
    session.add_all(SupplyField(field_id=number, supply_id=supply) for number in fields)
    session.flush()


def taken_mm_ha(
    session: Session, supply: int, first: date, before: date, farm: str | None
) -> list[tuple[float, float]]:
    """Gross water [mm] put on each block of a supply from `first` to the day before `before`, and
    the block's area [ha]."""
    statement = (
        select(func.sum(LedgerDay.irrigation_gross_mm), Block.area_ha)
        .join(Block, Block.id == LedgerDay.block_id)
        .join(SupplyField, SupplyField.field_id == Block.field_id)
        .join(Field, Field.id == Block.field_id)
        .join(Farm, Farm.id == Field.farm_id)
        .where(SupplyField.supply_id == supply, LedgerDay.day >= first, LedgerDay.day < before)
        .group_by(Block.id, Block.area_ha)
    )
    if farm is not None:
        statement = statement.where(Farm.key == farm)
    return [(float(mm or 0.0), float(area)) for mm, area in session.execute(statement)]
