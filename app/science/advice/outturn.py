"""How advice turned out: what was done, and how near the foretold depletion came."""

from dataclasses import dataclass

import numpy as np

from app.science import Bools, Floats

LEADS = (1, 3, 7)
# A day early or late, or a quarter more or less, still counts as advised (working values).
DAYS_OFF, SHARE_OFF = 1, 0.25
FOLLOWED, OTHERWISE, NOT_DONE, UNASKED, NO_NEED = (
    "followed", "otherwise", "not done", "unasked", "no need",
)  # fmt: skip


def done(advised_at: int | None, advised_net: float, net: Floats) -> str:
    """What was done on the days after an advice.

    advised_at: place of the advised day among the days, None for no water; advised_net [mm]; net
    (days,): net irrigation that came [mm], the first day that of the advice. Returns followed (on
    the day or a day beside it, within a quarter of the depth), otherwise (another day or depth),
    not done, unasked (water though none was asked for) or no need. NaN counts as no water.
    """
    water = np.nan_to_num(net)
    if advised_at is None:
        return UNASKED if (water > 0.0).any() else NO_NEED
    near = water[max(advised_at - DAYS_OFF, 0) : advised_at + DAYS_OFF + 1].sum()
    if near > 0.0 and abs(near - advised_net) <= SHARE_OFF * advised_net:
        return FOLLOWED
    return OTHERWISE if (water > 0.0).any() else NOT_DONE


def comparable(net: Floats) -> Bools:
    """Days whose depletion can be held against one foretold without water: none came up to them.

    net (..., days) [mm]; NaN (not known yet) makes its day and those after it not comparable.
    """
    return np.asarray(np.logical_and.accumulate(net == 0.0, axis=-1))


@dataclass(frozen=True)
class Skill:
    """At one lead: how many, mean error and RMSE [mm] of what was foretold, share of mornings
    whose depletion lay in the range, and RMSE [mm] of carrying the last week on."""

    lead: int
    n: int
    bias: float
    rmse: float
    covered: float
    persistence: float


def skill(
    foretold: Floats,
    low: Floats,
    high: Floats,
    known: Floats,
    persistence: Floats,
    use: Bools,
    leads: tuple[int, ...] = LEADS,
) -> list[Skill]:
    """Skill at each lead with a morning to show for it.

    foretold, low, high, known, persistence (mornings, days) [mm]: closing depletions of the days
    from the morning's own on; use: the days that can be compared. NaN is left out. Lead 1 is the
    first day. RMSE and bias are of foretold - known; coverage is of the mornings that had a range,
    persistence of those with a week before them, NaN without any.
    """
    found = []
    for lead in leads:
        if lead > known.shape[1]:
            continue
        column = lead - 1
        here = use[:, column] & ~np.isnan(known[:, column]) & ~np.isnan(foretold[:, column])
        if not here.any():
            continue
        error = foretold[here, column] - known[here, column]
        ranged = here & ~np.isnan(low[:, column]) & ~np.isnan(high[:, column])
        within = (low[ranged, column] <= known[ranged, column]) & (
            known[ranged, column] <= high[ranged, column]
        )
        both = here & ~np.isnan(persistence[:, column])
        plain = persistence[both, column] - known[both, column]
        found.append(
            Skill(
                lead=lead,
                n=int(here.sum()),
                bias=float(error.mean()),
                rmse=float(np.sqrt(np.mean(error**2))),
                covered=float(within.mean()) if ranged.any() else np.nan,
                persistence=float(np.sqrt(np.mean(plain**2))) if both.any() else np.nan,
            )
        )
    return found
