"""The shape of a book file, validated whole before anything is stored.

Every part carries a `key`, unique among its kind; parts name each other by key. Loading a book
twice changes nothing; loading a changed book changes what differs and leaves the rest. Depths are
mm, areas ha, heights and root depths m, water contents m3 of water per m3 of soil, fractions 0-1.
"""

import json
from datetime import date
from itertools import pairwise
from pathlib import Path
from typing import Annotated, Any, Literal, Self, get_args
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from pydantic import Field, ValidationError, model_validator

from app.book.parts import (
    Depth,
    Key,
    Name,
    Part,
    Percent,
    Purpose,
    SaidToBeDone,
    Share,
    Surface,
    Variable,
)
from app.book.season import SeasonPart
from app.book.supply import SupplyPart
from app.errors import InputError


class WindFactorPart(Part):
    """Factor by wind u [m/s]: linear k + a u, or saturating 1 + k a u / (k + a u)."""

    form: Literal["linear", "saturating"]
    k: Annotated[float, Field(ge=-2, le=2)]
    a: Annotated[float, Field(ge=-1, le=1)]


class NetWindPart(Part):
    """Factors of readings above zero, and of the others; no factor where not given."""

    positive: WindFactorPart | None = None
    negative: WindFactorPart | None = None


def known_zone(name: str) -> None:
    """Nothing for an IANA zone; ValueError for anything else."""
    try:
        ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, IsADirectoryError):
        raise ValueError(f"time_zone {name!r} is no IANA zone such as 'America/Boise'") from None


class StationPart(Part):
    """A weather station: where it stands and what lies under its radiometers."""

    key: Key
    name: Name
    latitude_deg: Annotated[float, Field(ge=-90, le=90)]
    longitude_deg: Annotated[float, Field(ge=-180, le=180)]
    elevation_m: Annotated[float, Field(ge=-430, le=6000)]
    utc_offset_h: Annotated[
        float,
        Field(ge=-12, le=14, description="standard time all year, such as -7"),
    ]
    time_zone: str | None = Field(None, description="IANA zone of a logger on civil time")
    wind_height_m: Annotated[float, Field(gt=0.2, le=100)] = Field(
        2.0, description="height of the anemometer"
    )
    reference_surface: bool = Field(False, description="clipped, watered grass under the sensors")
    surface: Surface | None = Field(
        None, description="what lies under the radiometers; the albedo is held against it"
    )
    teacher: Key | None = Field(
        None, description="a station whose measured days teach this one's model of net radiation"
    )
    arid: bool = Field(
        False,
        description="dry surroundings: an unmeasured dew point is 2 degC below Tmin",
    )
    coastal: bool = Field(False, description="solar from temperature range as near a large water")
    et_step: Literal["daily", "hourly"] = Field(
        "daily", description="reference ET by the day, or by the hour and summed"
    )
    net_wind: NetWindPart | None = Field(
        None, description="wind correction of a single net sensor, as its certificate states it"
    )
    stands_in: Key | None = Field(
        None, description="the field over whose crop its heat fluxes are measured"
    )

    @model_validator(mode="after")
    def _zone_is_known(self) -> Self:
        if self.time_zone is not None:
            known_zone(self.time_zone)
        return self


class LayerPart(Part):
    """A soil layer, from the one above to `bottom_m`: lab values, else of its texture class."""

    bottom_m: Annotated[float, Field(gt=0, le=5)]
    texture: str | None = Field(None, description="texture_id of the handbook's soils")
    sand: Percent | None = Field(None, description="% by weight of the fine earth, with clay")
    clay: Percent | None = None
    organic_matter: Annotated[float, Field(ge=0, le=8)] = Field(2.5, description="%")
    gravel: Annotated[float, Field(ge=0, le=80)] = Field(
        0.0, description="% by weight of the whole soil"
    )
    field_capacity: Annotated[float, Field(gt=0, lt=0.8)] | None = None
    wilting_point: Annotated[float, Field(ge=0, lt=0.7)] | None = None
    saturation: Annotated[float, Field(gt=0, lt=0.95)] | None = None

    @model_validator(mode="after")
    def _water_held(self) -> Self:
        if (self.sand is None) != (self.clay is None):
            raise ValueError("give both sand and clay, or neither")
        if self.texture is not None and self.sand is not None:
            raise ValueError("give a texture or sand and clay, not both")
        told = self.texture is not None or self.sand is not None
        if not told and (self.field_capacity is None or self.wilting_point is None):
            raise ValueError(
                "give a texture, or sand and clay, or both field_capacity and wilting_point"
            )
        if (
            self.field_capacity is not None
            and self.wilting_point is not None
            and self.field_capacity <= self.wilting_point
        ):
            raise ValueError("field_capacity must be above wilting_point")
        return self


