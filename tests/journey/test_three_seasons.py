"""Three seasons of unlike crops, soils and systems, watered as the limit asks, inside ranges that
were stated beforehand.

Weather: hourly typical year 723170 of the pvlib wheel (NREL TMY3 user's manual), a humid temperate
place; its ETo by rung 5. `python -m tests.journey.test_three_seasons` prints the table. The range
of the seasonal ETc/ETo is of FAO-56: no less than the basal coefficients of Table 17 weighed by the
stages' lengths, no more than the single ones of Table 12 with an initial stage that is always wet
(1.0, Figure 29), each with 0.10 for climate. Percolation and numbers of waterings are common
practice, no source.
"""

from dataclasses import dataclass, replace
from datetime import date
from functools import cache
from typing import Any

import numpy as np
import pytest

from app import handbook
from app.book.schema import SoilPart, SystemPart
from app.book.season import SeasonPart
from app.science.ledger import BlockLedger, BlockPlan, block_ledgers, closure_error
from app.workflows import agronomy
from app.workflows.crop import crop_season
from tests.journey import hindcast

CUTTINGS = [date(2025, 5, 10), date(2025, 6, 10), date(2025, 7, 10), date(2025, 8, 10),
            date(2025, 9, 15)]  # fmt: skip


@dataclass(frozen=True)
class Case:
    """A season, its soil and system, and what was expected of it beforehand."""

    name: str
    season: dict[str, Any]
    texture: str
    system: dict[str, Any]
    waterings: tuple[int, int]


CASES = (
    Case(
        "alfalfa, five cuttings, silt loam, pivot",
        # Table 12: individual cuttings 0.40 after cutting, 1.20 at full cover, 1.15 at cutting
        {"crop": "alfalfa_hay_cycles", "planting": date(2025, 4, 1), "end": date(2025, 10, 15),
         "cuttings": CUTTINGS, "cycle_days": (5, 10, 10, 5), "mad": 0.5, "coefficients": "single"},
        "silt_loam",
        {"kind": "pivot", "efficiency": 0.85, "rate_mm_h": 1.0, "most_mm": 40},
        (2, 25),
    ),
    Case(
        "apples with a cover crop, loam, micro-sprinklers",
        # Table 17: active ground cover, killing frost: Kcb 0.40, 1.15, 0.90; evaporation on top
        {"crop": "apple_cherry_pear_cover_frost", "planting": date(2025, 4, 10),
         "end": date(2025, 10, 20), "mad": 0.5, "stand": {"cover": 0.5, "height_m": 3.5},
         "canopy": {"ground_cover_kcb": 0.75}},
        "loam",
        {"kind": "micro", "efficiency": 0.86, "rate_mm_h": 2.0, "most_mm": 40,
         "wetted_fraction": 0.7, "root_wetted_fraction": 0.75},
        (2, 30),
    ),
    Case(
        "sweet peppers on sand, drip",
        # Table 17: Kcb 0.15, 1.00, 0.80; Table 12: Kc 0.60, 1.05, 0.90
        {"crop": "pepper_sweet", "planting": date(2025, 5, 5), "mad": 0.3},
        "sand",
        {"kind": "drip", "efficiency": 0.9, "rate_mm_h": 2.0, "most_mm": 15,
         "wetting": "trickle", "wetted_fraction": 0.4, "root_wetted_fraction": 0.6,
         "under_canopy": True},
        (15, 90),
    ),
)  # fmt: skip


@cache
def weather() -> hindcast.Record:
    return hindcast.typical_years()[0]


def plan_of(case: Case) -> BlockPlan:
    """The season as a book would make it, without water."""
    season = SeasonPart(field="a", **case.season)
    soil = SoilPart.model_validate(
        {"key": "s", "name": "S", "layers": [{"bottom_m": 2.0, "texture": case.texture}]}
    )
    system = SystemPart.model_validate({"key": "w", "name": "W", **case.system})
    details = season.model_dump(mode="json")
    crop = crop_season(details, season.planting)
    first = int(np.flatnonzero(weather().date == crop.planting)[0])
    days = int((crop.last_day - crop.planting).astype(np.int64)) + 1
    days = min(days, weather().date.size - first)
    none = np.zeros(days)
    return BlockPlan(
        season=crop,
        profile=agronomy.profile(soil.model_dump(mode="json")),
        start=crop.planting,
        days=days,
        irrigation_gross=none,
        irrigation_net=none,
        irrigation_fw=np.full(days, np.nan),
        under_canopy=system.under_canopy,
        root_wetted_fraction=system.root_wetted_fraction,
    )


