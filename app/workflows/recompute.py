"""Bring ledgers up to date from station days, the book and events.

Only what is dirty is touched, from its first dirty day, in the caller's transaction. A ledger is
also carried on to the last closed day when no new reading came: those days rest on the usual for
the date and are recomputed when the readings arrive.
"""

import zlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import asdict, dataclass, replace
from datetime import date
from typing import Any

import numpy as np
from sqlalchemy.orm import Session

from app.science import Floats
from app.science.ledger import BlockLedger, block_ledgers, ensemble_depletions
from app.storage.ledgers import (
    clear_dirty,
    first_energy_days,
    last_ledger_days,
    read_blocks,
    replace_ledger_days,
    replace_readings,
)
from app.storage.series import numbers
from app.storage.tables import LedgerDay
from app.workflows import agronomy
from app.workflows.assemble import Subject
from app.workflows.readings import Taken, corrected
from app.workflows.stretches import DAY, Close, opened, stretches_of

MEMBERS = 200
LEDGER_COLUMNS = tuple(
    column.name
    for column in LedgerDay.__table__.columns
    if column.name not in {"day", "block_id", "season_id"}
)


def due_ledgers(session: Session, through: date) -> dict[int, date]:
    """Blocks whose ledger is dirty or stops before it should, and the day to write from.

    A stretch without a ledger is due once a station of its field has reference ET before its end.
    """
    blocks = read_blocks(session)
    due = {row.block_id: row.dirty_from for row in blocks if row.dirty_from is not None}
    last, known = last_ledger_days(session), first_energy_days(session)
    for stretch in stretches_of(session, [row.block_id for row in blocks]):
        block = stretch.season.block_id
        until = min(through, agronomy.as_date(stretch.crop.last_day))
        reached = last.get(stretch.season.season_id)
        if reached is not None and reached >= stretch.start:
            since = reached + DAY
        else:
            since = max(stretch.start, known.get(block, date.max))
        if since <= until:
            due[block] = min(since, due.get(block, since))
        # What changes a season's first day may change the bare soil before it.
        free = stretch.free_from
        if free is not None and free <= due.get(block, date.min) <= stretch.start:
            due[block] = free
    return due


@dataclass(frozen=True)
class Computed:
    """A subject with its ledger and the p10 and p90 of its depletion, outlook included."""

    subject: Subject
    ledger: BlockLedger
    p10: Floats
    p90: Floats
    taken: tuple[Taken, ...] = ()
    """What the season's readings did."""


def compute(subjects: list[Subject]) -> list[Computed]:
    """The ledgers of subjects, corrected by their readings, and their ranges.

    A stretch that carries over what the one before it leaves waits for that one.
    """
    found: dict[int, Computed] = {}
    while len(found) < len(subjects):
        ready = [n for n, _ in enumerate(subjects) if n not in found and _told(subjects, n, found)]
        turn = [_opened(subjects[n], found.get(n - 1)) for n in ready]
        found.update(zip(ready, _compute(turn), strict=True))
    return [found[n] for n in range(len(subjects))]


def _told(subjects: list[Subject], n: int, found: Mapping[int, Computed]) -> bool:
    """Whether all that the opening of subject `n` rests on is known."""
    one = subjects[n]
    waits = n > 0 and one.stretch.carries and one.follows(subjects[n - 1])
    return not waits or n - 1 in found


def _opened(subject: Subject, before: Computed | None) -> Subject:
    """The subject with the opening that the stretch before it leaves, computed or stored."""
    close = subject.close
    if before is not None and subject.follows(before.subject):
        ledger = before.ledger
        close = Close(
            root_depth_m=float(ledger.root_depth_m[-1]),
            depletion_mm=float(ledger.depletion_mm[-1]),
            subsoil_mm=float(ledger.subsoil_depletion_mm[-1]),
            layer_mm=float(np.nan_to_num(ledger.evaporation_layer_depletion_mm[-1])),
            p10_mm=float(before.p10[-1]),
            p90_mm=float(before.p90[-1]),
        )
    if close is None or not subject.stretch.carries:
        return subject
    plan, width = opened(subject.plan, close, subject.stretch.deepest_before_m)
    return replace(subject, plan=plan, opening_width_mm=width)


def _compute(subjects: list[Subject]) -> list[Computed]:
    seeds = [_seed(subject) for subject in subjects]
    subjects, taken = corrected(subjects, seeds)
    plans = [subject.plan for subject in subjects]
    weather = [subject.weather for subject in subjects]
    ledgers = block_ledgers(plans, weather)
    ranges = ensemble_depletions(
        plans,
        weather,
        seeds,
        MEMBERS,
        initial_unknown=[subject.opening_unknown for subject in subjects],
        initial_width_mm=[subject.opening_width_mm for subject in subjects],
        ahead=[subject.ahead for subject in subjects],
    )
    return [
        Computed(subject, ledger, low, high, tuple(taken.get(n, ())))
        for n, (subject, ledger, (low, high)) in enumerate(
            zip(subjects, ledgers, ranges, strict=True)
        )
    ]


def _seed(subject: Subject) -> int:
    """Of the block and its season, so that the same inputs give the same bytes and a new day does
    not stir the days before."""
    name = f"{subject.block.field_key}/{subject.block.block_key}/{subject.season.planting}"
    return zlib.crc32(name.encode())


def write_ledgers(session: Session, computed: Sequence[Computed], since: Mapping[int, date]) -> int:
    """Write ledger rows from each block's day of `since` on; returns how many."""
    rows: list[dict[str, Any]] = []
    for one in computed:
        first = since.get(one.subject.block.block_id)
        if first is not None:
            rows.extend(_ledger_rows(one, first))
    written = replace_ledger_days(session, since, rows)
    starts: dict[int, date] = {}
    for one in computed:
        block, first = one.subject.block.block_id, agronomy.as_date(one.subject.plan.start)
        starts[block] = min(first, starts.get(block, first))
    told = [
        {
            "event_id": taken.event_id,
            "block_id": one.subject.block.block_id,
            "close": taken.close,
            **asdict(taken.correction),
        }
        for one in computed
        for taken in one.taken
    ]
    replace_readings(session, starts, told)
    clear_dirty(session, sorted(since))
    return written


def _ledger_rows(computed: Computed, since: date) -> Iterator[dict[str, Any]]:
    subject, ledger = computed.subject, computed.ledger
    columns: dict[str, list[Any]] = {}
    for name in LEDGER_COLUMNS:
        values = getattr(ledger, name)
        if name in {"rung", "standing"}:
            columns[name] = values.tolist()
        else:
            columns[name] = numbers(values)
    if subject.stretch.bare:  # It asks for no water, however dry.
        columns["standing"] = [
            "wet" if depletion <= 0.0 else "easy" for depletion in ledger.depletion_mm
        ]
    columns["depletion_p10_mm"] = numbers(computed.p10)
    columns["depletion_p90_mm"] = numbers(computed.p90)
    for place in range(subject.past):
        day = agronomy.as_date(ledger.date[place])
        if day >= since:
            yield {
                "day": day,
                "block_id": subject.block.block_id,
                "season_id": subject.season.season_id,
                **{name: values[place] for name, values in columns.items()},
            }
