"""A season of a crop in the book: what it overrides of the handbook, and what was seen of it."""

from datetime import date
from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from app.book.parts import Depth, Fraction, Key, Mad, Name, Part, Stage

Shares = tuple[Fraction | None, Fraction | None, Fraction | None, Fraction | None]


class DegreeDaysPart(Part):
    """Stages by warmth: base and upper temperature [degC] and the degree days of each stage."""

    base_c: Annotated[float, Field(ge=-10, le=25)]
    upper_c: Annotated[float, Field(ge=0, le=50)] | None = None
    method: Literal["mean", "clipped", "sine"] = "mean"
    stage_sums: tuple[float, float, float, float]


class StageSeenPart(Part):
    """A stage that began on a day, as somebody saw it."""

    day: date
    stage: Stage


class CoverPart(Part):
    """Fraction of the ground the crop covers and its height, as measured on a day."""

    day: date
    cover: Fraction
    height_m: Annotated[float, Field(gt=0, le=30)]


class StandPart(Part):
    """Trees, vines or rows at mid-season: the cover and height that their coefficients follow."""

    cover: Fraction
    height_m: Annotated[float, Field(gt=0, le=30)]


class CanopyPart(Part):
    """How a stand covers its ground; rows need the width of their canopy and the latitude."""

    shape: Literal["even", "rows", "round"] = "even"
    width_m: Annotated[float, Field(gt=0, le=30)] | None = None
    row_azimuth_deg: Annotated[float, Field(ge=0, le=180)] = 90.0
    latitude_deg: Annotated[float, Field(ge=-90, le=90)] | None = None
    ground_cover_kcb: Annotated[float, Field(ge=0, le=1.3)] | None = Field(
        None, description="Kcb of live cover between the plants"
    )
    multiplier: Annotated[float, Field(ge=1, le=2)] = 1.5
    full: Literal["height", "table"] = "height"
    stomatal: Annotated[float, Field(ge=0.1, le=1)] = 1.0


class InitialWettingPart(Part):
    """How often the soil is expected to be wetted while the crop is small, by rain or irrigation:
    gives the initial coefficient of single ones (FAO-56 Annex 7)."""

    every_days: Annotated[float, Field(gt=0, le=60)]
    depth_mm: Annotated[float, Field(gt=0, le=200)] = Field(
        description="of one wetting, over the whole field"
    )
    eto_mm: Annotated[float, Field(gt=0.5, le=12)] = Field(
        description="reference ET of the place and time of the year, a day"
    )


class MulchPart(Part):
    """Mulch over a fraction of the ground; `reduction` of the crop's own coefficient."""

    kind: Literal["plastic", "organic"]
    cover: Fraction
    reduction: Annotated[float, Field(ge=0, le=0.4)] = 0.0


class OwnCropPart(Part):
    """A crop the handbook does not have: its name, and where its figures are from."""

    name: Name
    source: Annotated[str, Field(min_length=3, max_length=300)]


OWN_FIGURES = (
    "stage_days",
    "height_m",
    "root_depth_min_m",
    "root_depth_max_m",
    "depletion_fraction",
)
"""What a season of a crop of one's own has to give, besides its three coefficients."""


