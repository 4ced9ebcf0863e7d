"""The morning's work, and the work after any change: days, ledgers, advice, in one transaction."""

from dataclasses import dataclass
from datetime import date, timedelta

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.storage.database import Database
from app.storage.tables import Advice, Block
from app.workflows.advise import advise
from app.workflows.assemble import assemble
from app.workflows.recompute import due_ledgers, recompute_ledgers, recompute_stations

BLOCKS_AT_A_TIME = 256


@dataclass(frozen=True)
class UpToDate:
    """How much was done: station days, blocks and ledger days recomputed, advice numbers issued."""

    station_days: int
    blocks: int
    ledger_days: int
    advices: int


def bring_up_to_date(db: Database, today: date) -> UpToDate:
    """Recompute what is dirty through yesterday and issue this morning's advice."""
    with db.write() as session:
        return up_to_date(session, today)


def up_to_date(session: Session, today: date) -> UpToDate:
    """The same, in the caller's transaction, so that a change and its consequences land as one."""
    through = today - timedelta(days=1)
    days = recompute_stations(session)
    due = due_ledgers(session, through)
    ledger_days = 0
    for some in _batches(sorted(due)):
        since = {block: due[block] for block in some}
        subjects = assemble(session, some, through, since=min(since.values()))
        ledger_days += recompute_ledgers(session, subjects, since)
    advices = 0
    for some in _batches(_to_advise(session, today, set(due))):
        advices += advise(session, today, some)
    return UpToDate(days, len(due), ledger_days, advices)


def _to_advise(session: Session, today: date, touched: set[int]) -> list[int]:
    """Blocks just recomputed, and those without advice this morning."""
    advised = set(session.scalars(select(Advice.block_id).where(Advice.issued_on == today)))
    every = set(session.scalars(select(Block.id)))
    return sorted(touched | (every - advised))


def _batches(blocks: list[int]) -> list[list[int]]:
    return [
        blocks[start : start + BLOCKS_AT_A_TIME]
        for start in range(0, len(blocks), BLOCKS_AT_A_TIME)
    ]
