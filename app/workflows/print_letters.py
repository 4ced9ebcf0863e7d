"""The letters of a week for the terminal: to look at, or to send."""

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date, datetime, timedelta

from app.letters.compose import body_text
from app.settings import Settings
from app.storage import letters as store
from app.storage.database import Database
from app.workflows.draft_letters import see_to_drafts
from app.workflows.release_letters import release_rows
from app.workflows.write_letters import write_letters

AROUND = timedelta(days=2)


@dataclass(frozen=True)
class Printed:
    """A letter as it would leave: to whom, when due (UTC), its state, subject and plain text."""

    farm: str
    to: str
    due: datetime
    state: str
    subject: str
    text: str


def letters_due(db: Database, settings: Settings, now: datetime, today: date) -> Iterator[Printed]:
    """The letters that are due by `now`, or were within two days, and are not sent yet."""
    see_to_drafts(db, settings.mail, now)
    with db.read() as session:
        waiting = store.letters(session, states=("draft", "held", "released"))
        rows = [row for row in waiting if now - AROUND <= row.letter.due <= now]
        for row in rows:
            written = write_letters(session, [row], settings, now, today)[row.letter.id]
            yield Printed(
                row.farm.name,
                f"{row.recipient.name} <{row.recipient.address}>",
                row.letter.due,
                row.letter.state,
                written.view.subject if written else "",
                body_text(written.view) if written else "",
            )


def release_due(db: Database, settings: Settings, who: str, now: datetime, today: date) -> int:
    """Release every draft that is due by `now`, or was within two days; returns how many."""
    see_to_drafts(db, settings.mail, now)
    with db.write() as session:
        drafts = store.letters(session, states=("draft",))
        rows = [row for row in drafts if now - AROUND <= row.letter.due <= now]
        return len(release_rows(session, rows, who, settings, now, today))
