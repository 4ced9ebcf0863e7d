"""An advisor accepts, changes or withholds an advice; what goes out to growers follows."""

import math
from datetime import UTC, date, datetime, timedelta

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.storage.database import Database
from app.storage.decisions import TAKE_BACK
from app.storage.tables import Advice, Block, Field, IrrigationSystem
from app.storage.tables_decisions import Decision
from app.workflows.once import EntryError, once

VERDICTS = ("accept", "change", "withhold", TAKE_BACK)
FARTHEST = timedelta(days=14)


def decide_on_advice(
    db: Database,
    field_key: str,
    block_key: str | None,
    verdict: str,
    who: str,
    token: str,
    today: date,
    *,
    day: date | None = None,
    hours: float | None = None,
    note: str = "",
) -> int:
    """Keep a decision on the advice that stands for a block (the first one when not named).

    accept: as advised. change: water on `day` for `hours`, where None as advised. withhold: no
    water through `day` (today when None); needs a note. take_back: what was decided no longer
    counts. Returns its number. Raises EntryError.
    """
    note = note.strip()
    if verdict not in VERDICTS:
        raise EntryError(f"verdict is {verdict!r}; choose one of {', '.join(VERDICTS)}")
    if day is not None and not today <= day <= today + FARTHEST:
        raise EntryError(f"day is {day}; give a day from {today} to {today + FARTHEST}")
    if hours is not None and not (math.isfinite(hours) and 0 < hours <= 1000):
        raise EntryError(f"hours is {hours:g}; it must be a number above 0 and at most 1000")
    if verdict == "withhold" and not note:
        raise EntryError("note is empty; say why the water is withheld")
    with db.write() as session:
        block, system = _block(session, field_key, block_key)
        origin = once(token, block.id)
        already = session.scalar(select(Decision.id).where(Decision.origin == origin))
        if already is not None:
            return already
        advice = session.scalars(
            select(Advice)
            .where(Advice.block_id == block.id, Advice.issued_on <= today, Advice.stands)
            .order_by(Advice.issued_on.desc(), Advice.number.desc())
            .limit(1)
        ).first()
        if advice is None:
            raise EntryError("there is no advice to decide on yet")
        on, run = _plan(verdict, advice, day, hours, today)
        gross = run * system["rate_mm_h"]
        decision = Decision(
            block_id=block.id,
            number=advice.number,
            verdict=verdict,
            made_on=today,
            until=on or day or today,
            day=on,
            net_mm=gross * system["efficiency"],
            gross_mm=gross,
            hours=run,
            volume_m3=10 * gross * block.area_ha,
            note=note,
            who=who,
            entered=datetime.now(UTC),
            origin=origin,
        )
        session.add(decision)
        session.flush()
        return decision.id


def _plan(
    verdict: str, advice: Advice, day: date | None, hours: float | None, today: date
) -> tuple[date | None, float]:
    """The day to water and the running time [h] that a verdict leaves."""
    if verdict in ("withhold", TAKE_BACK):
        return None, 0.0
    advised = max(advice.day, today) if advice.day is not None and advice.hours > 0 else None
    if verdict == "accept":
        if day is not None or hours is not None:
            raise EntryError("a day or hours of your own are a change; choose change")
        return advised, advice.hours if advised else 0.0
    on, run = day or advised, advice.hours if hours is None else hours
    if on is None or not run:
        raise EntryError("the advice asks for no water; give the day and the hours")
    return on, run


def _block(
    session: Session, field_key: str, block_key: str | None
) -> tuple[Block, dict[str, float]]:
    wanted = (
        select(Block, IrrigationSystem.details)
        .join(Field, Field.id == Block.field_id)
        .join(IrrigationSystem, IrrigationSystem.id == Block.system_id)
        .where(Field.key == field_key)
        .order_by(Block.id)
    )
    if block_key is not None:
        wanted = wanted.where(Block.key == block_key)
    row = session.execute(wanted).first()
    if row is None:
        part = f" with a block {block_key!r}" if block_key else ""
        raise EntryError(f"there is no field {field_key!r}{part}")
    return row[0], row[1]
