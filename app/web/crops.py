"""What a season is called: its crop, its day, its stage."""

import csv
from datetime import date
from functools import cache
from itertools import accumulate
from pathlib import Path

from app import handbook
from app.wording import STAGES


@cache
def crop_name(crop: str) -> str:
    """The handbook's name of a crop without its asides; the id where the handbook has none."""
    path = Path(handbook.__file__).with_name("crops.csv")
    with path.open(encoding="utf-8", newline="") as file:
        names = {row["crop_id"]: row["crop_name"] for row in csv.DictReader(file)}
    name = names.get(crop, crop.replace("_", " "))
    short = name.split(":")[0].split("(")[0].strip()
    return short[:1].lower() + short[1:]


def season_day(planting: date, today: date) -> int:
    """The day of the season; the planting day is day 1."""
    return (today - planting).days + 1


def stage(stage_days: list[int] | None, day: int) -> str:
    """The stage a day of the season falls in, or nothing where the lengths are not known."""
    if not stage_days or day < 1:
        return ""
    for name, end in zip(STAGES, accumulate(stage_days), strict=False):
        if day <= end:
            return name
    return ""


def season_words(
    crop: str | None, planting: date | None, stage_days: list[int] | None, today: date
) -> str:
    """`maize, day 68, mid-season`."""
    if crop is None or planting is None:
        return ""
    day = season_day(planting, today)
    name = stage(stage_days, day)
    return f"{crop_name(crop)}, day {day}" + (f", {name}" if name else "")
