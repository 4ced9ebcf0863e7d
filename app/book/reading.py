"""A reading of soil water as somebody took it."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from app.book.parts import Part

Method = Literal["volumetric", "gravimetric", "neutron", "tension"]
Trust = Literal["weighed", "full", "none"]


class DepthPart(Part):
    """One depth: a water content [m3 m-3, or kg kg-1], a count ratio, or a tension [kPa]."""

    depth_m: Annotated[float, Field(ge=0.01, le=5)]
    value: Annotated[float, Field(ge=0, le=20000)]
    error: Annotated[float, Field(gt=0, le=0.3)] | None = Field(
        None, description="standard error of the content [m3 m-3]; 0.03 uncalibrated"
    )


class ReadingPart(Part):
    """Readings at one place and time, one or more depths; they correct the ledger's depletion."""

    method: Method
    hour: Annotated[float, Field(ge=0, le=24)] = 6.0
    depths: Annotated[list[DepthPart], Field(min_length=1, max_length=12)]
    bulk_density: Annotated[float, Field(ge=0.5, le=2.2)] | None = Field(
        None, description="dry [g cm-3], for readings by weight"
    )
    slope: float | None = Field(None, description="of the probe's calibration in this soil")
    intercept: float | None = None
    trust: Trust = Field("weighed", description="weighed against the ledger, full, or set aside")

    @model_validator(mode="after")
    def _whole(self) -> Self:
        if self.method == "gravimetric" and self.bulk_density is None:
            raise ValueError("a reading by weight needs the bulk_density of the soil")
        if self.method == "neutron" and (self.slope is None or self.intercept is None):
            raise ValueError("a count ratio needs slope and intercept of its calibration")
        if self.method in ("volumetric", "gravimetric") and any(
            part.value > 1 for part in self.depths
        ):
            raise ValueError("a water content is a fraction such as 0.24, at most 1")
        depths = [part.depth_m for part in self.depths]
        if len(set(depths)) != len(depths):
            raise ValueError("each depth stands once")
        return self
