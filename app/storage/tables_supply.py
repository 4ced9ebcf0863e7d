"""Tables of shared supplies: what each gives, and which fields hang on it."""

from typing import Any

from sqlalchemy import ForeignKey
from sqlalchemy.orm import Mapped, mapped_column

from app.storage.tables import Base


class Supply(Base):
    """A shared supply; details are its part of the book, without its fields."""

    __tablename__ = "supply"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(unique=True)
    name: Mapped[str]
    details: Mapped[dict[str, Any]]


class SupplyField(Base):
    """A field that hangs on a supply; on one at most."""

    __tablename__ = "supply_field"
    field_id: Mapped[int] = mapped_column(ForeignKey("field.id"), primary_key=True)
    supply_id: Mapped[int] = mapped_column(ForeignKey("supply.id"), index=True)
