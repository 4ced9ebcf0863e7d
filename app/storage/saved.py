"""Statements behind what measuring energy is worth: ledger days of the blocks a station feeds."""

from datetime import date
from typing import NamedTuple

from sqlalchemy import exists, select
from sqlalchemy.orm import Session, aliased

from app.storage.scope import Farms, of_farms
from app.storage.tables import Block, Farm, Field, LedgerDay, Season, Source


class FedDay(NamedTuple):
    """A day of a block's running season whose energy came from the station."""

    field_key: str
    field_name: str
    block_id: int
    area_ha: float
    day: date
    kc_actual: float


def fed_days(
    session: Session, station: int, today: date, farms: Farms = None, field: str | None = None
) -> list[FedDay]:
    """Ledger days since planting of the blocks that rest on a station for energy, in order.

    A day counts where the station was the field's energy source on that day.
    """
    later_season, later_source = aliased(Season), aliased(Source)
    statement = (
        select(Field.key, Field.name, Block.id, Block.area_ha, LedgerDay.day, LedgerDay.kc_actual)
        .join(Block, Block.id == LedgerDay.block_id)
        .join(Field, Field.id == Block.field_id)
        .join(Season, Season.id == LedgerDay.season_id)
        .join(Farm, Farm.id == Field.farm_id)
        .join(Source, Source.field_id == Field.id)
        .where(
            Source.variable == "energy",
            Source.station_id == station,
            Source.since <= LedgerDay.day,
            Season.planting <= LedgerDay.day,
            LedgerDay.day < today,
            ~exists().where(
                later_source.field_id == Field.id,
                later_source.variable == "energy",
                later_source.since > Source.since,
                later_source.since <= LedgerDay.day,
            ),
            ~exists().where(
                later_season.block_id == Block.id,
                later_season.planting > Season.planting,
                later_season.planting <= today,
            ),
        )
        .order_by(Field.name, Field.key, Block.id, LedgerDay.day)
    )
    if field is not None:
        statement = statement.where(Field.key == field)
    return [FedDay._make(row) for row in session.execute(of_farms(statement, farms))]
