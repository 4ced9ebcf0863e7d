"""The science of Rillbook: numpy only, no files, no clock, no database, no hidden randomness.

Arrays are float64, NaN means missing, dates are numpy datetime64[D], and the day axis comes first.
"""

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]
Days = NDArray[np.datetime64]


def floats(values: ArrayLike) -> Floats:
    """The values as a float64 array of the same shape; no copy where they are one already."""
    return np.asarray(values, dtype=np.float64)
