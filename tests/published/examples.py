"""Reader of examples.csv: worked examples of the handbooks, printed value beside status.

Source of the rows: FAO Irrigation and Drainage Paper 56 (1998), Examples 1-47 and Boxes;
The ASCE Standardized Reference Evapotranspiration Equation (2005), Appendix C (from memory, as
each row says).
"""

import csv
from dataclasses import dataclass
from decimal import ROUND_HALF_UP, Decimal
from functools import cache
from pathlib import Path

FILE = Path(__file__).with_name("examples.csv")

# How far, in units of the last printed digit, a computed value may lie from the printed one.
# 0.5 is "rounds to the printed digit"; handbooks that carry rounded intermediates reach 1.5.
LAST_DIGITS = {"recomputed OK": 0.5, "within rounding (last digit)": 1.5}
# Statuses judged in the example's own unit instead (see each row's note).
ABSOLUTE = {"memory row, within 0.03": 0.03}


@dataclass(frozen=True)
class Row:
    example: str
    source: str
    quantity: str
    inputs: str
    published: float
    unit: str
    decimals: int
    computed: float
    status: str
    confidence: str
    note: str

    @property
    def key(self) -> tuple[str, str]:
        return self.example, self.quantity


@cache
def all_rows() -> tuple[Row, ...]:
    """Every row of the file, in its order."""
    with FILE.open(encoding="utf-8", newline="") as lines:
        return tuple(
            Row(
                example=r["example"],
                source=r["source"],
                quantity=r["quantity"],
                inputs=r["inputs"],
                published=float(r["published"]),
                unit=r["unit"],
                decimals=int(r["published_decimals"]),
                computed=float(r["computed"]),
                status=r["status"],
                confidence=r["published_confidence"],
                note=r["note"],
            )
            for r in csv.DictReader(lines)
        )


def rows(example: str) -> dict[str, Row]:
    """The rows of one example (`"18"`, `"Box 14"`, `"Greeley daily 1 Jul"`), by quantity."""
    found = {row.quantity: row for row in all_rows() if row.example == example}
    if not found:
        raise KeyError(f"examples.csv has no example {example!r}")
    return found


def allowed(row: Row) -> float:
    """How far a value may lie from the printed one, in the row's unit."""
    if row.status in ABSOLUTE:
        return ABSOLUTE[row.status]
    if row.status in LAST_DIGITS:
        return LAST_DIGITS[row.status] * 10.0**-row.decimals
    raise ValueError(f"no tolerance for status {row.status!r} of {row.key}: say it in the test")


def assert_printed(row: Row, value: float, *, within: float | None = None) -> None:
    """Fail unless `value` rounds to the printed digits, or lies within the status's tolerance.

    `within` replaces the tolerance (row's unit) where the test states its own reason, as for
    "graph reading" and "handbook arithmetic slip".
    """
    value = float(value)
    told = f"{row.key}: printed {row.published:.{row.decimals}f} {row.unit}, got {value:.6g}"
    if within is None and row.status == "recomputed OK":
        digit = Decimal(1).scaleb(-row.decimals)
        # 12 significant digits first, so that 0.855 held as 0.85499999999999998 is a half
        shown = Decimal(f"{value:.12g}").quantize(digit, rounding=ROUND_HALF_UP)
        assert shown == Decimal(str(row.published)).quantize(digit), told
        return
    tolerance = allowed(row) if within is None else within
    assert abs(value - row.published) <= tolerance * (1 + 1e-9), f"{told}, tolerance {tolerance:g}"
