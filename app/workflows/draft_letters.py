"""See to it that every recipient's letter of the week is in the book as a draft."""

from datetime import date, datetime, timedelta

from sqlalchemy.orm import Session

from app.letters.compose import message_id
from app.settings import Mail
from app.storage import letters as store
from app.storage import recipients as people
from app.storage.recipients import RecipientRow
from app.storage.tables_letters import Letter
from app.workflows.letter_weeks import due_at, first_day_of, monday, zone_of

AHEAD = timedelta(days=6, hours=12)
LATE = timedelta(days=2)
"""A letter that nobody had in the book is still written this long after it was due."""


def draft_letters(session: Session, mail: Mail, now: datetime) -> int:
    """Add the drafts that are missing, and move those whose recipient changed the day or hour;
    returns how many were added."""
    week = monday(now.date())
    weeks = [week - timedelta(days=7), week, week + timedelta(days=7)]
    there = store.letter_keys(session, weeks)
    offsets = people.farm_offsets(session)
    added = 0
    for row in people.recipients(session):
        zone = zone_of(row.farm, offsets.get(row.farm_id, 0.0))
        for start in weeks:
            due = due_at(start, row.weekday, row.hour, zone)
            first = first_day_of(start, row.weekday, row.hour)
            letter = there.get((row.id, start, 0))
            if letter is not None:
                if letter.state in store.OPEN and now < letter.due:
                    letter.due, letter.first_day = due, first
            elif gets_letters(row) and now - LATE <= due <= now + AHEAD:
                session.add(new_letter(row, start, 0, first, due, mail))
                added += 1
    session.flush()
    return added


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
