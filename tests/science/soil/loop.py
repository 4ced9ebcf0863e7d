"""Terms of the day loop written out by hand, for examples that print them."""

from typing import Any

import numpy as np

from app.science.soil.balance import Blocks, Days, State, Terms


def one_block(
    days: int,
    *,
    depletion: float = 0.0,
    layer: float = 0.0,
    tew: float = 20.0,
    rew: float = 9.0,
    p: float = 0.5,
    drain_before_et: bool = False,
    **daily: Any,
) -> Terms:
    """One block over `days` with a fixed p; `daily` overrides columns of `Days` (number or series).

    By default: no water, no demand, a root zone too large to matter, few 1.
    """
    columns = (
        dict.fromkeys(Days._fields, 0.0) | {"taw": 1e6, "exposed": 1.0, "below": np.inf} | daily
    )
    blocks = Blocks(
        tew=tew,
        drying=tew - rew,
        p_base=p,
        p_slope=0.0,
        roots=1.0,
        wet_at=0.0,
        wet_span=1.0,
        cn_wet=1.0,
        cn_fall=0.0,
        drainage_days=0.0,
        salt=1.0,
    )
    return Terms(
        blocks=Blocks(*(np.array([value]) for value in blocks)),
        days=Days(
            **{
                name: np.broadcast_to(values, days)[:, None] * 1.0
                for name, values in columns.items()
            }
        ),
        opening=State(np.array([depletion]), np.zeros(1), np.array([layer]), np.zeros(1)),
        drain_before_et=drain_before_et,
    )
