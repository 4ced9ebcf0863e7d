"""When to irrigate a field and how much: the decision for one morning."""

from dataclasses import dataclass, field

import numpy as np

from app.science import Bools, Days, Floats
from app.science.advice.system import ApplicationSystem


@dataclass(frozen=True, kw_only=True)
class Outlook:
    """The days ahead without any irrigation not yet counted on; the first is today.

    date (H,) datetime64[D], consecutive; depletion, limit, taw, etc (H,) [mm]: projected end of
    day depletion, its limit, TAW and unstressed ETc; allowed (H,) bool: no keep-off, inside the
    turn; p10, p90 (H,) [mm]: range of the projected depletion, or None.
    A NaN limit is never passed.
    """

    date: Days
    depletion: Floats
    limit: Floats
    taw: Floats
    etc: Floats
    allowed: Bools
    p10: Floats | None = None
    p90: Floats | None = None


@dataclass(frozen=True, kw_only=True)
class Advice:
    """One recommendation: standing, day, depths, hours, volume, and why.

    standing: late, due, soon, wet or easy. day: when to water, None for no need or no chance.
    net_mm, gross_mm, hours, volume_m3: 0 when `day` is None. reason: code (see `decide`), with
    the figures of its sentence. limit_day: first day that closes past the limit, None within the
    horizon. falling_behind: the system cannot hold the limit over the horizon. unsure: an input
    is stale or the range too wide.
    """

    standing: str
    day: np.datetime64 | None
    net_mm: float
    gross_mm: float
    hours: float
    volume_m3: float
    reason: str
    figures: dict[str, float | str] = field(default_factory=dict)
    limit_day: np.datetime64 | None = None
    falling_behind: bool = False
    unsure: bool = False


def decide(
    outlook: Outlook,
    depletion_now: float,
    system: ApplicationSystem,
    area_ha: float,
    refill_to_mm: float = 0.0,
    rain_room_mm: float = 0.0,
    last_irrigation: np.datetime64 | None = None,
    *,
    leaching_requirement: float = 0.0,
    intake_mm: float | None = None,
    input_age_days: int = 0,
) -> Advice:
    """Decide standing, day and depth."""
    raise NotImplementedError
