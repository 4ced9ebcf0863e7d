"""What the API takes and gives. Depths mm, areas ha, volumes m3, dates ISO 8601, SI throughout."""

from datetime import date, datetime
from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field

from app.web.needs import Clean

Number = float | None
UnitName = Literal["hours", "gross_mm", "net_mm", "volume_m3", "rain_mm"]


class Given(BaseModel):
    """What is sent in: unknown names are refused, figures must be finite."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False)


class AdviceOut(BaseModel):
    """One recommendation as issued."""

    number: int = Field(examples=[1482])
    issued_on: date = Field(examples=["2026-07-14"])
    stands: bool
    standing: str = Field(examples=["due"])
    unsure: str = Field(description="codes of why the mark stands, or empty")
    day: date | None = Field(description="when to water; null for no water")
    net_mm: float = Field(examples=[42.0])
    gross_mm: float = Field(examples=[52.5])
    hours: float = Field(examples=[7.3])
    volume_m3: float = Field(examples=[6510.0])
    limit_day: date | None
    reason: str = Field(description="code", examples=["last_chance"])
    says: str = Field(
        description="the reason in words",
        examples=["Passes its limit on Thursday; tomorrow is the last chance before."],
    )
    figures: dict[str, Any]
    depletion_mm: float
    depletion_p10_mm: float
    depletion_p90_mm: float
    limit_mm: float
    taw_mm: float
    change_mm: Number
    rung: int
    data_until: date | None
    program: str = ""
    inputs_hash: str = ""
    outlook: dict[str, Any] = {}


class RoundsField(BaseModel):
    """A field and its advice of the morning."""

    key: str = Field(examples=["long-piece"])
    name: str = Field(examples=["Long Piece"])
    farm: str = Field(examples=["hollin"])
    area_ha: float = Field(examples=[12.4])
    block: str = Field(description="the block the field goes by")
    crop: str | None
    planting: date | None
    advice: dict[str, Any] | None = Field(
        description="as issued: standing, day, depths, hours, volume, depletion, limit, TAW, rung"
    )
    decision: dict[str, Any] | None = Field(
        None, description="what the advisor decided: verdict, day, depths, hours, until, note, who"
    )


class RoundsOut(BaseModel):
    """The morning: every field, most urgent first."""

    today: date = Field(examples=["2026-07-14"])
    morning: date | None = Field(description="the morning the advice is of")
    caution: str
    fields: list[RoundsField]


class FieldOut(BaseModel):
    """A field of the book."""

    key: str = Field(examples=["long-piece"])
    name: str = Field(examples=["Long Piece"])
    farm: str = Field(examples=["hollin"])
    area_ha: float = Field(examples=[12.4])
    managed_by: str = Field(examples=["driest"])
    blocks: list[dict[str, Any]] = Field(
        examples=[[{"key": "all", "name": "Long Piece", "system": "Pivot"}]]
    )
    sources: dict[str, str] = Field(description="variable to the key of the station in force")


class LedgerOut(BaseModel):
    """Days of a block's ledger, every column."""

    field: str
    block: str
    caution: str
    days: list[dict[str, Any]]


class EventIn(Given):
    """Water to be logged; the same `token` sent twice changes nothing."""

    model_config = ConfigDict(
        extra="forbid",
        allow_inf_nan=False,
        json_schema_extra={
            "examples": [{"day": "2026-07-13", "amount": 7.5, "unit": "hours", "token": "a1b2"}]
        },
    )
    day: date
    amount: float = Field(ge=0)
    unit: UnitName = "hours"
    block: Clean | None = None
    purpose: Clean = "crop"
    confirmation: Clean = "reported"
    area_share: float = Field(1.0, gt=0, le=1, description="part of the block that was watered")
    wetted_fraction: float | None = Field(
        None, ge=0.01, le=1, description="of the surface, where not by the block's own system"
    )
    note: Annotated[Clean, Field(max_length=400)] | None = None
    token: Annotated[Clean, Field(min_length=4, max_length=80)]


class EventChange(Given):
    """A corrected entry."""

    model_config = ConfigDict(
        extra="forbid",
        allow_inf_nan=False,
        json_schema_extra={
            "examples": [{"day": "2026-07-13", "amount": 4, "unit": "hours", "token": "c3d4"}]
        },
    )
    day: date
    amount: float = Field(ge=0)
    unit: UnitName
    purpose: Clean | None = Field(None, description="as it was when not given")
    confirmation: Clean | None = Field(None, description="as it was when not given")
    area_share: float | None = Field(None, gt=0, le=1, description="as it was when not given")
    note: Annotated[Clean, Field(max_length=400)] | None = None
    token: Annotated[Clean, Field(min_length=4, max_length=80)]


class EventOut(BaseModel):
    """An entry that stands."""

    id: int
    block: str
    kind: str
    day: date
    amount: float
    unit: str
    purpose: str
    confirmation: str
    note: str | None
    who: str
    entered: datetime
    supersedes: int | None
    details: dict[str, Any] | None = Field(None, description="area_share, wetted_fraction")


class Logged(BaseModel):
    """The number of an entry."""

    id: int = Field(examples=[17])


class StationOut(BaseModel):
    """A station of the book."""

    key: str
    name: str
    first_day: date | None
    last_day: date | None = Field(description="last day with usable data")
    details: dict[str, Any]
    trouble: list[str]


class IntakeOut(BaseModel):
    """An uploaded file."""

    id: int
    station: str
    file_name: str
    state: str = Field(examples=["previewed"])
    who: str
    at: datetime
    rows: int
    first_day: date | None
    last_day: date | None


class PreviewOut(BaseModel):
    """What a file would bring, before anything is stored as a reading."""

    id: int
    station: str
    file_name: str
    state: str
    message: str
    mapping: dict[str, Any] | None
    remembered: bool
    columns: list[dict[str, Any]]
    questions: list[dict[str, Any]]
    notes: list[str]
    rows_accepted: int
    rows_refused: int
    rows_same: int
    rows_differing: int
    rows_ahead: int
    first_day: date | None
    last_day: date | None
    days_changed: list[date]
    fields_touched: int
    problems: list[dict[str, Any]]
    problems_total: int


class AppliedOut(BaseModel):
    """What an apply or undo did."""

    already_here: bool
    rows: int
    first_day: date | None
    days_changed: int
    blocks: int


class Problem(BaseModel):
    """Problem details (RFC 9457): each error names field, value and remedy."""

    title: str
    status: int
    detail: str
    errors: list[dict[str, Any]] = []
