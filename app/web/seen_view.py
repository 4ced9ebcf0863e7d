"""What was seen on a field, worded; and the forms' figures made whole."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from typing import Any

import numpy as np

from app import wording
from app.science import Floats
from app.science.soil.correction import suspicion
from app.storage.seen import SeenRow
from app.web.needs import read_day, read_number
from app.web.problems import RefusedError

DEPTHS = 4
"""Depths a form has room for; the API takes twelve."""
STAGES = {"1": "initial", "2": "development", "3": "mid-season", "4": "late season"}
KINDS = {
    "stage": "a stage begins",
    "cover": "ground cover and height",
    "cutting": "cut",
    "keep_off": "keep off",
    "note": "note",
}
METHODS = {
    "volumetric": "water content, m³/m³",
    "gravimetric": "water content by weight, kg/kg",
    "neutron": "neutron count ratio",
    "tension": "tension, kPa",
}
TRUSTS = {
    "weighed": "weigh it against the ledger",
    "full": "take it in full",
    "none": "set it aside (say why)",
}
WHY = {
    "weighed": "weighed",
    "full": "taken in full",
    "set_aside": "set aside",
    "bound_held": "beyond the instrument’s range; the ledger agrees",
    "bound": "beyond the instrument’s range; the ledger moved towards it",
    "missing": "not whole",
    "nothing": "beyond both ends of the range",
}


@dataclass(frozen=True)
class SeenWords:
    """One thing seen: `moved` says what a reading did."""

    id: int
    day: date
    block: str
    what: str
    note: str
    who: str
    moved: str


def worded(row: SeenRow) -> SeenWords:
    """A row in words."""
    return SeenWords(row.id, row.day, row.block_name, _what(row), row.note, row.who, _moved(row))


def _what(row: SeenRow) -> str:
    details = row.details
    if row.kind == "stage":
        return f"{STAGES[str(int(row.amount))]} begins"
    if row.kind == "cover":
        height = wording.number(details["height_m"], 2)
        return f"ground cover {wording.share(row.amount)}, height {height} m"
    if row.kind == "cutting":
        return "cut"
    if row.kind == "keep_off":
        return f"keep off until {wording.short_day(date.fromisoformat(details['last']))}"
    if row.kind == "reading":
        depths = ", ".join(
            f"{wording.reading(part['value'])} at {wording.number(part['depth_m'], 2)} m"
            for part in details["depths"]
        )
        return f"{METHODS[details['method']]}: {depths}"
    return "note"


def _moved(row: SeenRow) -> str:
    if row.kind != "reading" or row.why is None:
        return ""
    reads = (
        f"the ledger had {_with_spread(row.before_mm, row.before_spread_mm)} mm depleted, the "
        f"reading says {_with_spread(row.reading_mm, row.reading_spread_mm)}"
    )
    done = f"now {_with_spread(row.after_mm, row.after_spread_mm)}" if row.correction_mm else ""
    said = WHY[row.why] + (f" ({wording.share(row.gain or 0.0)})" if row.why == "weighed" else "")
    return "; ".join(filter(None, [reads, said, done]))


def _with_spread(value: float | None, spread: float | None) -> str:
    return f"{wording.number(value or 0.0, 0)} ± {wording.number(spread or 0.0, 0)}"


def figures(form: Mapping[str, str]) -> tuple[float, dict[str, Any]]:
    """Amount and details of a form of what was seen; raises RefusedError naming the box."""
    kind = form.get("kind", "")
    if kind == "stage":
        return read_number(form.get("stage", ""), "the stage"), {}
    if kind == "cover":
        cover = read_number(form.get("cover", ""), "the ground cover") / 100.0
        return cover, {"height_m": read_number(form.get("height", ""), "the height")}
    if kind == "keep_off":
        return 0.0, {"last": read_day(form.get("last", ""), "the last day")}
    if kind == "reading":
        return 0.0, _reading(form)
    return 0.0, {}


def _reading(form: Mapping[str, str]) -> dict[str, Any]:
    depths = []
    for n in range(1, DEPTHS + 1):
        depth, value = form.get(f"depth{n}", "").strip(), form.get(f"value{n}", "").strip()
        if not depth and not value:
            continue
        depths.append(
            {
                "depth_m": read_number(depth, f"depth {n}") / 100.0,
                "value": read_number(value, f"reading {n}"),
            }
        )
    if not depths:
        raise RefusedError("No depth has a reading.", remedy="Fill in one depth at least.")
    found: dict[str, Any] = {
        "method": form.get("method", ""),
        "trust": form.get("trust", "weighed"),
        "hour": read_number(form.get("hour", "") or "6", "the hour"),
        "depths": depths,
    }
    for name, box in (
        ("bulk_density", "the bulk density"),
        ("slope", "the slope"),
        ("intercept", "the intercept"),
    ):
        if form.get(name, "").strip():
            found[name] = read_number(form[name], box)
    return found


def suspicion_words(ledger: Sequence[Mapping[str, Any]]) -> str:
    """What corrections of one sign all season give away; empty where there is nothing."""

    def column(name: str) -> Floats:
        return np.array([row[name] for row in ledger], dtype=np.float64)

    told = suspicion(column("correction_mm"), column("irrigation_net_mm"), column("et_actual_mm"))
    if told is None:
        return ""
    causes = [
        f"{name} {wording.signed(100 * (factor - 1), 0)} %"
        for name, factor in (
            ("an efficiency of", told.efficiency_factor),
            ("crop coefficients of", told.kc_factor),
        )
        if factor == factor
    ]
    return (
        f"All {told.count} corrections say the field is {told.side} than the ledger, "
        f"{wording.depth(abs(told.sum_mm))} mm in all: look at soil, efficiency or coefficients. "
        + (f"Alone {' or '.join(causes)} would explain it." if causes else "")
    ).strip()
