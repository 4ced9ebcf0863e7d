"""A shared supply as the book states it: what it gives, when, at what price, and to whom."""

from datetime import date
from typing import Annotated, Literal, Self, get_args

from pydantic import Field, model_validator

from app.book.parts import Key, Name, Part

Flow = Annotated[float, Field(ge=0, le=1e6, description="m3 an hour at the headgate")]
Weekday = Literal["monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday"]
WEEKDAYS: tuple[str, ...] = get_args(Weekday)


class FlowPart(Part):
    """The flow from a date on, where it falls with the season."""

    since: date
    flow_m3_h: Flow


class TariffPart(Part):
    """Hours of the day at one price."""

    name: Name
    hours: Annotated[float, Field(gt=0, le=24, description="hours a day")]
    price_m3: Annotated[float, Field(ge=0, le=1000, description="cost of a cubic metre")] = 0.0


class TurnPart(Part):
    """A turn: from `first` on, every so many days, for so many days."""

    first: date
    every_days: Annotated[int, Field(ge=1, le=60)]
    for_days: Annotated[int, Field(ge=1, le=60)] = 1

    @model_validator(mode="after")
    def _shorter_than_the_round(self) -> Self:
        if self.for_days > self.every_days:
            raise ValueError(f"for_days {self.for_days} is above every_days {self.every_days}")
        return self


class AllocationPart(Part):
    """Water that may be taken from `first` to `last`, both included; of one farm, or of all."""

    first: date
    last: date
    volume_m3: Annotated[float, Field(ge=0, le=1e9)]
    farm: Key | None = None

    @model_validator(mode="after")
    def _forward(self) -> Self:
        if self.last < self.first:
            raise ValueError(f"last {self.last} is before first {self.first}")
        return self


class SupplyPart(Part):
    """A well, pump, ditch or canal turn, and the fields that hang on it."""

    key: Key
    name: Name
    flow_m3_h: Flow
    flows: list[FlowPart] = Field([], description="the flow from dates on")
    conveyance_loss: Annotated[
        float, Field(ge=0, le=0.9, description="share lost from headgate to field")
    ] = 0.0
    tariff: list[TariffPart] = Field(
        [], description="hours it runs, by price; 24 h without price if not given"
    )
    turn: TurnPart | None = Field(None, description="any day if not given")
    labour_days: list[Weekday] = Field([], description="days sets are moved on; any if not given")
    sets_a_day: Annotated[int, Field(ge=1, le=1000)] | None = Field(
        None, description="most sets that can be started on one day"
    )
    allocations: list[AllocationPart] = Field([])
    fields: Annotated[list[Key], Field(min_length=1, description="fields that hang on it")]

    @model_validator(mode="after")
    def _hours_of_a_day(self) -> Self:
        if sum(part.hours for part in self.tariff) > 24.0:
            raise ValueError("the hours of the tariff add up to more than 24 a day")
        if len(set(self.fields)) < len(self.fields):
            raise ValueError("a field stands twice among its fields; keep one")
        return self