class SoilPart(Part):
    """A soil profile with its evaporation layer, runoff and drainage."""

    key: Key
    name: Name
    layers: Annotated[list[LayerPart], Field(min_length=1, max_length=12)]
    evaporation_depth_m: Annotated[float, Field(ge=0.05, le=0.2)] = 0.10
    rew_mm: Annotated[float, Field(gt=0, le=20)] | None = Field(
        None, description="readily evaporable water; of the top layer's texture when not given"
    )
    tew_mm: Annotated[float, Field(gt=0, le=60)] | None = None
    curve_number: Annotated[float, Field(ge=30, le=100)] | None = Field(
        None, description="for runoff; no runoff is reckoned when not given"
    )
    drainage_days: Annotated[int, Field(ge=0, le=10)] = Field(
        0, description="0: water above field capacity drains the same day; N: over N + 1 days"
    )
    intake_mm_h: Annotated[float, Field(gt=0, le=500)] | None = Field(
        None, description="basic intake rate, against which applications are held"
    )

    @model_validator(mode="after")
    def _deeper_and_deeper(self) -> Self:
        bottoms = [layer.bottom_m for layer in self.layers]
        if any(below <= above for above, below in pairwise(bottoms)):
            raise ValueError(f"bottom_m must grow from layer to layer, not {bottoms}")
        return self


class EmitterLinePart(Part):
    """A straight line of emitters along a plant row, and the strip it wets (NEH 623 chapter 7)."""

    emitters_per_plant: Annotated[float, Field(gt=0, le=100)]
    spacing_m: Annotated[float, Field(gt=0, le=10)] = Field(description="between its emitters")
    strip_m: Annotated[float, Field(gt=0, le=10)] = Field(description="width of the wetted strip")
    plant_area_m2: Annotated[float, Field(gt=0, le=500)] = Field(description="of one plant")


class SystemPart(Part):
    """An application system and what it can deliver. Rates and depths are gross."""

    key: Key
    name: Name
    kind: Name = Field(description="plain words, such as 'centre pivot'")
    efficiency: Annotated[float, Field(gt=0.2, le=1)] = Field(
        description="net over gross, a fraction such as 0.85"
    )
    rate_mm_h: Annotated[float, Field(gt=0, le=200)] = Field(
        description="gross depth an hour over the whole field while it runs"
    )
    wetting: str = Field("sprinkler", description="method_id of the handbook's wetted fractions")
    wetted_fraction: Share | None = Field(
        None, description="of the surface, by an application; of `wetting` when not given"
    )
    lines: list[EmitterLinePart] = Field(
        [], description="emitters run together, whose fractions add up to wetted_fraction"
    )
    same_day: Literal["irrigation", "weighted"] = Field(
        "irrigation", description="wetted fraction of a day with rain as well"
    )
    under_canopy: bool = Field(False, description="drip or trickle that lies in the crop's shade")
    root_wetted_fraction: Share = Field(1.0, description="of the root zone that is ever wetted")
    least_mm: Depth = Field(0, description="least gross depth of one application")
    most_mm: Annotated[float, Field(gt=0, le=500)] = Field(
        150, description="most gross depth of one application"
    )
    interval_days: Annotated[int, Field(ge=1, le=60)] = Field(
        1, description="least days from one application to the next"
    )
    cover_days: Annotated[int, Field(ge=1, le=30)] = Field(
        1, description="days it takes to cover the field once"
    )
    hours_per_day: Annotated[float, Field(gt=0, le=24)] = Field(
        24, description="most hours it can run in a day"
    )

    @model_validator(mode="after")
    def _least_below_most(self) -> Self:
        if self.least_mm > self.most_mm:
            raise ValueError(f"least_mm {self.least_mm} is above most_mm {self.most_mm}")
        if self.lines and self.wetted_fraction is not None:
            raise ValueError("give wetted_fraction or lines, not both")
        return self


