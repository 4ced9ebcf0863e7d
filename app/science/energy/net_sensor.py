"""Rung 3: a single net radiation sensor, corrected for wind as its certificate states."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from app.science import Floats, floats

WindForm = Literal["none", "linear", "saturating"]
FORMS = ("none", "linear", "saturating")
_FACTOR_RANGE = (0.5, 2.0)  # -, a factor outside it is a slip of the pen, working value
_TRIED_WIND = np.array([0.0, 5.0, 15.0])  # m s-1


@dataclass(frozen=True)
class WindFactor:
    """Factor on a net sensor's reading, as its certificate states it, of wind u at the sensor.

    `form`: "none" is 1; "linear" is k + a u; "saturating" is 1 + k a u / (k + a u), which grows
    from 1 towards 1 + k. `k` [-], `a` [s m-1]. The certificate's own figures; no defaults.
    Errors: ValueError for an unknown form, or figures whose factor leaves 0.5 to 2 below 15 m/s.
    Source: forms are common practice, no source; figures from the sensor's certificate.
    """

    form: WindForm = "none"
    k: float = 0.0
    a: float = 0.0

    def __post_init__(self) -> None:
        if self.form not in FORMS:
            raise ValueError(f"form is {self.form!r}; it must be one of {', '.join(FORMS)}")
        if self.form == "saturating" and (self.k <= 0.0 or self.a < 0.0):
            raise ValueError(f"k is {self.k:g} and a is {self.a:g}; k must be above 0, a not below")
        low, high = _FACTOR_RANGE
        factors = self.at(_TRIED_WIND)
        if not ((factors >= low) & (factors <= high)).all():
            raise ValueError(
                f"k {self.k:g} and a {self.a:g} give factors {factors.round(3).tolist()} at winds "
                f"of 0, 5 and 15 m/s; they must lie between {low:g} and {high:g}"
            )

    def at(self, wind: ArrayLike) -> Floats:
        """The factor at a wind speed [m s-1], any shape; NaN gives NaN unless the form is none."""
        u = floats(wind)
        if self.form == "linear":
            return np.asarray(self.k + self.a * u)
        if self.form == "saturating":
            return np.asarray(1.0 + self.k * self.a * u / (self.k + self.a * u))
        return np.ones(u.shape)


def net_corrected_for_wind(
    net_radiation: ArrayLike, wind: ArrayLike, positive: WindFactor, negative: WindFactor
) -> Floats:
    """A net sensor's reading corrected for wind, row by row.

    Arguments, shapes that broadcast: `net_radiation` as read [any flux or energy unit]; `wind` at
    the sensor [m s-1; give the assumed 2 m/s where it was not measured]; `positive` the factor for
    readings above 0, `negative` for the others. Returns the unit of the reading. NaN gives NaN.
    Source: the sensor's certificate.
    """
    rn, u = np.broadcast_arrays(floats(net_radiation), floats(wind))
    return np.asarray(rn * np.where(rn > 0.0, positive.at(u), negative.at(u)))
