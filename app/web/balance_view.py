"""The energy balance over the crop a station stands in: what it says of crop ET, and how it closes.

Shown beside the ledger's crop ET, never blended in.
"""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from typing import Any

import numpy as np

from app.science import Floats
from app.science.energy.compare import closure_of_span, residual

Row = Mapping[str, Any]


@dataclass(frozen=True)
class CropBalance:
    """Crop ET by the residual Rn - G - H: `days` it rests on, their sum `et_mm`, and the ledger's
    on the same days, NaN without a ledger. `closure` (LE + H) / (Rn - G) over the `closure_days`
    on which LE was measured too, NaN for none."""

    days: int
    et_mm: float
    ledger_mm: float
    closure: float
    closure_days: int


def et_by_residual(rows: Sequence[Row]) -> Floats:
    """Crop ET by the energy balance on station days [mm], (days,), NaN where a flux is missing."""
    return residual(*_fluxes(rows)).et


def crop_balance(
    rows: Sequence[Row], ledger: Iterable[tuple[date, float]] = ()
) -> CropBalance | None:
    """What the balance says over station days; `ledger` crop ET by day [mm], to hold it against.
    None where no day has net radiation, soil heat and sensible heat."""
    et = et_by_residual(rows)
    known = ~np.isnan(et)
    if not known.any():
        return None
    by_day = dict(ledger)
    own = np.array([by_day.get(row["day"], np.nan) for row in rows], dtype=np.float64)
    both = known & ~np.isnan(own) if by_day else known
    closure, whole = closure_of_span(*_fluxes(rows))
    return CropBalance(
        days=int(both.sum()),
        et_mm=float(et[both].sum()),
        ledger_mm=float(own[both].sum()) if by_day and both.any() else float("nan"),
        closure=closure,
        closure_days=int(whole.sum()),
    )


def _fluxes(rows: Sequence[Row]) -> tuple[Floats, Floats, Floats, Floats]:
    names = ("net_radiation", "soil_heat_flux", "sensible_heat", "latent_heat")
    rn, g, h, le = (np.array([row[name] for row in rows], dtype=np.float64) for name in names)
    return rn, g, h, le