Weekday = Literal["monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday"]
WEEKDAYS: tuple[str, ...] = get_args(Weekday)


class RecipientPart(Part):
    """Somebody who gets the farm's weekly letter."""

    name: Name
    address: Annotated[
        str,
        Field(
            max_length=254,
            pattern=r"^[A-Za-z0-9.!#$%&'*+/=?^_`{|}~-]+@[A-Za-z0-9-]+(\.[A-Za-z0-9-]+)+$",
            description="e-mail address",
        ),
    ]
    language: Literal["en", "es"] = "en"
    units: Literal["metric", "us"] = "metric"
    weekday: Weekday = "sunday"
    hour: Annotated[int, Field(ge=0, le=23, description="in the farm's time zone")] = 18
    paused: bool = False


class FarmPart(Part):
    """A farm, who answers for it, and who gets its letters."""

    key: Key
    name: Name
    grower: Name | None = None
    advisor: Name | None = Field(None, description="signs the farm's letters")
    time_zone: str | None = Field(
        None, description="IANA zone of the farm; the fixed offset of its station if not given"
    )
    letters: Literal["by hand", "automatic"] = Field(
        "by hand", description="whether a letter waits for the advisor's release"
    )
    presume: bool = Field(
        False, description="water advised for a day counts as run the morning after, till told"
    )
    recipients: list[RecipientPart] = Field([])

    @model_validator(mode="after")
    def _zone_and_addresses(self) -> Self:
        if self.time_zone is not None:
            known_zone(self.time_zone)
        addresses = [part.address.lower() for part in self.recipients]
        if len(set(addresses)) < len(addresses):
            raise ValueError("an address stands twice among its recipients; keep one")
        return self


class SourcePart(Part):
    """From which station a variable of a field comes, from a date on."""

    variable: Variable
    station: Key
    since: date | None = None


class WaterTablePart(Part):
    """Depth of the water table below the surface from a date on; none: out of reach."""

    since: date
    depth_m: Annotated[float, Field(gt=0, le=30)] | None


class KeepOffPart(Part):
    """Dates, both included, on which a field must not be irrigated."""

    first: date
    last: date
    why: Name

    @model_validator(mode="after")
    def _forward(self) -> Self:
        if self.last < self.first:
            raise ValueError(f"last {self.last} is before first {self.first}")
        return self


class BlockPart(Part):
    """A part of a field with its own ledger."""

    key: Key
    name: Name
    area_ha: Annotated[float, Field(gt=0, le=100_000)]
    soil: Key | None = None
    system: Key | None = None


class FieldPart(Part):
    """A field; without blocks it is one block, and the word is not shown."""

    key: Key
    name: Name
    farm: Key
    area_ha: Annotated[float, Field(gt=0, le=100_000)]
    station: Key = Field(description="the station for every variable that `sources` does not name")
    soil: Key
    system: Key
    sources: list[SourcePart] = Field([])
    blocks: list[BlockPart] = Field([])
    water_table: list[WaterTablePart] = Field([], description="depth of a water table, by date")
    water_ec_ds_m: Annotated[float, Field(gt=0, le=50)] | None = Field(
        None, description="electrical conductivity of the irrigation water"
    )
    leaching_fraction: Annotated[float, Field(gt=0, le=1)] = Field(
        0.15, description="share of the water that passes the roots, for the soil's salinity"
    )
    managed_by: str = Field("driest", description="'driest', 'median', or a block's key")
    keep_offs: list[KeepOffPart] = Field([])


