"""What a season is called: its crop, its day, its stage."""

from collections.abc import Sequence
from datetime import date
from functools import cache
from itertools import accumulate

from app import handbook
from app.wording import STAGES


@cache
def crop_name(crop: str, whole: bool = False) -> str:
    """The handbook's name of a crop, without its asides unless `whole`; the id where the handbook
    has none."""
    row = handbook.crops().get(crop)
    name = row.crop_name if row is not None else crop.replace("_", " ")
    short = name if whole else name.split(":")[0].split("(")[0].split(", cutting")[0].strip()
    return short[:1].lower() + short[1:]


@cache
def published_stages(crop: str) -> Sequence[int] | None:
    """The handbook's stage lengths of a crop, None where the handbook does not know it."""
    return handbook.usable(crop, "single").stage_days if crop in handbook.crops() else None


def season_day(planting: date, today: date) -> int:
    """The day of the season; the planting day is day 1."""
    return (today - planting).days + 1


def stage(stage_days: Sequence[int] | None, day: int) -> str:
    """The stage a day of the season falls in, or nothing where the lengths are not known."""
    if not stage_days or day < 1:
        return ""
    for name, end in zip(STAGES, accumulate(stage_days), strict=False):
        if day <= end:
            return name
    return ""


def season_words(
    crop: str | None, planting: date | None, stage_days: Sequence[int] | None, today: date
) -> str:
    """`maize, day 68, mid-season`."""
    if crop is None or planting is None:
        return ""
    day = season_day(planting, today)
    name = stage(stage_days or published_stages(crop), day)
    return f"{crop_name(crop)}, day {day}" + (f", {name}" if name else "")
