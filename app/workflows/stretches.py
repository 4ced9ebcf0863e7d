"""The stretches of time a block's ledger is made of: crop seasons, and bare soil between them."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date, timedelta
from itertools import pairwise

import numpy as np
from sqlalchemy.orm import Session

from app.science.crop.season import CropSeason, bare_season
from app.science.soil.block import BlockPlan
from app.science.soil.carry_over import Stores, carried_over
from app.storage.events import standing_events
from app.storage.ledgers import SeasonRow, read_seasons
from app.workflows import agronomy
from app.workflows.crop import Seen, crop_season

LONGEST_GAP = 400
"""Days of bare soil that the water of one season is followed through to the next; after more the
next opens at field capacity (working value)."""
BARE_DEPTH = 0.3
"""Depth of bare soil whose water is followed apart from what lies below it [m] (working value)."""
DAY = timedelta(days=1)


@dataclass(frozen=True)
class Stretch:
    """A crop season of a block, or the bare soil before it, kept under the same season.

    carries: it opens with what the stretch before left, down to `deepest_before_m`. free_from: the
    day after the season before, None without one.
    """

    season: SeasonRow
    crop: CropSeason
    start: date
    bare: bool = False
    carries: bool = False
    deepest_before_m: float = 0.0
    free_from: date | None = None


@dataclass(frozen=True)
class Close:
    """What a ledger's last day left: root depth [m], depletions [mm] of root zone, subsoil and
    evaporation layer, and the range of the first."""

    root_depth_m: float
    depletion_mm: float
    subsoil_mm: float
    layer_mm: float
    p10_mm: float
    p90_mm: float


def stretches_of(session: Session, blocks: Sequence[int]) -> list[Stretch]:
    """Stretches of blocks, by block and day.

    A season that states no opening carries over what the season before left, through bare soil
    of at most `LONGEST_GAP` days.
    """
    found: list[Stretch] = []
    before: tuple[SeasonRow, CropSeason] | None = None
    for row, crop in seasons_of(session, blocks):
        if before is not None and before[0].block_id != row.block_id:
            before = None
        found.extend(_stretches(row, crop, None if before is None else before[1]))
        before = row, crop
    return found


def _stretches(row: SeasonRow, crop: CropSeason, before: CropSeason | None) -> list[Stretch]:
    start = first_day(row)
    if before is None:
        return [Stretch(row, crop, start)]
    free = agronomy.as_date(before.last_day) + DAY
    gap = (start - free).days
    if gap > LONGEST_GAP or _states_opening(row):
        return [Stretch(row, crop, start, free_from=free)]
    if not gap:
        return [
            Stretch(
                row, crop, start, carries=True, deepest_before_m=before.root_max_m, free_from=free
            )
        ]
    deepest = max(before.root_max_m, crop.root_max_m)
    soil = bare_season(
        np.datetime64(free, "D"),
        np.datetime64(start - DAY, "D"),
        root_depth_m=min(BARE_DEPTH, deepest),
        deepest_m=deepest,
    )
    return [
        Stretch(row, soil, free, bare=True, carries=True, deepest_before_m=before.root_max_m),
        Stretch(row, crop, start, carries=True, deepest_before_m=deepest, free_from=free),
    ]


def _states_opening(row: SeasonRow) -> bool:
    names = ("ledger_start", "initial_depletion_mm", "initial_depletion_fraction")
    return any(row.details[name] is not None for name in names)


def seasons_of(session: Session, blocks: Sequence[int]) -> list[tuple[SeasonRow, CropSeason]]:
    """Seasons of blocks by block and planting; one that the next overtakes ends the day before.

    What was seen of a crop belongs to the season it was seen in.
    """
    rows = read_seasons(session, blocks)
    seen: dict[int, list[Seen]] = {}
    for event in standing_events(session, blocks, ("stage", "cover", "cutting")):
        height = event.details.get("height_m", 0.0)
        seen.setdefault(event.block_id, []).append(
            Seen(event.day, event.kind, event.amount, height)
        )
    found = []
    for row, later in pairwise([*rows, None]):
        assert row is not None
        until = later.planting if later is not None and later.block_id == row.block_id else date.max
        own = [one for one in seen.get(row.block_id, []) if row.planting <= one.day < until]
        crop = crop_season(row.details, row.planting, own)
        if later is not None and later.block_id == row.block_id:
            eve = np.datetime64(first_day(later), "D") - 1
            if crop.last_day > eve:
                crop = replace(crop, end=eve)
        found.append((row, crop))
    return found


def first_day(season: SeasonRow) -> date:
    """First day of a season's ledger: its planting, or the later one it states."""
    stated = season.details["ledger_start"]
    return date.fromisoformat(stated) if stated else season.planting


def opened(plan: BlockPlan, close: Close, deepest_before_m: float) -> tuple[BlockPlan, float]:
    """The plan with the opening that `close` leaves it, and the width of its range [mm]."""
    crop = plan.season
    depth = crop.root_max_m if crop.perennial else crop.root_min_m
    share = plan.root_wetted_fraction
    stores = carried_over(
        plan.profile,
        Stores(
            root_depth_m=close.root_depth_m,
            deepest_m=max(deepest_before_m, close.root_depth_m),
            depletion_mm=close.depletion_mm,
            subsoil_mm=close.subsoil_mm,
        ),
        depth,
        crop.root_max_m,
        roots_before=share,
        roots=share,
    )
    before, zone, whole = plan.profile.taw([close.root_depth_m, depth, crop.root_max_m])
    below = share * float(whole - zone)
    told = replace(
        plan,
        initial_depletion_mm=stores.depletion_mm,
        initial_subsoil_depletion_fraction=(
            min(max(stores.subsoil_mm / below, 0.0), 1.0) if below > 1e-9 else 0.0
        ),
        initial_evaporation_depletion_mm=close.layer_mm,
    )
    return told, (close.p90_mm - close.p10_mm) * float(zone / before) if before > 0.0 else 0.0
