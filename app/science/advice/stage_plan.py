"""A deficit plan by stage: what an application leaves unfilled on purpose."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from app.science import Floats

Four = Sequence[float | None] | None


@dataclass(frozen=True, kw_only=True)
class StagePlan:
    """A plan day by day, each (H,): refill [mm], depletion an application leaves; target 0-1, the
    share of the crop's use it gives back; floor [mm], depletion it never leaves more than."""

    refill: Floats
    target: Floats
    floor: Floats

    def leaves(self, day: int, opening: float) -> float:
        """Depletion [mm] that an application on `day` (index) leaves of `opening` [mm]: the share
        `target` of what is above `refill` is given back, and never more than `floor` is left."""
        refill = float(self.refill[day])
        room = max(opening - refill, 0.0)
        return min(refill + (1.0 - float(self.target[day])) * room, float(self.floor[day]))

    def since(self, day: int) -> "StagePlan":
        """The plan from `day` (index) on."""
        return StagePlan(refill=self.refill[day:], target=self.target[day:], floor=self.floor[day:])


def stage_plan(
    stage: NDArray[np.int8],
    taw: Floats,
    refill_to_mm: float,
    refill: Four,
    target: Four,
    floor: Four,
) -> StagePlan | None:
    """The plan of days (H,) in their stages 1-4, with TAW (H,) [mm]; None where nothing is planned.

    refill, floor: shares of TAW by stage, None for `refill_to_mm` and for no floor; target: share
    of ETc by stage, None for all of it. The project's own rule.
    """
    if refill is None and target is None and floor is None:
        return None

    def by_day(four: Four) -> Floats:
        return np.array([np.nan] * 4 if four is None else four, dtype=np.float64)[stage - 1]

    filled, share, deepest = by_day(refill), by_day(target), by_day(floor)
    return StagePlan(
        refill=np.where(np.isnan(filled), refill_to_mm, filled * taw),
        target=np.where(np.isnan(share), 1.0, share),
        floor=np.where(np.isnan(deepest), np.inf, deepest * taw),
    )
