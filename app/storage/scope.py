"""Which farms a statement may tell of."""

from typing import TypeVarTuple

from sqlalchemy import Select

from app.storage.tables import Farm

Farms = frozenset[str] | None
"""Keys of the farms one may know of; None is every farm."""

Columns = TypeVarTuple("Columns")


def of_farms(statement: Select[*Columns], farms: Farms) -> Select[*Columns]:
    """The statement, which has Farm among its tables, kept to some farms."""
    return statement if farms is None else statement.where(Farm.key.in_(sorted(farms)))