class SeasonPart(Part):
    """A crop on a field from planting on; what is given overrides the handbook's row."""

    field: Key
    block: Key | None = Field(None, description="one block only; every block when not given")
    crop: str = Field(description="crop_id of the handbook")
    planting: date
    coefficients: Literal["dual", "single"] = "dual"
    kc_reference: Literal["short"] = Field("short", description="handbook Kc go with ETo only")
    stage_days: tuple[int, int, int, int] | None = Field(
        None, description="initial, development, mid-season, late; the planting day is day 1"
    )
    kc_ini: Annotated[float, Field(ge=0, le=2)] | None = None
    kc_mid: Annotated[float, Field(ge=0, le=2)] | None = None
    kc_end: Annotated[float, Field(ge=0, le=2)] | None = None
    kcb_ini: Annotated[float, Field(ge=0, le=2)] | None = None
    kcb_mid: Annotated[float, Field(ge=0, le=2)] | None = None
    kcb_end: Annotated[float, Field(ge=0, le=2)] | None = None
    kc_min: Annotated[float, Field(ge=0, le=0.3)] | None = None
    height_m: Annotated[float, Field(gt=0, le=30)] | None = None
    root_depth_min_m: Annotated[float, Field(gt=0, le=5)] | None = None
    root_depth_max_m: Annotated[float, Field(gt=0, le=5)] | None = None
    depletion_fraction: Annotated[float, Field(ge=0.1, le=0.8)] | None = Field(
        None, description="p of RAW = p TAW, at 5 mm of ETc a day"
    )
    mad: Annotated[float, Field(gt=0, le=0.95)] | None = Field(
        None, description="share of TAW the limit stands at; RAW when not given"
    )
    mad_by_stage: tuple[Mad | None, Mad | None, Mad | None, Mad | None] | None = Field(
        None, description="the same for each stage, over `mad`; initial to late"
    )
    own_crop: OwnCropPart | None = Field(
        None, description="the season then gives every figure, and `crop` is any key"
    )
    degree_days: DegreeDaysPart | None = Field(
        None, description="stages by warmth; stage_days then only bound the season"
    )
    stages: list[StageSeenPart] = Field([], description="stages seen to begin, by day")
    cover: list[CoverPart] = Field([], description="ground cover and height measured, by day")
    stand: StandPart | None = Field(
        None, description="trees, vines, rows: coefficients from cover and height"
    )
    canopy: CanopyPart | None = None
    cycle_days: tuple[int, int, int, int] | None = Field(
        None, description="stages of a regrowth of forage after each cutting"
    )
    cuttings: list[date] = Field([], description="days on which forage was cut")
    mulch: MulchPart | None = None
    initial_wetting: InitialWettingPart | None = Field(
        None, description="in place of the initial coefficient; single coefficients only"
    )
    climate_adjustment: Literal["trailing", "stage_mean", "day", "none"] = Field(
        "trailing", description="wind and humidity that adjust Kc: mean of 30 days, stage, the day"
    )
    ledger_start: date | None = Field(None, description="a later first day; planting if not given")
    initial_depletion_mm: Depth | None = Field(
        None,
        description="root zone at the start; this or the fraction, else what the season before "
        "left, through bare soil; field capacity without one",
    )
    initial_depletion_fraction: Fraction | None = Field(None, description="the same, of TAW")
    initial_subsoil_depletion_fraction: Fraction = Field(
        0, description="of the soil that roots have yet to reach; 0 is field capacity"
    )
    initial_evaporation_depletion_mm: Depth = 0
    refill_to_mm: Depth = Field(0, description="depletion an application is to leave")
    refill_to_by_stage: Shares | None = Field(
        None, description="by stage, of TAW, over `refill_to_mm`; initial to late"
    )
    et_target_by_stage: Shares | None = Field(
        None, description="share of crop ET an application gives back, by stage; all if not given"
    )
    floor_by_stage: Shares | None = Field(
        None, description="most depletion an application leaves, of TAW, by stage"
    )
    rain_room_mm: Depth = Field(0, description="room an application is to leave for rain")
    allowed_at_maturity: Fraction | None = Field(
        None, description="depletion the crop may end with, of TAW; 0.6 when not given"
    )
    end: date | None = Field(
        None, description="harvest or frost; planting plus the stages if not given"
    )
    note: str | None = None

    @model_validator(mode="after")
    def _in_order(self) -> Self:
        if self.end is not None and self.end <= self.planting:
            raise ValueError(f"end {self.end} is not after planting {self.planting}")
        if self.ledger_start is not None and self.ledger_start < self.planting:
            raise ValueError(f"ledger_start {self.ledger_start} is before planting {self.planting}")
        if self.stage_days is not None and min(self.stage_days) < 1:
            raise ValueError("each of stage_days must be at least 1 day")
        if self.initial_depletion_mm is not None and self.initial_depletion_fraction is not None:
            raise ValueError("give initial_depletion_mm or initial_depletion_fraction, not both")
        if self.initial_wetting is not None and self.coefficients != "single":
            raise ValueError(
                "initial_wetting is for single coefficients; dual ones reckon evaporation each day"
            )
        for n, share in enumerate(self.et_target_by_stage or ()):
            if share is not None and share < 0.1:
                raise ValueError(
                    f"et_target_by_stage gives {share:g} in stage {n + 1}; give at least 0.1"
                )
        limits = self.mad_by_stage or (None,) * 4
        for n, left in enumerate(self.refill_to_by_stage or ()):
            limit = limits[n] if limits[n] is not None else self.mad
            if left is not None and left >= (0.95 if limit is None else limit):
                raise ValueError(
                    f"refill_to_by_stage leaves {left:g} of TAW in stage {n + 1}; it must be below "
                    "that stage's limit"
                )
        if self.own_crop is not None:
            symbol = "kcb" if self.coefficients == "dual" else "kc"
            needed = [*OWN_FIGURES, *(f"{symbol}_{stage}" for stage in ("ini", "mid", "end"))]
            missing = [name for name in needed if getattr(self, name) is None]
            if missing:
                raise ValueError(f"a crop of one's own needs {', '.join(missing)} as well")
        return self
