"""When a system can be used, and whether a first application holds the limit from there on."""

from dataclasses import dataclass

import numpy as np

from app.science import Bools, Floats


def chances(allowed: Bools, ready: int, cover_days: int) -> Bools:
    """Days on which an application may start, (H,).

    allowed (H,): no keep-off, inside the turn. ready: first day (index) the interval since the
    last irrigation allows. All `cover_days` days from the start must be allowed; days beyond the
    horizon are taken as allowed.
    """
    days = allowed.size
    padded = np.concatenate((allowed, np.ones(cover_days - 1, dtype=np.bool_)))
    covered = np.lib.stride_tricks.sliding_window_view(padded, cover_days).all(axis=1)
    return np.asarray(covered & (np.arange(days) >= ready))


def daily_change(depletion_now: float, depletion: Floats, limit: Floats, etc: Floats) -> Floats:
    """Change of depletion [mm] on each day for a field kept within its limit, (H,).

    Where the projection runs dry past the limit, stress holds its ET back: there the unstressed
    etc counts instead. depletion, limit, etc (H,) [mm] of the projection.
    """
    opening = np.concatenate(([depletion_now], depletion[:-1]))
    change = depletion - opening
    stressed = (opening > limit) & (change > 0.0)
    return np.where(stressed, np.maximum(change, etc), change)


@dataclass(frozen=True, kw_only=True)
class Ahead:
    """The days ahead as a system meets them: opening, change and limit of depletion [mm] (H,),
    days an application may start (H,), net bounds [mm] of one application, depletion [mm] it
    leaves, and days from one start to the next."""

    opening: Floats
    change: Floats
    limit: Floats
    may_start: Bools
    net_least: float
    net_most: float
    leave: float
    gap: int


def holds(ahead: Ahead, start: int, net: float) -> bool:
    """Whether `net` [mm] on day `start` and plain use of the chances after it hold the limit.

    Plain use is water at every chance with room, or only where waiting for the next chance would
    pass the limit. A field past its limit at `start` may recover within the horizon. Days before
    `start` do not count.
    """
    return any(_holds(ahead, start, net, eager) for eager in (False, True))


def _holds(ahead: Ahead, start: int, net: float, eager: bool) -> bool:
    depletion = float(ahead.opening[start])
    recovering = depletion > ahead.limit[start]
    depletion = _after(depletion, net)
    next_start = start + ahead.gap
    for day in range(start, ahead.change.size):
        if day >= next_start and ahead.may_start[day]:
            room = depletion - ahead.leave
            if (eager and room >= ahead.net_least) or _passes(ahead, depletion, day):
                net = min(ahead.net_most, max(room, ahead.net_least))
                depletion = _after(depletion, net)
                next_start = day + ahead.gap
        depletion = max(depletion + float(ahead.change[day]), min(0.0, depletion))
        if depletion <= ahead.limit[day] or np.isnan(ahead.limit[day]):
            recovering = False
        elif not recovering:
            return False
    return not recovering


def _after(depletion: float, net: float) -> float:
    """Depletion after an application; what passes field capacity drains."""
    return max(depletion - net, min(0.0, depletion))


def _passes(ahead: Ahead, depletion: float, day: int) -> bool:
    """Whether waiting from `day` to the next chance passes the limit."""
    for later in range(day, ahead.change.size):
        if later > day and ahead.may_start[later]:
            return False
        depletion += float(ahead.change[later])
        if depletion > ahead.limit[later]:
            return True
    return False