def expected(case: Case) -> tuple[float, float]:
    """The range the season's unstressed crop ET over ETo was to lie in."""
    row = handbook.crop(str(case.season["crop"]))
    basal, single = (handbook.usable(row.crop_id, kind).coefficients for kind in ("dual", "single"))
    stages = case.season.get("cycle_days") or handbook.usable(row.crop_id, "single").stage_days
    return (
        _weighed(basal, stages) - 0.10,
        _weighed((max(single[0], 1.0), *single[1:]), stages) + 0.10,
    )


def _weighed(k: tuple[float, ...], stages: tuple[int, ...]) -> float:
    ini, mid, end = k
    by_stage = (ini, (ini + mid) / 2, mid, (mid + end) / 2)
    return sum(a * b for a, b in zip(by_stage, stages, strict=True)) / sum(stages)


def watered(case: Case) -> tuple[BlockPlan, BlockLedger]:
    """The season watered back to field capacity on the day after each close past the limit, within
    what one application gives."""
    plan = plan_of(case)
    system = SystemPart.model_validate({"key": "w", "name": "W", **case.system})
    details = system.model_dump(mode="json")
    first = int(np.flatnonzero(weather().date == plan.start)[0])
    here = slice(first, first + plan.days)
    sky = hindcast.sky(weather().eto[here], weather().rain[here])
    net = np.zeros(plan.days)
    most = system.most_mm * system.efficiency
    fraction = agronomy.wetted_fraction(details)
    while True:
        plan = replace(
            plan,
            irrigation_net=net,
            irrigation_gross=net / system.efficiency,
            irrigation_fw=np.where(net > 0.0, fraction, np.nan),
        )
        (ledger,) = block_ledgers([plan], [sky])
        past = (ledger.depletion_mm > ledger.limit_mm)[:-1] & (net[1:] == 0.0)
        if not past.any():
            return plan, ledger
        day = int(np.argmax(past))
        net[day + 1] = min(float(ledger.depletion_mm[day]), most)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_the_season_lies_where_it_was_expected(case: Case) -> None:
    plan, ledger = watered(case)
    ratio = ledger.etc_potential_mm.sum() / ledger.eto_mm.sum()
    low, high = expected(case)
    assert low <= ratio <= high
    assert case.waterings[0] <= int((plan.irrigation_net > 0).sum()) <= case.waterings[1]
    # each close past the limit is watered the day after
    late = int((ledger.depletion_mm > ledger.limit_mm).sum())
    assert late <= int((plan.irrigation_net > 0).sum()) + 1
    water = ledger.rain_mm.sum() - ledger.rain_outside_roots_mm.sum() + plan.irrigation_net.sum()
    assert ledger.et_actual_mm.sum() <= water + ledger.taw_mm.max()
    assert ledger.et_actual_mm.sum() >= 0.9 * ledger.etc_potential_mm.sum()
    assert ledger.deep_percolation_mm.sum() <= 0.35 * water
    assert np.abs(closure_error(ledger)).max() < 1e-9


def test_a_third_of_the_soil_wetted_asks_about_three_times_as_often() -> None:
    """The same crop on loam: trickle that wets a third of the soil against sprinklers (FAO-56: TAW
    in proportion to the soil that holds it)."""
    sprinkled = replace_case(CASES[2], "loam", {"root_wetted_fraction": 1.0})
    trickled = replace_case(CASES[2], "loam", {"root_wetted_fraction": 0.33})
    often, seldom = (
        int((watered(one)[0].irrigation_net > 0).sum()) for one in (trickled, sprinkled)
    )
    assert often / seldom == pytest.approx(3.0, abs=1.2)


def replace_case(case: Case, texture: str, system: dict[str, Any]) -> Case:
    return replace(
        case, texture=texture, system={**case.system, "most_mm": 200, "rate_mm_h": 10, **system}
    )


def main() -> None:
    """The table of the three seasons."""
    print("| season | ETc/ETo | applied net mm | rain mm | percolation mm | days past the limit |")
    print("| --- | --- | --- | --- | --- | --- |")
    for case in CASES:
        plan, ledger = watered(case)
        low, high = expected(case)
        print(
            f"| {case.name} | {ledger.etc_potential_mm.sum() / ledger.eto_mm.sum():.2f} "
            f"({low:.2f} to {high:.2f}) | {plan.irrigation_net.sum():.0f} in "
            f"{int((plan.irrigation_net > 0).sum())} | {ledger.rain_mm.sum():.0f} | "
            f"{ledger.deep_percolation_mm.sum():.0f} | "
            f"{int((ledger.depletion_mm > ledger.limit_mm).sum())} of {plan.days} |"
        )


if __name__ == "__main__":
    main()
