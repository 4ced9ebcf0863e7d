"""A ledger corrected by readings, and what corrections of one sign give away."""

from dataclasses import dataclass

import numpy as np

from app.science import Floats
from app.science.crop.ranges import check_range
from app.science.soil.readings import Measured

TRUSTS = ("weighed", "full", "none")
# p90 less p10 of a normal distribution, in standard deviations.
P10_TO_P90 = 2.5631
# Hours between which a day's change comes about (working value).
MORNING, EVENING = 6.0, 18.0
# Corrections of one sign before it is told, the days they must span, and the least shift [mm]
# that counts (working values; five of one sign come by chance once in sixteen).
LEAST_COUNT, LEAST_DAYS, LEAST_MM = 5, 30, 1.0


@dataclass(frozen=True, kw_only=True)
class Correction:
    """What a reading does to the ledger's close.

    correction_mm: for the day's `correction` of the plan, positive wets. gain 0-1: the share of
    the difference that is taken over. before_mm, reading_mm and both spreads [mm] as they were
    weighed; after_mm and after_spread_mm. why: "weighed", "full", "set_aside", "bound_held" (the
    ledger lies on the side the bound allows), "bound" (moved towards it), "missing" or "nothing".
    """

    correction_mm: float
    gain: float
    before_mm: float
    before_spread_mm: float
    reading_mm: float
    reading_spread_mm: float
    after_mm: float
    after_spread_mm: float
    why: str


def spread_of_range(p10: float, p90: float) -> float:
    """Standard deviation [mm] of a ledger from its p10 and p90 [mm], as of a normal one; NaN in,
    NaN out."""
    return float(np.maximum(p90 - p10, 0.0) / P10_TO_P90)


def correct(
    depletion_mm: float, spread_mm: float, reading: Measured, *, trust: str = "weighed"
) -> Correction:
    """Correction of a ledger's depletion by a reading.

    depletion_mm and spread_mm >= 0 of the ledger at the reading's time. trust: "weighed" takes
    gain = spread^2 / (spread^2 + error^2) of the difference, "full" all of it, "none" sets it
    aside. A reading that only bounds moves a ledger that lies beyond its bound, and no other. A
    NaN reading corrects nothing. Raises ValueError for another trust, a NaN or negative spread.
    Source: scalar Kalman filter (general mathematics); bounding as the methods page says.
    """
    if trust not in TRUSTS:
        raise ValueError(f"trust is {trust!r}; choose one of {', '.join(TRUSTS)}")
    check_range("spread_mm", spread_mm, 0.0, 1e5)
    check_range("depletion_mm", depletion_mm, -1e5, 1e5)
    ahead = reading.depletion_mm - depletion_mm
    why = _why(reading, ahead, trust)
    variance, error = spread_mm**2, reading.error_mm**2
    gain = 0.0
    if why in ("weighed", "bound"):
        gain = variance / (variance + error) if variance + error > 0.0 else 0.0
    if trust == "full" and why in ("full", "bound"):
        gain = 1.0
    shift = gain * ahead if gain > 0.0 else 0.0
    # Weighed: the variance left is (1 - gain) of it; in full trust it is the reading's own.
    left = error if gain == 1.0 else (1.0 - gain) * variance
    return Correction(
        correction_mm=0.0 - shift,
        gain=gain,
        before_mm=depletion_mm,
        before_spread_mm=spread_mm,
        reading_mm=reading.depletion_mm,
        reading_spread_mm=reading.error_mm,
        after_mm=depletion_mm + shift,
        after_spread_mm=float(np.sqrt(left)),
        why=why,
    )


def _why(reading: Measured, ahead: float, trust: str) -> str:
    if trust == "none":
        return "set_aside"
    if np.isnan(reading.depletion_mm) or np.isnan(reading.error_mm):
        return "missing"
    if reading.kind == "nothing":
        return "nothing"
    if reading.kind == "value":
        return trust
    beyond = ahead < 0.0 if reading.kind == "at_most" else ahead > 0.0
    return "bound" if beyond else "bound_held"


def depletion_at(hour: float, before_mm: float, after_mm: float) -> float:
    """Depletion [mm] at `hour` 0-24 of a day between the closes before and after it.

    Up to 6 h the close before, from 18 h the day's own, linear between (working value); NaN in,
    NaN out.
    """
    share = float(np.clip((hour - MORNING) / (EVENING - MORNING), 0.0, 1.0))
    return before_mm + share * (after_mm - before_mm)


def corrected_close(day: np.datetime64, hour: float) -> np.datetime64:
    """The day whose close a reading on `day` at `hour` 0-24 corrects: the day before up to 6 h (the
    close it was compared with), else the day itself."""
    check_range("hour", hour, 0.0, 24.0)
    own: np.datetime64 = day.astype("datetime64[D]")
    return own - np.timedelta64(1, "D") if hour <= MORNING else own


@dataclass(frozen=True, kw_only=True)
class Suspicion:
    """Corrections that keep one sign: `side` "drier" (the field is drier than the ledger says) or
    "wetter"; their number and sum [mm, positive wets]. efficiency_factor and kc_factor: what each
    alone would have to be multiplied by to explain the sum, NaN where there was no irrigation or
    no ET."""

    side: str
    count: int
    sum_mm: float
    efficiency_factor: float
    kc_factor: float


def suspicion(
    correction_mm: Floats, irrigation_net_mm: Floats, et_actual_mm: Floats
) -> Suspicion | None:
    """Suspicion of soil, efficiency or Kc when corrections keep one sign all season.

    Ledger columns (days,) [mm]; NaN corrections count as none. Told from 5 corrections of at least
    1 mm over 30 days or more, all of one sign; None otherwise. Source: working values of the
    methods page.
    """
    shifts = np.nan_to_num(np.asarray(correction_mm, dtype=np.float64))
    days = np.flatnonzero(np.abs(shifts) >= LEAST_MM)
    if days.size < LEAST_COUNT or days[-1] - days[0] < LEAST_DAYS:
        return None
    signs = np.sign(shifts[days])
    if not (signs == signs[0]).all():
        return None
    total = float(shifts[days].sum())
    through = slice(0, int(days[-1]) + 1)
    water, lost = float(np.sum(irrigation_net_mm[through])), float(np.sum(et_actual_mm[through]))
    return Suspicion(
        side="wetter" if total > 0.0 else "drier",
        count=int(days.size),
        sum_mm=total,
        efficiency_factor=1.0 + total / water if water > 0.0 else float("nan"),
        kc_factor=1.0 - total / lost if lost > 0.0 else float("nan"),
    )
