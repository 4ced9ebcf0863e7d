"""Tables of totalizing water meters: which fields each feeds, and its readings."""

from datetime import date, datetime

from sqlalchemy import ForeignKey, Text
from sqlalchemy.orm import Mapped, mapped_column

from app.storage.tables import Base


class Meter(Base):
    """A meter at an outlet; m3 = register x multiplier x what its unit holds."""

    __tablename__ = "meter"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(unique=True)
    name: Mapped[str]
    farm_id: Mapped[int] = mapped_column(ForeignKey("farm.id"), index=True)
    unit: Mapped[str]
    multiplier: Mapped[float]
    rolls_over_at: Mapped[float | None]


class MeterField(Base):
    """A field that a meter feeds; a field has one meter at most."""

    __tablename__ = "meter_field"
    field_id: Mapped[int] = mapped_column(ForeignKey("field.id"), primary_key=True)
    meter_id: Mapped[int] = mapped_column(ForeignKey("meter.id"), index=True)


class MeterReading(Base):
    """The register at the end of a day; never edited, only superseded. kind: reading or void.

    restarts: the meter was changed or set anew, so that nothing is told of the time before.
    """

    __tablename__ = "meter_reading"
    id: Mapped[int] = mapped_column(primary_key=True)
    meter_id: Mapped[int] = mapped_column(ForeignKey("meter.id"), index=True)
    kind: Mapped[str]
    day: Mapped[date]
    register: Mapped[float]
    restarts: Mapped[bool]
    note: Mapped[str] = mapped_column(Text)
    who: Mapped[str]
    entered: Mapped[datetime]
    supersedes: Mapped[int | None] = mapped_column(ForeignKey("meter_reading.id"), unique=True)
    origin: Mapped[str] = mapped_column(unique=True)
