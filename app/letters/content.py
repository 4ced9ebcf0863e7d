"""What a letter says, before it is worded: figures in SI, days as dates, codes, names.

Kept with the letter when it is released, so that a later correction, the calendar and the answers
know what was advised.
"""

from datetime import date
from typing import Literal

from pydantic import BaseModel, ConfigDict


def one_line(text: str) -> str:
    """A text fit for a header or a calendar: one line, nothing that cannot be printed."""
    return "".join(sign for sign in " ".join(text.split()) if sign.isprintable())


class Part(BaseModel):
    """A part of a letter; never changed once made."""

    model_config = ConfigDict(frozen=True, extra="forbid")


class Item(Part):
    """Water for one field on one day. `uid` stays the same when the advice of the week changes.

    expected: follows another application of the same field, so it hangs on that and the weather.
    """

    number: int
    uid: str
    field_key: str
    field: str
    day: date
    hours: float
    gross_mm: float
    expected: bool = False
    decided: bool = False
    """Set by the advisor, in place of what was advised."""


class Doubt(Part):
    """Why fields are unsure. kind stale: `station` silent since `day` (None: always), `late` on;
    range: `days` between early and late; morning: the figures are of `day`; other."""

    kind: Literal["stale", "range", "morning", "other"]
    fields: list[str] = []
    station: str = ""
    day: date | None = None
    days: int = 0


class Trouble(Part):
    """A field that advice cannot help in time: its reason's code."""

    field: str
    reason: Literal["no_chance", "no_chance_in_time", "falling_behind"]


class Withheld(Part):
    """A field whose water the advisor withholds through a day, and why."""

    field: str
    until: date
    note: str


class Past(Part):
    """A field's last seven days [mm]: rain, crop ET, gross application."""

    field: str
    area_ha: float
    rain_mm: float
    used_mm: float
    applied_mm: float


class Energy(Part):
    """How a station's days obtained their energy: rung to number of days."""

    station: str
    rungs: dict[int, int]


class Dryness(Part):
    """A field's depletion this morning, its range, limit and TAW [mm]."""

    field: str
    depletion_mm: float
    p10_mm: float
    p90_mm: float
    limit_mm: float
    taw_mm: float


class Content(Part):
    """One letter of one week about one farm; `morning` is the one whose advice it carries."""

    farm_key: str
    farm: str
    morning: date
    first_day: date
    last_day: date
    items: list[Item]
    doubts: list[Doubt]
    troubles: list[Trouble]
    rest: list[str]
    past_first: date
    past_last: date
    past: list[Past]
    energy: list[Energy]
    dryness: list[Dryness]
    note: str = ""
    signed: str = ""
    signed_for: str = ""
    revision: int = 0
    withheld: list[Withheld] = []
    changed: list[str] = []
    """Fields for which a correction is written."""

    @property
    def watered(self) -> list[str]:
        """The fields to water, in the order of their days."""
        return list(dict.fromkeys(item.field for item in self.items))

    @property
    def fields(self) -> int:
        """How many fields the letter speaks of."""
        return len(self.dryness)
