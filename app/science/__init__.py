"""The science of Rillbook: numpy only, no files, no clock, no database, no hidden randomness.

Arrays are float64, NaN means missing, dates are numpy datetime64[D], and the day axis comes first.
"""

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
Days = NDArray[np.datetime64]
