"""Whether a system can hold the limit over the days ahead, and when it can be used."""

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


def keeps_up(
    depletion_now: float,
    change: Floats,
    limit: Floats,
    may_start: Bools,
    net_least: float,
    net_most: float,
    gap: int,
) -> bool:
    """Whether some plain use of the chances holds the limit from the first chance on.

    Tried: at every chance with room; only where waiting for the next chance would pass the limit;
    and the latter after an early first application. change and limit (H,) [mm]; may_start (H,);
    net_least and net_most [mm] of an application; gap: days from one start to the next. A field
    past its limit at the first chance may recover within the horizon. True without a chance.
    """
    if not may_start.any():
        return True
    return any(
        _holds(depletion_now, change, limit, may_start, net_least, net_most, gap, eager)
        for eager in ("always", "never", "first")
    )


def _holds(
    depletion: float,
    change: Floats,
    limit: Floats,
    may_start: Bools,
    net_least: float,
    net_most: float,
    gap: int,
    eager: str,
) -> bool:
    first = int(np.argmax(may_start))
    next_start, applied = first, False
    recovering = False
    for day in range(change.size):
        if day == first:
            recovering = depletion > limit[day]
        if may_start[day] and day >= next_start:
            wanted = eager == "always" or (eager == "first" and not applied)
            roomy = wanted and depletion >= net_least
            if roomy or _passes(depletion, change, limit, may_start, day):
                net = min(net_most, max(depletion, net_least))
                depletion = max(depletion - net, min(0.0, depletion))
                next_start, applied = day + gap, True
        depletion = max(depletion + float(change[day]), min(0.0, depletion))
        if day >= first and depletion > limit[day]:
            if not recovering:
                return False
        else:
            recovering = False
    return not recovering


def _passes(depletion: float, change: Floats, limit: Floats, may_start: Bools, day: int) -> bool:
    """Whether waiting from `day` to the next chance passes the limit."""
    for later in range(day, change.size):
        if later > day and may_start[later]:
            return False
        depletion += float(change[later])
        if depletion > limit[later]:
            return True
    return False
