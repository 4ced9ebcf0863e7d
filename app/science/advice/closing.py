"""Closing water: the last applications of a season that still pay."""

from dataclasses import dataclass

import numpy as np

from app.science import Bools, Days, Floats
from app.science.advice.keeping_up import daily_change

ALLOWED_AT_MATURITY = 0.6
"""Depletion a crop may be left with at maturity, as a share of TAW (working value)."""
LEAST_SHORT_MM = 0.05
"""A shortfall at maturity below this asks for no more water (rounding)."""


@dataclass(frozen=True, kw_only=True)
class Closing:
    """The applications up to maturity, the last of them the last that pays.

    day, net (n,) datetime64[D] and [mm], in order, none where the soil already holds enough.
    left_mm: depletion at the close of the last day with them; allowed_mm: what is allowed there;
    without_mm: with no water at all, were the crop not stressed. short_mm: what is missing where
    chances and depths do not reach the allowed depletion, else 0.
    """

    day: Days
    net: Floats
    left_mm: float
    allowed_mm: float
    without_mm: float
    short_mm: float


def closing(
    date: Days,
    depletion_now: float,
    depletion: Floats,
    limit: Floats,
    etc: Floats,
    may_start: Bools,
    allowed_mm: float,
    *,
    net_least: float = 0.0,
    net_most: float = np.inf,
    gap: int = 1,
    refill_to_mm: float = 0.0,
) -> Closing:
    """The applications from today to maturity that leave `allowed_mm` [mm] there.

    date (H,) consecutive, today to maturity; depletion_now [mm] at today's opening; depletion,
    limit, etc (H,) [mm]: projected without water, as in `Outlook`; may_start (H,) bool. net_least,
    net_most [mm] of one application; gap: days from start to start; refill_to_mm: depletion left.
    An application is given at the last chance before the limit (or what is allowed at maturity,
    where that is less), refills the root zone, and is cut to what maturity still lacks. It pays
    only while depletion at maturity would otherwise pass what is allowed; after the last one the
    limit may be passed, for the crop lives on what is stored. One below `net_least` is raised to
    it, or does not pay where the limit holds to maturity without it. Raises ValueError for
    NaN in depletion or etc, and for sizes that differ. Source: the project's own rule (methods
    page, closing water).
    """
    for name, values in (("depletion", depletion), ("limit", limit), ("etc", etc)):
        if values.shape != date.shape:
            raise ValueError(f"{name} has shape {values.shape}; its dates have {date.shape}")
    if date.size == 0 or np.isnan(depletion).any() or np.isnan(etc).any():
        raise ValueError("closing water needs the depletion and ETc of every day to maturity")
    change = daily_change(depletion_now, depletion, limit, etc)
    to_come = np.cumsum(change[::-1])[::-1]  # from each day's opening to maturity
    bound = np.fmin(limit, allowed_mm)
    now, ready = float(depletion_now), 0
    days: list[int] = []
    nets: list[float] = []
    for day in range(date.size):
        short = now + float(to_come[day]) - allowed_mm
        if short > LEAST_SHORT_MM and day >= ready and may_start[day]:
            following = _next_chance(may_start, day)
            dry = now + np.cumsum(change[day:])
            pays = short >= net_least or bool((dry > limit[day:]).any())
            if pays and (dry > bound[day:])[: following - day].any():
                net = min(max(min(now - refill_to_mm, short), net_least), net_most)
                if net > 0.0:
                    days.append(day)
                    nets.append(net)
                    now, ready = max(now - net, min(0.0, now)), day + gap
        now += float(change[day])
    return Closing(
        day=date[days],
        net=np.array(nets, dtype=np.float64),
        left_mm=now,
        allowed_mm=allowed_mm,
        without_mm=float(depletion_now + to_come[0]),
        short_mm=max(now - allowed_mm, 0.0) if now - allowed_mm > LEAST_SHORT_MM else 0.0,
    )


def _next_chance(may_start: Bools, day: int) -> int:
    later = np.flatnonzero(may_start[day + 1 :])
    return day + 1 + int(later[0]) if later.size else may_start.size