class IrrigationPart(Part):
    """Water put on a field, on one day, as it was entered: exactly one amount."""

    field: Key
    block: Key | None = None
    day: date
    gross_mm: Annotated[float, Field(gt=0, le=1000)] | None = None
    net_mm: Annotated[float, Field(gt=0, le=1000)] | None = None
    hours: Annotated[float, Field(gt=0, le=1000)] | None = None
    volume_m3: Annotated[float, Field(gt=0, le=1e8)] | None = None
    purpose: Purpose = "crop"
    confirmation: SaidToBeDone = "reported"
    note: str | None = None

    @model_validator(mode="after")
    def _one_amount(self) -> Self:
        given = [self.gross_mm, self.net_mm, self.hours, self.volume_m3]
        if sum(value is not None for value in given) != 1:
            raise ValueError("give exactly one of gross_mm, net_mm, hours, volume_m3")
        return self


class RainPart(Part):
    """Rain of a field's own gauge on one day, in place of its station's."""

    field: Key
    day: date
    rain_mm: Depth
    note: str | None = None


class Book(Part):
    """A whole book: parts have a key, unique among their kind, and name each other by it.

    Depths are mm, areas ha, heights and root depths m, water contents m3 a m3 of soil, fractions
    0-1, dates as 2026-07-14. A season is known by its field and planting (a date put right by at
    most 30 days moves it); what a later book leaves out stays as it was.
    """

    stations: list[StationPart] = Field([])
    soils: list[SoilPart] = Field([])
    systems: list[SystemPart] = Field([])
    farms: list[FarmPart] = Field([])
    fields: list[FieldPart] = Field([])
    supplies: list[SupplyPart] = Field([])
    seasons: list[SeasonPart] = Field([])
    irrigations: list[IrrigationPart] = Field([])
    rain: list[RainPart] = Field([])


class BookError(InputError):
    """A book that cannot be loaded; `problems` has one line for each place."""

    def __init__(self, problems: list[str]) -> None:
        super().__init__("\n".join(problems))
        self.problems = problems


def read_book(path: Path) -> Book:
    """The validated book of a file; raises BookError naming each place, value and reason."""
    try:
        raw = json.loads(path.read_text(encoding="utf-8-sig"))
    except OSError as error:
        raise BookError([f"{path}: cannot be read ({error.strerror})"]) from None
    except UnicodeDecodeError:
        raise BookError([f"{path}: is not UTF-8 text; save it as UTF-8"]) from None
    except json.JSONDecodeError as error:
        raise BookError(
            [f"{path}, line {error.lineno}, column {error.colno}: not JSON ({error.msg})"]
        ) from None
    try:
        return Book.model_validate(raw)
    except ValidationError as error:
        raise BookError([_place(path, raw, item) for item in error.errors()]) from None


def _place(path: Path, raw: Any, item: Any) -> str:
    """One line for one validation error: `book.json, fields 3 (mill-bottom), area_ha: ...`."""
    words: list[str] = []
    here = raw
    for step in item["loc"]:
        try:
            here = here[step]
        except (KeyError, IndexError, TypeError):
            here = None
        if isinstance(step, int):
            label = here.get("key") or here.get("field") if isinstance(here, dict) else None
            words[-1:] = [
                f"{words[-1] if words else 'item'} {step + 1}" + (f" ({label})" if label else "")
            ]
        else:
            words.append(str(step))
    value = item.get("input")
    shown = "" if isinstance(value, (dict, list)) else f" (it is {value!r})"
    why = PLAINER.get(item["type"], item["msg"].removeprefix("Value error, "))
    return f"{path}, {', '.join(words) or 'top'}: {why}{shown}"


PLAINER = {
    "string_pattern_mismatch": "must be small letters and digits, parted by hyphens",
    "extra_forbidden": "there is no such name here; `rillbook schema` lists them",
    "missing": "is missing",
    "model_type": "must be an object in braces, {}",
    "list_type": "must be a list in brackets, []",
    "date_parsing": "must be a date such as 2026-07-14",
    "date_from_datetime_parsing": "must be a date such as 2026-07-14",
}
"""Kinds of validation errors whose own words speak of programs, not of books."""
