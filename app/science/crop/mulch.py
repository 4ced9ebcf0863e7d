"""Mulch on the soil: what it takes from evaporation and from the crop's coefficient."""

from dataclasses import dataclass

from app.science.crop.ranges import check_range

KINDS = ("plastic", "organic")
# FAO-56 chapter 10: evaporation falls by 5 % for each 10 % of ground under organic mulch.
ORGANIC_SHARE = 0.5


@dataclass(frozen=True, kw_only=True)
class Mulch:
    """Mulch over a fraction `cover` 0-1 of the ground.

    kind: "plastic" seals what it covers, so that water evaporates from the rest alone; "organic"
    lets 5 % less evaporate for each 10 % of cover. reduction 0-0.4: the crop's own coefficient is
    less by it (plastic: Kcb 0.05-0.15, single Kc 0.10-0.30; organic 0). Raises ValueError naming
    the field. Source: FAO-56 chapter 10, effects of mulches.
    """

    kind: str
    cover: float
    reduction: float = 0.0

    def __post_init__(self) -> None:
        if self.kind not in KINDS:
            raise ValueError(f"kind is {self.kind!r}; choose {' or '.join(KINDS)}")
        check_range("cover", self.cover, 0.0, 1.0)
        check_range("reduction", self.reduction, 0.0, 0.4)

    @property
    def open_ground(self) -> float:
        """Fraction of ground that water can leave by."""
        return 1.0 - self.cover if self.kind == "plastic" else 1.0

    @property
    def evaporation_factor(self) -> float:
        """Factor on evaporation from that ground."""
        return 1.0 - ORGANIC_SHARE * self.cover if self.kind == "organic" else 1.0
