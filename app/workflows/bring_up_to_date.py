"""The morning's work, and the work after any change: days, ledgers, advice, in one transaction."""

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date, timedelta

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from app.storage.database import Database
from app.storage.tables import Advice, Block
from app.workflows.advise import advise
from app.workflows.assemble import assemble
from app.workflows.presume import presume
from app.workflows.recompute import compute, due_ledgers, write_ledgers
from app.workflows.station_days import recompute_stations

BLOCKS_AT_A_TIME = 256


@dataclass(frozen=True)
class UpToDate:
    """How much was done: station days, blocks and ledger days recomputed, advice numbers issued.

    advised_until: a morning after today's that has advice; then none is issued for today, for it
    would rest on what was not known then."""

    station_days: int
    blocks: int
    ledger_days: int
    advices: int
    advised_until: date | None


def bring_up_to_date(db: Database, today: date) -> UpToDate:
    """Recompute what is dirty through yesterday and issue this morning's advice."""
    with db.write() as session:
        return up_to_date(session, today)


def up_to_date(session: Session, today: date) -> UpToDate:
    """The same, in the caller's transaction, so that a change and its consequences land as one."""
    through = today - timedelta(days=1)
    days = recompute_stations(session)
    presume(session, today)
    due = due_ledgers(session, through)
    ledger_days = advices = 0
    later = _advised_after(session, today)
    unadvised = [] if later else _unadvised(session, today)
    since = dict.fromkeys(unadvised, today) | due
    for some in batched(sorted(since), BLOCKS_AT_A_TIME):
        computed = compute(assemble(session, {block: since[block] for block in some}, through))
        written = {block: due[block] for block in some if block in due}
        ledger_days += write_ledgers(session, computed, written)
        if later is None:
            advices += advise(session, today, computed)
    return UpToDate(days, len(due), ledger_days, advices, later)


def _advised_after(session: Session, today: date) -> date | None:
    """The last morning with advice, where it is after today's."""
    return session.scalar(select(func.max(Advice.issued_on)).where(Advice.issued_on > today))


def _unadvised(session: Session, today: date) -> list[int]:
    """Blocks without advice this morning."""
    advised = select(Advice.block_id).where(Advice.issued_on == today)
    return list(session.scalars(select(Block.id).where(Block.id.not_in(advised))))


def batched(blocks: list[int], size: int) -> Iterator[list[int]]:
    """The list in parts of at most `size`."""
    return (blocks[start : start + size] for start in range(0, len(blocks), size))
