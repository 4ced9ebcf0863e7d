"""Bring ledgers up to date from station days, the book and events.

Only what is dirty is touched, from its first dirty day, in the caller's transaction. A ledger is
also carried on to the last closed day when no new reading came: those days rest on the usual for
the date and are recomputed when the readings arrive.
"""

import zlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import asdict, dataclass
from datetime import date, timedelta
from typing import Any

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
from app.workflows.assemble import Subject, seasons_of
from app.workflows.readings import Taken, corrected

MEMBERS = 200
LEDGER_COLUMNS = tuple(
    column.name
    for column in LedgerDay.__table__.columns
    if column.name not in {"day", "block_id", "season_id"}
)


def due_ledgers(session: Session, through: date) -> dict[int, date]:
    """Blocks whose ledger is dirty or stops before it should, and the day to write from.

    A season without a ledger is due once a station of its field has reference ET before its end.
    """
    blocks = read_blocks(session)
    due = {row.block_id: row.dirty_from for row in blocks if row.dirty_from is not None}
    last, known = last_ledger_days(session), first_energy_days(session)
    for season, crop in seasons_of(session, [row.block_id for row in blocks]):
        until = min(through, agronomy.as_date(crop.last_day))
        if season.season_id in last:
            since = last[season.season_id] + timedelta(days=1)
        else:
            since = max(season.planting, known.get(season.block_id, date.max))
        if since <= until:
            due[season.block_id] = min(since, due.get(season.block_id, since))
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
    """The ledgers of subjects, corrected by their readings, and their ranges."""
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
