"""Statements for letters: drafts, claims, outcomes, answers."""

import secrets
from collections.abc import Iterable, Sequence
from datetime import date, datetime, timedelta
from typing import Any, NamedTuple

from sqlalchemy import and_, func, or_, select, update
from sqlalchemy.orm import Session

from app.storage.scope import Farms, of_farms
from app.storage.tables import Advice, Event, Farm
from app.storage.tables_letters import Letter, LetterAnswer, Recipient, SigningKey

OPEN = ("draft", "held")
"""States in which a letter is composed anew at every look."""
ON_ITS_WAY = ("claimed", "sending")


def signing_key(session: Session) -> bytes:
    """The key that signs links; made at the first need, in a transaction to write."""
    row = session.scalar(select(SigningKey).order_by(SigningKey.id).limit(1))
    if row is None:
        row = SigningKey(id=1, key=secrets.token_bytes(32))
        session.add(row)
        session.flush()
    return row.key


def has_signing_key(session: Session) -> bool:
    """Whether the key that signs links has been made."""
    return session.scalar(select(func.count()).select_from(SigningKey)) != 0


class LetterRow(NamedTuple):
    """A letter with its recipient and farm, without its bytes."""

    letter: Letter
    recipient: Recipient
    farm: Farm


def letters(
    session: Session,
    weeks: Sequence[date] | None = None,
    farms: Farms = None,
    one: int | None = None,
    states: Iterable[str] | None = None,
    most: int | None = None,
) -> list[LetterRow]:
    """Letters, newest week first, then by farm and recipient."""
    statement = (
        select(Letter, Recipient, Farm)
        .join(Recipient, Recipient.id == Letter.recipient_id)
        .join(Farm, Farm.id == Letter.farm_id)
        .order_by(Letter.week.desc(), Farm.name, Recipient.name, Letter.id)
    )
    if weeks is not None:
        statement = statement.where(Letter.week.in_(weeks))
    statement = of_farms(statement, farms)
    if one is not None:
        statement = statement.where(Letter.id == one)
    if states is not None:
        statement = statement.where(Letter.state.in_(list(states)))
    if most is not None:
        statement = statement.limit(most)
    return [LetterRow(row[0], row[1], row[2]) for row in session.execute(statement)]


def letter_keys(session: Session, weeks: Sequence[date]) -> dict[tuple[int, date, int], Letter]:
    """The letters of some weeks by recipient, week and revision."""
    return {
        (row.recipient_id, row.week, row.revision): row
        for row in session.scalars(select(Letter).where(Letter.week.in_(weeks)))
    }


def newest_advice(session: Session) -> int:
    """The number of the newest advice, 0 for none."""
    return session.scalar(select(func.max(Advice.number))) or 0


# On their way


def recover(session: Session, now: datetime) -> tuple[int, int]:
    """Letters whose worker is gone: claimed ones are released, sending ones unsure; counts."""
    gone = Letter.claimed_until < now
    freed = session.execute(
        update(Letter)
        .where(Letter.state == "claimed", gone)
        .values(state="released", claim="", claimed_until=None)
    )
    doubted = session.execute(
        update(Letter)
        .where(Letter.state == "sending", gone)
        .values(state="unsure", claimed_until=None, settled_at=now)
    )
    return _rows(freed), _rows(doubted)


class Claimed(NamedTuple):
    """A letter that one worker has taken to send."""

    id: int
    to: str
    data: bytes
    due: datetime
    tries: int


def claim_next(session: Session, now: datetime, claim: str, until: datetime) -> Claimed | None:
    """Take the next letter that is due, for this worker alone; None where there is none."""
    row = session.scalar(
        select(Letter)
        .where(Letter.state == "released", Letter.due <= now, Letter.data.is_not(None))
        .where(or_(Letter.next_try.is_(None), Letter.next_try <= now))
        .order_by(Letter.due, Letter.id)
        .limit(1)
    )
    if row is None:
        return None
    taken = session.execute(
        update(Letter)
        .where(Letter.id == row.id, Letter.state == "released")
        .values(state="claimed", claim=claim, claimed_until=until)
    )
    assert row.data is not None
    return Claimed(row.id, row.to, row.data, row.due, row.tries) if _rows(taken) else None


def mark_sending(session: Session, number: int, claim: str, until: datetime) -> bool:
    """From here on the letter may be gone; False where this worker no longer holds it."""
    return _settle(session, number, claim, ("claimed",), state="sending", claimed_until=until)


def settle(session: Session, number: int, claim: str, /, **values: Any) -> bool:
    """Write how a try ended; False where this worker no longer holds the letter.

    A worker that was thought gone may still find out what became of its letter."""
    states = ("claimed", "sending", "unsure")
    return _settle(session, number, claim, states, claimed_until=None, **values)


def _settle(
    session: Session, number: int, claim: str, states: tuple[str, ...], **values: Any
) -> bool:
    done = session.execute(
        update(Letter)
        .where(Letter.id == number, Letter.claim == claim, Letter.state.in_(states))
        .values(**values)
    )
    return _rows(done) > 0


def _rows(result: Any) -> int:
    return int(result.rowcount)


def waiting(session: Session, now: datetime) -> dict[str, int]:
    """How many letters that are due stand in each state."""
    rows = session.execute(
        select(Letter.state, func.count())
        .where(Letter.due <= now, Letter.state.in_(("draft", "held", "released", "unsure")))
        .group_by(Letter.state)
    )
    return {state: count for state, count in rows}


# Answers


def count_answers(session: Session, letter: int, item: int) -> int:
    """How often a line of a letter was answered."""
    return (
        session.scalar(
            select(func.count()).where(LetterAnswer.letter_id == letter, LetterAnswer.item == item)
        )
        or 0
    )


def answers(session: Session, letter_ids: Sequence[int]) -> dict[tuple[int, int], LetterAnswer]:
    """The last answer to each item of some letters, by letter and item."""
    rows = session.scalars(
        select(LetterAnswer).where(LetterAnswer.letter_id.in_(letter_ids)).order_by(LetterAnswer.id)
    )
    return {(row.letter_id, row.item): row for row in rows}


def watered_since(session: Session, blocks: Sequence[int], since: date) -> dict[int, int]:
    """How many irrigations that stand each block had from a day on."""
    later = Event.__table__.alias()
    rows = session.execute(
        select(Event.block_id, func.count())
        .outerjoin(later, later.c.supersedes == Event.id)
        .where(Event.block_id.in_(blocks), Event.day >= since, Event.kind == "irrigation")
        .where(later.c.id.is_(None))
        .group_by(Event.block_id)
    )
    return {block: count for block, count in rows}


def sent_to_correct(session: Session, today: date) -> list[LetterRow]:
    """This week's first letters that were sent and have no correction yet."""
    correction = Letter.__table__.alias()
    statement = (
        select(Letter, Recipient, Farm)
        .join(Recipient, Recipient.id == Letter.recipient_id)
        .join(Farm, Farm.id == Letter.farm_id)
        .outerjoin(
            correction,
            and_(
                correction.c.recipient_id == Letter.recipient_id,
                correction.c.week == Letter.week,
                correction.c.revision == 1,
            ),
        )
        .where(Letter.state == "sent", Letter.revision == 0, correction.c.id.is_(None))
        .where(Letter.first_day > today - timedelta(days=7), Letter.first_day <= today)
        .order_by(Letter.id)
    )
    return [LetterRow(row[0], row[1], row[2]) for row in session.execute(statement)]
