"""Water that was advised and not heard of: presumed to have run, where the farm wants that."""

from datetime import UTC, date, datetime, timedelta

from sqlalchemy.orm import Session

from app.storage import book
from app.storage.decisions import Decided, standing_decisions
from app.storage.events import PRESUMED, irrigated_on, origins_taken
from app.storage.ledgers import advised_for
from app.storage.tables import Event

WHO = "presumed"


def presume(session: Session, today: date) -> int:
    """Log what was advised for yesterday and not heard of, as presumed; returns how many entries.

    Only blocks of farms that presume, each advice once: what was deleted or corrected since stays
    so. Nothing is presumed of mornings that nobody looked at, nor where the advisor decided
    otherwise.
    """
    day = today - timedelta(days=1)
    advised = advised_for(session, day)
    decided = standing_decisions(session, day, [one.block_id for one in advised])
    advised = [one for one in advised if _as_advised(decided.get(one.block_id))]
    heard = irrigated_on(session, [one.block_id for one in advised], day)
    done = origins_taken(session, [f"{PRESUMED}{one.number}" for one in advised])
    entries = [
        Event(
            block_id=one.block_id,
            kind="irrigation",
            day=day,
            amount=one.gross_mm,
            unit="gross_mm",
            purpose="crop",
            confirmation="presumed",
            who=WHO,
            note=f"advice no. {one.number}",
            entered=datetime.now(UTC),
            origin=f"{PRESUMED}{one.number}",
        )
        for one in advised
        if one.block_id not in heard and f"{PRESUMED}{one.number}" not in done
    ]
    session.add_all(entries)
    session.flush()
    book.dirty_blocks(session, [entry.block_id for entry in entries], day)
    return len(entries)


def _as_advised(decision: Decided | None) -> bool:
    return decision is None or decision.verdict == "accept"
