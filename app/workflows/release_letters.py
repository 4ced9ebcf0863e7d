"""The advisor's decisions on letters: note, hold, release, take back, send again."""

from collections.abc import Sequence
from datetime import date, datetime

from sqlalchemy.orm import Session

from app.settings import Settings
from app.storage import letters as store
from app.storage.letters import LetterRow
from app.workflows.once import EntryError
from app.workflows.write_letters import Written, write_letters

LONGEST_NOTE = 2000


def letter_row(session: Session, number: int) -> LetterRow:
    """A letter by number; raises EntryError."""
    found = store.letters(session, one=number)
    if not found:
        raise EntryError(f"there is no letter {number}")
    return found[0]


def set_note(session: Session, number: int, note: str, whole_farm: bool) -> None:
    """Put the advisor's note into a letter, or into all open ones of its farm and week."""
    row = letter_row(session, number)
    note = note.replace("\r\n", "\n").strip()
    if len(note) > LONGEST_NOTE:
        raise EntryError(f"the note has {len(note)} signs; at most {LONGEST_NOTE} are taken")
    _must_be(row, store.OPEN, "its note can no longer be changed; take it back first")
    rows = (
        store.letters(session, [row.letter.week], frozenset({row.farm.key}))
        if whole_farm
        else [row]
    )
    for other in rows:
        if other.letter.state in store.OPEN:
            other.letter.note = note


def hold(session: Session, number: int, why: str) -> None:
    """Keep a letter back until somebody releases it."""
    row = letter_row(session, number)
    _must_be(row, ("draft", "released"), "it cannot be held")
    row.letter.state, row.letter.why = "held", why.strip()[:200]
    row.letter.data = row.letter.content = None


def take_back(session: Session, number: int) -> None:
    """Make a released or held letter a draft again."""
    row = letter_row(session, number)
    _must_be(row, ("released", "held"), "it cannot be taken back")
    row.letter.state = "draft"
    row.letter.data = row.letter.content = None
    row.letter.tries, row.letter.next_try, row.letter.words = 0, None, ""
    if row.letter.revision == 0:
        row.letter.why = ""


def release(
    session: Session,
    numbers: Sequence[int],
    who: str,
    settings: Settings,
    now: datetime,
    today: date,
    at_once: bool = False,
) -> list[int]:
    """Freeze letters as they would be sent now, to leave when they are due, or at once.

    Returns those released; the others have no advice to write from and are held. Raises EntryError
    where one is past changing.
    """
    rows = [letter_row(session, number) for number in numbers]
    for row in rows:
        _must_be(row, store.OPEN, "it is released already")
    return release_rows(session, rows, who, settings, now, today, at_once)


def release_rows(
    session: Session,
    rows: Sequence[LetterRow],
    who: str,
    settings: Settings,
    now: datetime,
    today: date,
    at_once: bool = False,
) -> list[int]:
    """The same, for rows at hand."""
    released = []
    for number, written in write_letters(session, rows, settings, now, today).items():
        row = next(row for row in rows if row.letter.id == number)
        if written is None:
            row.letter.state, row.letter.why = "held", "no_advice"
            continue
        freeze(row, written, who, now)
        if at_once:
            row.letter.due = min(row.letter.due, now)
        released.append(number)
    return released


def freeze(row: LetterRow, written: Written, who: str, now: datetime) -> None:
    """Keep a letter as it will be sent."""
    letter = row.letter
    letter.state, letter.released_by, letter.released_at = "released", who, now
    letter.data, letter.subject = written.data, written.view.subject
    letter.content = written.content.model_dump(mode="json")
    letter.to = row.recipient.address
    letter.tries, letter.next_try, letter.words = 0, None, ""
    if not letter.revision:
        letter.why = ""


def send_again(
    session: Session, number: int, who: str, settings: Settings, now: datetime, today: date
) -> None:
    """Send a letter again that was refused, or of which nobody knows whether it went.

    An unsure one goes byte for byte as before, under its Message-ID, so that a mail program that
    has it shows one. A refused one never went, and is written anew. Raises EntryError for others.
    """
    row = letter_row(session, number)
    _must_be(row, ("refused", "unsure"), "it is not sent again")
    if row.letter.state == "refused":
        row.letter.state = "draft"
        release_rows(session, [row], who, settings, now, today, at_once=True)
        return
    row.letter.state, row.letter.released_by = "released", who
    row.letter.claim, row.letter.tries, row.letter.next_try = "", 0, None


def it_arrived(session: Session, number: int) -> None:
    """Settle an unsure letter: somebody knows that it arrived."""
    row = letter_row(session, number)
    _must_be(row, ("unsure",), "it is not unsure")
    row.letter.state = "sent"


def _must_be(row: LetterRow, states: Sequence[str], why_not: str) -> None:
    if row.letter.state not in states:
        raise EntryError(f"the letter to {row.recipient.name} is {row.letter.state}; {why_not}")
