"""Which block stands for a field: its driest, its median or a named one."""

from collections.abc import Sequence
from itertools import groupby

from app.storage.pages import RoundsRow

ORDER = {"late": 0, "due": 1, "soon": 2, "easy": 3, "wet": 4}
"""Standings, most urgent first."""


def dryness(row: RoundsRow) -> float:
    """Depletion as a share of the limit; a block without advice is the least dry."""
    if row.number is None:
        return -1.0
    return row.depletion_mm / row.limit_mm if row.limit_mm > 0 else row.depletion_mm


def managed(blocks: Sequence[RoundsRow]) -> RoundsRow:
    """The block a field is managed by; of two middle blocks the drier is the median."""
    if len(blocks) == 1:
        return blocks[0]
    named = [row for row in blocks if row.block_key == blocks[0].managed_by]
    if named:
        return named[0]
    by_dryness = sorted((row for row in blocks if row.number), key=dryness) or list(blocks)
    place = len(by_dryness) // 2 if blocks[0].managed_by == "median" else -1
    return by_dryness[place]


def one_a_field(rows: Sequence[RoundsRow]) -> list[tuple[RoundsRow, list[RoundsRow]]]:
    """The managed block of each field, and its blocks that are more urgent; rows come by field."""
    found = []
    for _, group in groupby(rows, key=lambda row: row.field_id):
        blocks = list(group)
        chosen = managed(blocks)
        found.append((chosen, [row for row in blocks if _urgent(row) < _urgent(chosen)]))
    return found


def _urgent(row: RoundsRow) -> int:
    return ORDER.get(row.standing or "", len(ORDER))
