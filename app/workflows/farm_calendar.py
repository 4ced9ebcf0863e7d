"""A farm's days to water as a calendar that follows its letters."""

from datetime import date, datetime, timedelta

from sqlalchemy.orm import Session

from app.letters.calendar import calendar
from app.letters.content import Content
from app.settings import Settings
from app.storage import letters as store
from app.wording.reader import Reader
from app.workflows.letter_facts import farm_facts, letter_content
from app.workflows.letter_weeks import monday

WEEKS = 8


def farm_calendar(
    session: Session, farm: str, reader: Reader, settings: Settings, now: datetime, today: date
) -> bytes:
    """What the letters of the last weeks said, corrections in place of what they correct, and what
    this week's would say where none was sent yet."""
    since = [monday(today) - timedelta(days=7 * back) for back in range(-1, WEEKS)]
    rows = store.letters(session, since, frozenset({farm}), states=("sent",))
    said: dict[date, list[tuple[Content, datetime]]] = {}
    for row in sorted(rows, key=lambda row: (row.letter.week, row.letter.revision)):
        content = Content.model_validate(row.letter.content)
        at = row.letter.released_at or row.letter.due
        said.setdefault(row.letter.week, []).append((content, at))
    if monday(today) not in said:
        facts = farm_facts(session, today, frozenset({farm})).get(farm)
        domain = settings.mail.domain
        found = letter_content(facts, monday(today), today, domain) if facts else None
        if found is not None:
            said[monday(today)] = [(found, now)]
    parts = [part for week in sorted(said) for part in _in_force(said[week])]
    return calendar(
        [(content, (), at.replace(microsecond=0)) for content, at in parts],
        reader,
        settings.mail.sender_address,
    )


def _in_force(week: list[tuple[Content, datetime]]) -> list[tuple[Content, datetime]]:
    """A week's letters, each without what a correction has taken the place of."""
    corrected = min((c.morning for c, _ in week if c.revision), default=date.max)
    return [
        (content, at)
        if content.revision
        else (
            content.model_copy(
                update={"items": [item for item in content.items if item.day < corrected]}
            ),
            at,
        )
        for content, at in week
    ]
