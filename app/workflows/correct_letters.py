"""Write the week's correction where the advice moved away from a letter that was sent."""

from datetime import date, datetime

from sqlalchemy.orm import Session

from app.letters.content import Content
from app.settings import Settings
from app.storage import letters as store
from app.storage import recipients as people
from app.storage.letters import LetterRow
from app.workflows.correct import Thresholds, changed_fields
from app.workflows.draft_letters import gets_letters, new_letter
from app.workflows.letter_facts import FarmFacts, farm_facts, letter_content


def correct_letters(session: Session, settings: Settings, now: datetime, today: date) -> int:
    """Draft a correction for each letter of this week whose advice moved; at most one a letter.

    It is due at once, and goes by itself only where the farm's letters do. Returns how many.
    """
    rows = store.sent_to_correct(session, today)
    if not rows:
        return 0
    facts = farm_facts(session, today)
    people_by_id = {row.id: row for row in people.recipients(session)}
    thresholds = Thresholds(settings.correction_days, settings.correction_share)
    drafted = 0
    for row in rows:
        recipient = people_by_id[row.recipient.id]
        changed = _changed(session, row, facts.get(row.farm.key), settings, today, thresholds)
        if not changed or not gets_letters(recipient):
            continue
        week, first_day = row.letter.week, row.letter.first_day
        letter = new_letter(recipient, week, 1, first_day, now, settings.mail)
        letter.why = "\n".join(changed)
        session.add(letter)
        drafted += 1
    session.flush()
    return drafted


def _changed(
    session: Session,
    row: LetterRow,
    facts: FarmFacts | None,
    settings: Settings,
    today: date,
    thresholds: Thresholds,
) -> list[str]:
    old = Content.model_validate(row.letter.content)
    if facts is None or facts.morning is None or facts.morning <= old.morning:
        return []
    week, domain = row.letter.week, settings.mail.domain
    new = letter_content(facts, week, old.first_day, domain)
    if new is None or old.last_day < today:
        return []
    watered = watered_since(session, facts, old.morning)
    return changed_fields(old, new, watered, today, thresholds)


def watered_since(session: Session, facts: FarmFacts, since: date) -> dict[str, int]:
    """Irrigations logged since a morning, by field."""
    counts = store.watered_since(session, facts.blocks, since)
    return {
        one.row.field_key: counts[one.row.block_id]
        for one in facts.fields
        if one.row.block_id in counts
    }
