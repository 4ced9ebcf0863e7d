"""What somebody saw in the field: a stage that began, ground cover and height."""

from dataclasses import dataclass

import numpy as np

from app.science.crop.ranges import check_range


@dataclass(frozen=True, kw_only=True)
class StageSeen:
    """A stage, 1 initial to 4 late, that began on `date`."""

    date: np.datetime64
    stage: int

    def __post_init__(self) -> None:
        if self.stage not in (1, 2, 3, 4):
            raise ValueError(
                f"stage is {self.stage}; 1 initial, 2 development, 3 mid or 4 late can begin"
            )


@dataclass(frozen=True, kw_only=True)
class CoverSeen:
    """Fraction of ground the crop covers, 0-1, and its height 0.01-30 m, on `date`."""

    date: np.datetime64
    cover: float
    height_m: float

    def __post_init__(self) -> None:
        check_range("cover", self.cover, 0.0, 1.0)
        check_range("height_m", self.height_m, 0.01, 30.0)
