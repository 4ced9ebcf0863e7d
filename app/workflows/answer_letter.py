"""What a grower answers to a line of a letter: done, something else, or not watered."""

from dataclasses import dataclass
from datetime import UTC, date, datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from app.letters.content import Content, Item
from app.storage import letters as store
from app.storage.database import Database
from app.storage.events import VOID, head_of
from app.storage.letters import LetterRow
from app.storage.tables import Event
from app.storage.tables_letters import LetterAnswer
from app.workflows.log_event import log_irrigation, void_event
from app.workflows.once import EntryError


@dataclass(frozen=True)
class Asked:
    """A line of a letter, and what was answered to it before ("" for nothing)."""

    row: LetterRow
    item: Item
    before: str


def asked(db: Database, letter: int, item: int) -> Asked:
    """What a link asks about; raises EntryError where there is no such line."""
    with db.read() as session:
        found = store.letters(session, one=letter)
        if not found or found[0].letter.content is None:
            raise EntryError(f"there is no letter {letter}")
        before = store.answers(session, [letter]).get((letter, item))
        said = "" if before is None else before.said
        session.expunge_all()
    content = Content.model_validate(found[0].letter.content)
    for one in content.items:
        if one.number == item:
            return Asked(found[0], one, said)
    raise EntryError(f"letter {letter} has no line {item}")


def answer(
    db: Database,
    to: Asked,
    said: str,
    day: date | None,
    amount: float | None,
    unit: str,
    today: date,
) -> None:
    """Keep an answer: the irrigation it tells is logged in place of one told before by the same
    line. said: done, otherwise, or not. Raises EntryError where the amount or day is not taken."""
    letter, item = to.row.letter.id, to.item.number
    who = f"{to.row.recipient.name}, by letter"
    with db.read() as session:
        nth = store.count_answers(session, letter, item)
        told = _told(session, letter, item, nth)
    event = None
    if said != "not":
        if day is None or amount is None:
            raise EntryError("a day and an amount are needed")
        event = log_irrigation(
            db, to.item.field_key, None, day, amount, unit, who,
            f"letter-{letter}-{item}-{nth}", today,
        )  # fmt: skip
    for number in told:
        void_event(db, number, who, f"letter-{letter}-{item}-{nth}-not-{number}", today)
    with db.write() as session:
        session.add(
            LetterAnswer(
                letter_id=letter, item=item, said=said, event_id=event, at=datetime.now(UTC)
            )
        )


def _told(session: Session, letter: int, item: int, nth: int) -> list[int]:
    """The events that stand which answers to this line told before the nth."""
    line = f"letter-{letter}-{item}-"
    told = session.scalars(
        select(Event)
        .where(Event.origin.startswith(line, autoescape=True))
        .where(~Event.origin.startswith(f"{line}{nth}/", autoescape=True))
    )
    heads = {head.id: head for head in (head_of(session, event) for event in told)}
    return [number for number, head in heads.items() if head.kind != VOID]
