"""Every table. Facts are kept, state is folded from them, the derived rows can be rebuilt.

facts:    intake, intake_file, contribution, intake_problem, span_mark, sensor_entry, event, book
derived:  station_day, ledger_day (written only by recompute, from the first dirty day)
frozen:   advice (never changed after issue)

`dirty_from` on station and block is the only signal for recompute: whatever lands a fact sets it to
the earliest day the fact touches, in the same transaction.
"""

from datetime import UTC, date, datetime
from typing import Any

from sqlalchemy import (
    JSON,
    DateTime,
    ForeignKey,
    Index,
    LargeBinary,
    MetaData,
    String,
    Text,
    TypeDecorator,
    UniqueConstraint,
)
from sqlalchemy.engine import Dialect
from sqlalchemy.orm import DeclarativeBase, Mapped, mapped_column, relationship

WHOLE = "whole"
"""Key of the one block of a field without blocks."""


class Instant(TypeDecorator[datetime]):
    """An instant, stored in UTC and given back with its offset; naive datetimes are refused."""

    impl = DateTime
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """Instant to stored UTC; raises ValueError for a naive datetime."""
        if value is None:
            return None
        if value.tzinfo is None:
            raise ValueError(f"{value} has no offset")
        return value.astimezone(UTC).replace(tzinfo=None)

    def process_result_value(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """Stored UTC to an aware instant."""
        return None if value is None else value.replace(tzinfo=UTC)


class Base(DeclarativeBase):
    """What every table shares: constraint names that migrations can rely on."""

    metadata = MetaData(
        naming_convention={
            "ix": "ix_%(table_name)s_%(column_0_N_name)s",
            "uq": "uq_%(table_name)s_%(column_0_N_name)s",
            "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
            "pk": "pk_%(table_name)s",
        }
    )
    type_annotation_map = {  # noqa: RUF012
        datetime: Instant,
        dict[str, Any]: JSON(none_as_null=True),
        list[Any]: JSON(none_as_null=True),
        str: String,
    }


# The book


class Station(Base):
    """A weather station; `details` is its part of the book (app.book.schema.StationPart)."""

    __tablename__ = "station"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(unique=True)
    name: Mapped[str]
    details: Mapped[dict[str, Any]]
    dirty_from: Mapped[date | None]


class Soil(Base):
    """A soil profile; `details` is its SoilPart, layers and all."""

    __tablename__ = "soil"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(unique=True)
    name: Mapped[str]
    details: Mapped[dict[str, Any]]


class IrrigationSystem(Base):
    """An application system; `details` is its SystemPart."""

    __tablename__ = "irrigation_system"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(unique=True)
    name: Mapped[str]
    details: Mapped[dict[str, Any]]


class Farm(Base):
    """A farm and its grower."""

    __tablename__ = "farm"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(unique=True)
    name: Mapped[str]
    details: Mapped[dict[str, Any]]


class Field(Base):
    """A field of a farm; `details` is its FieldPart without blocks and sources."""

    __tablename__ = "field"
    id: Mapped[int] = mapped_column(primary_key=True)
    key: Mapped[str] = mapped_column(unique=True)
    name: Mapped[str]
    farm_id: Mapped[int] = mapped_column(ForeignKey("farm.id"), index=True)
    area_ha: Mapped[float]
    managed_by: Mapped[str]
    details: Mapped[dict[str, Any]]
    farm: Mapped[Farm] = relationship()
    blocks: Mapped[list["Block"]] = relationship(back_populates="field", order_by="Block.id")
    sources: Mapped[list["Source"]] = relationship(order_by="Source.variable, Source.since")


class Block(Base):
    """A part of a field with its own ledger; every field has at least one."""

    __tablename__ = "block"
    __table_args__ = (UniqueConstraint("field_id", "key"),)
    id: Mapped[int] = mapped_column(primary_key=True)
    field_id: Mapped[int] = mapped_column(ForeignKey("field.id"))
    key: Mapped[str]
    name: Mapped[str]
    area_ha: Mapped[float]
    soil_id: Mapped[int] = mapped_column(ForeignKey("soil.id"))
    system_id: Mapped[int] = mapped_column(ForeignKey("irrigation_system.id"))
    dirty_from: Mapped[date | None]
    field: Mapped[Field] = relationship(back_populates="blocks")
    soil: Mapped[Soil] = relationship()
    system: Mapped[IrrigationSystem] = relationship()
    seasons: Mapped[list["Season"]] = relationship(order_by="Season.planting")


class Source(Base):
    """The station that feeds a variable (energy, temperature, wind, rain) of a field."""

    __tablename__ = "source"
    __table_args__ = (UniqueConstraint("field_id", "variable", "since"),)
    id: Mapped[int] = mapped_column(primary_key=True)
    field_id: Mapped[int] = mapped_column(ForeignKey("field.id"))
    variable: Mapped[str]
    since: Mapped[date]
    station_id: Mapped[int] = mapped_column(ForeignKey("station.id"), index=True)
    station: Mapped[Station] = relationship()


class Season(Base):
    """A crop on a block; `details` is its SeasonPart, overrides of the handbook and all."""

    __tablename__ = "season"
    __table_args__ = (UniqueConstraint("block_id", "planting"),)
    id: Mapped[int] = mapped_column(primary_key=True)
    block_id: Mapped[int] = mapped_column(ForeignKey("block.id"))
    crop: Mapped[str]
    planting: Mapped[date]
    details: Mapped[dict[str, Any]]


class BookChange(Base):
    """Who changed what in the book: the part before and after."""

    __tablename__ = "book_change"
    id: Mapped[int] = mapped_column(primary_key=True)
    at: Mapped[datetime]
    who: Mapped[str]
    kind: Mapped[str]
    key: Mapped[str]
    before: Mapped[dict[str, Any] | None]
    after: Mapped[dict[str, Any] | None]


# Events


class Event(Base):
    """What was done or seen on a block, as entered; corrections supersede.

    kind irrigation: unit gross_mm, net_mm, hours or volume_m3; rain: rain_mm; stage: amount 1 to 4;
    cover: amount a fraction, `details` the height; cutting; reading: `details` its depths;
    keep_off: `details` its last day; note. A deletion is a row of kind "void" that supersedes.
    """

    __tablename__ = "event"
    id: Mapped[int] = mapped_column(primary_key=True)
    block_id: Mapped[int] = mapped_column(ForeignKey("block.id"))
    kind: Mapped[str]
    day: Mapped[date]
    amount: Mapped[float]
    unit: Mapped[str]
    purpose: Mapped[str]
    confirmation: Mapped[str]
    details: Mapped[dict[str, Any] | None]
    note: Mapped[str | None]
    who: Mapped[str]
    entered: Mapped[datetime]
    supersedes: Mapped[int | None] = mapped_column(ForeignKey("event.id"), unique=True)
    origin: Mapped[str | None] = mapped_column(unique=True)
    """What makes the entry safe to repeat: a form's once-only token, or the book's own identity."""

    __table_args__ = (Index("ix_event_block_id_day", "block_id", "day"),)


# Intake


class StationMapping(Base):
    """How the columns of a header were read last time at a station."""

    __tablename__ = "station_mapping"
    __table_args__ = (UniqueConstraint("station_id", "signature"),)
    id: Mapped[int] = mapped_column(primary_key=True)
    station_id: Mapped[int] = mapped_column(ForeignKey("station.id"))
    signature: Mapped[str]
    mapping: Mapped[dict[str, Any]]


class Intake(Base):
    """One uploaded file: applied whole or not at all; undone by mark, so nothing is lost."""

    __tablename__ = "intake"
    id: Mapped[int] = mapped_column(primary_key=True)
    station_id: Mapped[int] = mapped_column(ForeignKey("station.id"), index=True)
    file_name: Mapped[str]
    sha256: Mapped[str]
    mapping: Mapped[dict[str, Any]]
    who: Mapped[str]
    at: Mapped[datetime]
    state: Mapped[str]  # previewed | applied | undone
    applied_at: Mapped[datetime | None]
    applied_order: Mapped[int | None] = mapped_column(index=True)
    rows: Mapped[int]
    first_day: Mapped[date | None]
    last_day: Mapped[date | None]
    summary: Mapped[dict[str, Any]]
    station: Mapped[Station] = relationship()


class IntakeFile(Base):
    """The bytes of an intake, compressed, in pieces small enough to stream."""

    __tablename__ = "intake_file"
    intake_id: Mapped[int] = mapped_column(ForeignKey("intake.id"), primary_key=True)
    piece: Mapped[int] = mapped_column(primary_key=True)
    data: Mapped[bytes] = mapped_column(LargeBinary)


class Contribution(Base):
    """The rows an intake brought for one station day, packed (app.intake.pack)."""

    __tablename__ = "contribution"
    __table_args__ = (Index("ix_contribution_station_id_day", "station_id", "day"),)
    intake_id: Mapped[int] = mapped_column(ForeignKey("intake.id"), primary_key=True)
    day: Mapped[date] = mapped_column(primary_key=True)
    station_id: Mapped[int] = mapped_column(ForeignKey("station.id"))
    rows: Mapped[int]
    data: Mapped[bytes] = mapped_column(LargeBinary)


class IntakeProblem(Base):
    """What was refused or doubted in a file: where, what value, why, and the remedy."""

    __tablename__ = "intake_problem"
    id: Mapped[int] = mapped_column(primary_key=True)
    intake_id: Mapped[int] = mapped_column(ForeignKey("intake.id"), index=True)
    line: Mapped[int]
    last_line: Mapped[int]
    column: Mapped[str]
    value: Mapped[str]
    why: Mapped[str] = mapped_column(Text)
    remedy: Mapped[str] = mapped_column(Text)
    severity: Mapped[str]
    count: Mapped[int]


# Judgement


class SpanMark(Base):
    """A person's word on a span of one quantity of a station: bad, good, or taken back (void).

    Counts from after `first` to `last`, as the ends of intervals. Never edited, only superseded.
    """

    __tablename__ = "span_mark"
    id: Mapped[int] = mapped_column(primary_key=True)
    station_id: Mapped[int] = mapped_column(ForeignKey("station.id"), index=True)
    quantity: Mapped[str]
    first: Mapped[datetime]
    last: Mapped[datetime]
    verdict: Mapped[str]  # bad | good | void
    why: Mapped[str] = mapped_column(Text)
    who: Mapped[str]
    entered: Mapped[datetime]
    supersedes: Mapped[int | None] = mapped_column(ForeignKey("span_mark.id"), unique=True)
    origin: Mapped[str] = mapped_column(unique=True)


class SensorEntry(Base):
    """A line of a station's sensor log; a calibration's factor holds from its day on.

    kind: calibration, cleaning, levelling, moved, note, or void, which takes an entry back.
    """

    __tablename__ = "sensor_entry"
    id: Mapped[int] = mapped_column(primary_key=True)
    station_id: Mapped[int] = mapped_column(ForeignKey("station.id"), index=True)
    quantity: Mapped[str | None]
    day: Mapped[date]
    kind: Mapped[str]
    factor: Mapped[float | None]
    note: Mapped[str] = mapped_column(Text)
    who: Mapped[str]
    entered: Mapped[datetime]
    supersedes: Mapped[int | None] = mapped_column(ForeignKey("sensor_entry.id"), unique=True)
    origin: Mapped[str] = mapped_column(unique=True)


# Derived


class StationDay(Base):
    """One day of a station: daily variables, the rung of the energy and why, reference ET."""

    __tablename__ = "station_day"
    station_id: Mapped[int] = mapped_column(ForeignKey("station.id"), primary_key=True)
    day: Mapped[date] = mapped_column(primary_key=True)
    tmax: Mapped[float | None]
    tmin: Mapped[float | None]
    tmean: Mapped[float | None]
    rh_max: Mapped[float | None]
    rh_min: Mapped[float | None]
    vapour_pressure: Mapped[float | None]
    wind_2m: Mapped[float | None]
    rain: Mapped[float | None]
    shortwave_down: Mapped[float | None]
    shortwave_up: Mapped[float | None]
    longwave_down: Mapped[float | None]
    longwave_up: Mapped[float | None]
    rs: Mapped[float | None]
    rso: Mapped[float | None]
    ra: Mapped[float | None]
    rung: Mapped[int]
    why_not: Mapped[str]
    humidity_rung: Mapped[int]
    wind_rung: Mapped[int]
    rn: Mapped[float | None]
    rn_uncertainty: Mapped[float | None]
    rn_measured: Mapped[float | None]
    rn_modelled: Mapped[float | None]
    rh_min_used: Mapped[float | None]
    eto: Mapped[float | None]
    etr: Mapped[float | None]
    eto_uncertainty: Mapped[float | None]
    eto_daily: Mapped[float | None]
    """Of a station that goes by hours, what the daily equation gives; eto is then by hours."""
    etr_daily: Mapped[float | None]
    eto_hours: Mapped[float | None]
    """The sum of its hours; None where they are not complete."""
    etr_hours: Mapped[float | None]
    net_radiation: Mapped[float | None]
    """Over whatever lies under the sensors, as measured: four components, else a net sensor."""
    soil_heat_flux: Mapped[float | None]
    sensible_heat: Mapped[float | None]
    latent_heat: Mapped[float | None]
    clear_level: Mapped[float | None]
    """Of a clear day: shortwave over clear sky, lean to the east, minutes the clock runs ahead."""
    clear_tilt_deg: Mapped[float | None]
    clear_clock_min: Mapped[float | None]
    flags: Mapped[str]
    notes: Mapped[str]


class LedgerDay(Base):
    """One day of a block's ledger; the key serves a morning, the index a field's history."""

    __tablename__ = "ledger_day"
    __table_args__ = (Index("ix_ledger_day_block_id_day", "block_id", "day"),)
    day: Mapped[date] = mapped_column(primary_key=True)
    block_id: Mapped[int] = mapped_column(ForeignKey("block.id"), primary_key=True)
    season_id: Mapped[int] = mapped_column(ForeignKey("season.id"))
    rung: Mapped[int]
    rn_mj_m2: Mapped[float]
    eto_mm: Mapped[float]
    kcb: Mapped[float | None]
    ke: Mapped[float | None]
    ks: Mapped[float]
    kc_actual: Mapped[float]
    etc_potential_mm: Mapped[float]
    et_actual_mm: Mapped[float]
    rain_mm: Mapped[float]
    rain_outside_roots_mm: Mapped[float]
    runoff_mm: Mapped[float]
    irrigation_gross_mm: Mapped[float]
    application_loss_mm: Mapped[float]
    irrigation_net_mm: Mapped[float]
    capillary_rise_mm: Mapped[float]
    deep_percolation_mm: Mapped[float]
    root_growth_depletion_mm: Mapped[float]
    correction_mm: Mapped[float]
    root_depth_m: Mapped[float]
    taw_mm: Mapped[float]
    raw_mm: Mapped[float]
    limit_mm: Mapped[float]
    depletion_mm: Mapped[float]
    depletion_p10_mm: Mapped[float | None]
    depletion_p90_mm: Mapped[float | None]
    subsoil_depletion_mm: Mapped[float]
    evaporation_layer_depletion_mm: Mapped[float | None]
    standing: Mapped[str]


class ReadingTaken(Base):
    """What a reading of soil water did to its block's ledger: how it was weighed, and the shift."""

    __tablename__ = "reading_taken"
    event_id: Mapped[int] = mapped_column(ForeignKey("event.id"), primary_key=True)
    block_id: Mapped[int] = mapped_column(ForeignKey("block.id"), index=True)
    close: Mapped[date]
    correction_mm: Mapped[float]
    gain: Mapped[float]
    before_mm: Mapped[float]
    before_spread_mm: Mapped[float]
    reading_mm: Mapped[float]
    reading_spread_mm: Mapped[float]
    after_mm: Mapped[float]
    after_spread_mm: Mapped[float]
    why: Mapped[str]


# Frozen


class Advice(Base):
    """One recommendation as issued on one morning: frozen, numbered, reproducible.

    A changed input issues a new number for the same block and morning; the last number stands.
    `figures` are the numbers of the reason's sentence; `outlook` the days ahead it was decided on.
    """

    __tablename__ = "advice"
    __table_args__ = (Index("ix_advice_issued_on_block_id", "issued_on", "block_id"),)
    number: Mapped[int] = mapped_column(primary_key=True)
    block_id: Mapped[int] = mapped_column(ForeignKey("block.id"), index=True)
    season_id: Mapped[int] = mapped_column(ForeignKey("season.id"))
    issued_on: Mapped[date]
    inputs_hash: Mapped[str]
    program: Mapped[str]
    stands: Mapped[bool]
    """True for the last number of a block and morning."""
    standing: Mapped[str]
    unsure: Mapped[str]
    """Why the mark stands, or empty."""
    day: Mapped[date | None]
    net_mm: Mapped[float]
    gross_mm: Mapped[float]
    hours: Mapped[float]
    volume_m3: Mapped[float]
    limit_day: Mapped[date | None]
    reason: Mapped[str]
    figures: Mapped[dict[str, Any]]
    depletion_mm: Mapped[float]
    depletion_p10_mm: Mapped[float]
    depletion_p90_mm: Mapped[float]
    limit_mm: Mapped[float]
    taw_mm: Mapped[float]
    change_mm: Mapped[float | None]
    """Depletion this morning less that of the morning before."""
    rung: Mapped[int]
    data_until: Mapped[date | None]
    outlook: Mapped[dict[str, Any]]
