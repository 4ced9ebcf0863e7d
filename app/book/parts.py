"""What every part of the book is made of: its base, and the plain kinds of its values."""

from typing import Annotated, Literal, get_args

from pydantic import BaseModel, ConfigDict, Field

Key = Annotated[
    str,
    Field(
        pattern=r"^[a-z0-9]+(-[a-z0-9]+)*$",
        max_length=60,
        description="small letters and digits, parted by hyphens",
    ),
]
Name = Annotated[str, Field(min_length=1, max_length=80)]
Fraction = Annotated[float, Field(ge=0, le=1)]
Share = Annotated[float, Field(gt=0, le=1)]
Percent = Annotated[float, Field(ge=0, le=100)]
Depth = Annotated[float, Field(ge=0, le=2000)]
Purpose = Literal["crop", "pre-plant", "germination", "leaching", "frost", "cooling", "injection"]
Variable = Literal["energy", "temperature", "wind", "rain"]
Surface = Literal["reference grass", "green cover", "bare soil", "water", "snow"]
SaidToBeDone = Literal["advised", "presumed", "reported", "metered", "measured"]


Stage = Literal["initial", "development", "mid-season", "late"]
STAGES: tuple[str, ...] = get_args(Stage)
Mad = Annotated[float, Field(gt=0, le=0.95)]


class Part(BaseModel):
    """A part of the book: unknown names are refused, numbers must be finite."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False, str_strip_whitespace=True)
