"""From a season of the book, and what was seen of it, to the season that science works on."""

from collections.abc import Sequence
from datetime import date
from typing import Any, NamedTuple

import numpy as np

from app import handbook
from app.book.parts import STAGES
from app.science.crop.curve import season_of_stand
from app.science.crop.degree_days import DegreeDays
from app.science.crop.mulch import Mulch
from app.science.crop.season import CropSeason
from app.science.crop.seen import CoverSeen, StageSeen
from app.science.crop.stand import Canopy


class Seen(NamedTuple):
    """Something seen of a crop on a day: kind "stage" (its number 1 to 4), "cover" (fraction, and
    height [m]) or "cutting"."""

    day: date
    kind: str
    amount: float = 0.0
    height_m: float = 0.0


def crop_season(details: dict[str, Any], planting: date, seen: Sequence[Seen] = ()) -> CropSeason:
    """A season: the handbook's figures of its crop under what the book overrides, with what the
    book says was seen and what was seen since (`seen`; of two on one day the later counts)."""
    figures = _own(details) if details.get("own_crop") else _published(details)
    every = [*_of_book(details), *seen]
    mulch, warmth, canopy = (details.get(name) for name in ("mulch", "degree_days", "canopy"))
    season = CropSeason(
        planting=np.datetime64(planting, "D"),
        coefficients=details["coefficients"],
        mad=details["mad"],
        climate_adjustment=details["climate_adjustment"],
        end=np.datetime64(details["end"], "D") if details["end"] else None,
        mad_by_stage=_four(details.get("mad_by_stage")),
        degree_days=None
        if warmth is None
        else DegreeDays(**{**warmth, "stage_sums": tuple(warmth["stage_sums"])}),
        stages_seen=tuple(
            StageSeen(date=day, stage=int(one.amount)) for day, one in _last(every, "stage")
        ),
        cover_seen=tuple(
            CoverSeen(date=day, cover=one.amount, height_m=one.height_m)
            for day, one in _last(every, "cover")
        ),
        canopy=Canopy() if canopy is None else Canopy(**canopy),
        cuttings=tuple(day for day, _ in _last(every, "cutting")),
        cycle_days=_four(details.get("cycle_days")),
        mulch=None if mulch is None else Mulch(**mulch),
        **figures,
    )
    stand = details.get("stand")
    return season if stand is None else season_of_stand(season, stand["cover"], stand["height_m"])


def _four(values: Any) -> Any:
    return None if values is None else tuple(values)


def _published(details: dict[str, Any]) -> dict[str, Any]:
    usable = handbook.usable(details["crop"], details["coefficients"])
    row = usable.row
    kind = "kcb" if details["coefficients"] == "dual" else "kc"
    return {
        **{
            f"k_{stage}": _over(details[f"{kind}_{stage}"], published)
            for stage, published in zip(("ini", "mid", "end"), usable.coefficients, strict=True)
        },
        "stage_days": tuple(details["stage_days"] or usable.stage_days),
        "kc_min": _over(details["kc_min"], 0.15),
        "height_max_m": _over(details["height_m"], row.height_max_m),
        "root_min_m": _over(details["root_depth_min_m"], row.root_depth_min_m),
        "root_max_m": _over(details["root_depth_max_m"], row.root_depth_max_m),
        "depletion_fraction": _over(details["depletion_fraction"], row.depletion_fraction),
        "perennial": row.perennial,
    }


def _own(details: dict[str, Any]) -> dict[str, Any]:
    """Figures of a crop the handbook does not have; the book has seen to it that all are given."""
    kind = "kcb" if details["coefficients"] == "dual" else "kc"
    return {
        **{f"k_{stage}": details[f"{kind}_{stage}"] for stage in ("ini", "mid", "end")},
        "stage_days": tuple(details["stage_days"]),
        "kc_min": _over(details["kc_min"], 0.15),
        "height_max_m": details["height_m"],
        "root_min_m": details["root_depth_min_m"],
        "root_max_m": details["root_depth_max_m"],
        "depletion_fraction": details["depletion_fraction"],
        "perennial": details["root_depth_min_m"] == details["root_depth_max_m"],
    }


def _over(given: float | None, published: float) -> float:
    return published if given is None else given


def _of_book(details: dict[str, Any]) -> list[Seen]:
    def day(part: Any) -> date:
        return date.fromisoformat(part)

    return [
        *(
            Seen(day(part["day"]), "stage", STAGES.index(part["stage"]) + 1)
            for part in details.get("stages", [])
        ),
        *(
            Seen(day(part["day"]), "cover", part["cover"], part["height_m"])
            for part in details.get("cover", [])
        ),
        *(Seen(day(part), "cutting") for part in details.get("cuttings", [])),
    ]


def _last(seen: Sequence[Seen], kind: str) -> list[tuple[np.datetime64, Seen]]:
    """The last word of each day on one kind, in order of days."""
    by_day = {one.day: one for one in seen if one.kind == kind}
    return [(np.datetime64(day, "D"), by_day[day]) for day in sorted(by_day)]
