"""Water handed from one season to the next on the same soil."""

from dataclasses import dataclass

import numpy as np

from app.science.crop.ranges import check_range
from app.science.soil.profile import Profile


@dataclass(frozen=True, kw_only=True)
class Stores:
    """Root zone of `root_depth_m` and subsoil down to `deepest_m`: their depletions [mm]."""

    root_depth_m: float
    deepest_m: float
    depletion_mm: float
    subsoil_mm: float

    def __post_init__(self) -> None:
        check_range("root_depth_m", self.root_depth_m, 0.02, 10.0)
        check_range("deepest_m", self.deepest_m, self.root_depth_m, 10.0)


def carried_over(
    profile: Profile,
    before: Stores,
    root_depth_m: float,
    deepest_m: float,
    *,
    roots_before: float = 1.0,
    roots: float = 1.0,
) -> Stores:
    """The stores of the next season from those at the close of the one before.

    root_depth_m and deepest_m of the next season [m]; roots_before and roots: wetted fraction of
    the root zone in each. Each store is taken as dry in the same share all through, so that no
    water is made or lost where both seasons reach as deep; soil deeper than the season before
    reached counts as its subsoil, or as its root zone where that had none. A root zone above
    field capacity keeps its excess. Source: mass balance (working value).
    """
    wetted = before.depletion_mm / roots_before
    taw = np.asarray(profile.taw([before.root_depth_m, before.deepest_m, root_depth_m, deepest_m]))
    inner, outer, new, newest = (float(value) for value in taw)
    excess = min(wetted, 0.0)
    zone = max(wetted, 0.0) / inner if inner > 0.0 else 0.0
    below = before.subsoil_mm / roots_before / (outer - inner) if outer - inner > 1e-9 else zone

    def dry(to: float) -> float:
        """Depletion from the surface down to where TAW is `to`."""
        return zone * min(to, inner) + below * max(to - inner, 0.0)

    return Stores(
        root_depth_m=root_depth_m,
        deepest_m=deepest_m,
        depletion_mm=roots * (dry(new) + excess),
        subsoil_mm=roots * (dry(newest) - dry(new)),
    )
