"""What a totalizing water meter says: differences of its register, and their sharing out."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.science import Floats


def passed(
    register: ArrayLike, restarts: NDArray[np.bool_], rolls_over_at: float | None = None
) -> Floats:
    """What passed between each reading and the one before, in units of the register (n,).

    register: readings in order (n,), >= 0. restarts: True where the meter was changed or set anew
    just before the reading. rolls_over_at: what the register counts to before it begins again at
    zero; a reading below the one before is then one turn further. NaN where nothing can be said:
    the first reading, a restart, a lower reading of a register that does not roll over.
    """
    values = np.asarray(register, dtype=np.float64)
    found = np.full(values.shape, np.nan)
    if values.size < 2:
        return found
    found[1:] = np.diff(values)
    if rolls_over_at is not None:
        found[1:] = np.where(found[1:] < 0.0, found[1:] + rolls_over_at, found[1:])
    found[np.asarray(restarts, dtype=np.bool_) | (found < 0.0)] = np.nan
    return found


def shared_out(volume: float, weights: ArrayLike) -> Floats:
    """A volume shared by weights such as hours x flow (n,), each >= 0; adds up to the volume.

    NaN throughout where the weights add up to nothing.
    """
    parts = np.asarray(weights, dtype=np.float64)
    total = float(parts.sum())
    return np.full(parts.shape, np.nan) if total <= 0.0 else volume * (parts / total)
