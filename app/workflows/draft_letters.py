"""See to it that every recipient's letter of the week is in the book as a draft."""

from datetime import date, datetime, timedelta

from sqlalchemy.orm import Session

from app.letters.compose import message_id
from app.settings import Mail
from app.storage import letters as store
from app.storage import recipients as people
from app.storage.database import Database
from app.storage.recipients import RecipientRow
from app.storage.tables_letters import Letter
from app.workflows.letter_weeks import due_at, first_day_of, monday, zone_of

AHEAD = timedelta(days=6, hours=12)
LATE = timedelta(days=2)
"""A letter that nobody had in the book is still written this long after it was due."""


def see_to_drafts(db: Database, mail: Mail, now: datetime) -> None:
    """Draft what is missing, and the key that signs links; writes only where something is."""
    with db.read() as session:
        new, moved = _missing(session, mail, now)
        whole = not new and not moved and store.has_signing_key(session)
        session.rollback()
    if not whole:
        with db.write() as session:
            store.signing_key(session)
            draft_letters(session, mail, now)


def draft_letters(session: Session, mail: Mail, now: datetime) -> int:
    """Add the drafts that are missing, and move those whose recipient changed the day or hour;
    returns how many were added."""
    new, moved = _missing(session, mail, now)
    for letter, due, first_day in moved:
        letter.due, letter.first_day = due, first_day
    session.add_all(new)
    session.flush()
    return len(new)


def _missing(
    session: Session, mail: Mail, now: datetime
) -> tuple[list[Letter], list[tuple[Letter, datetime, date]]]:
    """Letters to be drafted, and open ones to be moved, with their new due instant and day."""
    week = monday(now.date())
    weeks = [week - timedelta(days=7), week, week + timedelta(days=7)]
    there = store.letter_keys(session, weeks)
    offsets = people.farm_offsets(session)
    new, moved = [], []
    for row in people.recipients(session):
        zone = zone_of(row.farm, offsets.get(row.farm_id, 0.0))
        for start in weeks:
            due = due_at(start, row.weekday, row.hour, zone)
            first = first_day_of(start, row.weekday, row.hour)
            letter = there.get((row.id, start, 0))
            if letter is not None:
                if letter.state in store.OPEN and now < letter.due != due:
                    moved.append((letter, due, first))
            elif gets_letters(row) and now - LATE <= due <= now + AHEAD:
                new.append(new_letter(row, start, 0, first, due, mail))
    return new, moved


def gets_letters(row: RecipientRow) -> bool:
    """Whether letters go to a recipient at all."""
    return not row.paused and row.stopped_at is None


def new_letter(
    row: RecipientRow, week: date, revision: int, first_day: date, due: datetime, mail: Mail
) -> Letter:
    """A draft."""
    return Letter(
        farm_id=row.farm_id,
        recipient_id=row.id,
        week=week,
        revision=revision,
        first_day=first_day,
        due=due,
        state="draft",
        message_id=message_id(row.id, str(week), revision, mail),
        note="",
        why="",
        subject="",
        content=None,
        data=None,
        to="",
        released_by="",
        released_at=None,
        claim="",
        claimed_until=None,
        tries=0,
        next_try=None,
        words="",
        settled_at=None,
    )
