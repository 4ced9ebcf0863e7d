"""Stations with trouble: silent, fallen to a lower rung, or with checks that failed."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date, timedelta

from app import wording
from app.storage.pages import RecentDay, StationRow
from app.wording import flag_words, why_not_rung

STALE_DAYS = 2


@dataclass(frozen=True)
class Trouble:
    """One station's trouble, worded; `stale` when its data are older than two days."""

    key: str
    name: str
    says: tuple[str, ...]
    stale: bool
    fields: int


def age_days(last: date | None, today: date) -> int | None:
    """Days between a station's last day with data and today; 1 is yesterday, as it should be."""
    return None if last is None else (today - last).days


COUNTED_ONLY = {"night_offset", "window_undecidable"}
"""Flags that the Station page counts, and that call for nobody."""


def silence(last: date | None, today: date) -> str:
    """What to say of a station by the last day it sent; nothing when yesterday is there."""
    age = age_days(last, today)
    if last is None or age is None:
        return "Has sent nothing yet."
    if age < 0:
        return f"Holds readings of {wording.full_day(last)}, which is to come; see to its clock."
    if age <= 1:
        return ""
    if age == STALE_DAYS:
        return f"Yesterday is missing; last data {wording.short_day(last)}."
    return f"Silent; last data {wording.short_day(last)}."


def usual_rung(days: Sequence[RecentDay]) -> int:
    """The rung that served most of the days; of two as frequent the better."""
    rungs = [day.rung for day in days]
    return min(set(rungs), key=lambda rung: (-rungs.count(rung), rung))


def rung_fall(days: Sequence[RecentDay]) -> str:
    """What to say when the last day rests on a lower rung than the days before it."""
    if len(days) < 3 or days[-1].rung <= (usual := usual_rung(days[:-1])):
        return ""
    since = days[-1].day
    for day in reversed(days):
        if day.rung <= usual:
            break
        since = day.day
    reason = why_not_rung(days[-1].why_not, usual)
    return (
        f"Energy fell from {wording.rung(usual)} to {wording.rung(days[-1].rung)} since "
        f"{wording.short_day(since)}" + (f": {reason}." if reason else ".") + _cost(days, usual)
    )


def _cost(days: Sequence[RecentDay], usual: int) -> str:
    """What the fall costs in range: the mean of ETo's uncertainty before and since."""
    known = [(day.rung, day.eto_uncertainty) for day in days if day.eto_uncertainty is not None]
    ranges = [by for rung, by in known if rung == usual], [by for rung, by in known if rung > usual]
    if not all(ranges):
        return ""
    before, since = (wording.number(sum(found) / len(found), 2) for found in ranges)
    return f" ETo is known to ± {since} mm a day in place of ± {before}."


def raised(days: Sequence[RecentDay], today: date) -> str:
    """The checks that failed within the last two days; what is only counted is no trouble."""
    said: dict[str, None] = {}
    for day in days:
        if day.day >= today - timedelta(days=STALE_DAYS):
            faults = [f for f in day.flags.split() if f.partition("=")[0] not in COUNTED_ONLY]
            said.update(dict.fromkeys(flag_words(" ".join(faults))))
    text = "; ".join(said)
    return f"{text[:1].upper()}{text[1:]}." if said else ""


def troubles(
    stations: Iterable[StationRow],
    recent: Sequence[RecentDay],
    last: Mapping[int, date],
    fields: Mapping[int, int],
    today: date,
) -> list[Trouble]:
    """Every station with trouble, silent ones first."""
    found = []
    for station in stations:
        days = [day for day in recent if day.station_id == station.id]
        quiet = silence(last.get(station.id), today)
        says = [quiet, rung_fall(days), raised(days, today)]
        if any(says):
            age = age_days(last.get(station.id), today)
            found.append(
                Trouble(
                    station.key,
                    station.name,
                    tuple(text for text in says if text),
                    age is None or age > STALE_DAYS,
                    fields.get(station.id, 0),
                )
            )
    return sorted(found, key=lambda trouble: (not trouble.stale, trouble.name))
