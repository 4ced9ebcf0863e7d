"""What the Letters desk shows, worded."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date, datetime, timedelta, tzinfo

from app import wording
from app.letters.content import Content, Item
from app.letters.view import subject
from app.storage.letters import LetterRow
from app.storage.tables_letters import LetterAnswer
from app.wording.desk import HELD_WHY, LETTER_STATES, STATE_WORDS
from app.workflows.letter_weeks import monday, zone_of
from app.workflows.post_letters import AUTOMATIC
from app.workflows.write_letters import reader_of

NEEDS_YOU = ("unsure", "refused", "held", "draft")
SHAPES = {"draft": "soon", "held": "due", "unsure": "late", "refused": "late", "sent": "easy"}
"""The shape beside a state: those of standings that ask as much."""


@dataclass(frozen=True)
class DeskRow:
    """A letter on the desk."""

    id: int
    farm: str
    farm_key: str
    to: str
    address: str
    how: str
    state: str
    shape: str
    says: str
    due: str
    overdue: bool
    subject: str
    doubts: int
    words: str
    answered: str
    releasable: bool


def desk_row(
    row: LetterRow,
    said: Content | None,
    offset_h: float,
    now: datetime,
    answers: Mapping[tuple[int, int], LetterAnswer],
) -> DeskRow:
    """A letter in words; `said` is what it says, or would say today."""
    letter = row.letter
    zone = zone_of(row.farm.details, offset_h)
    return DeskRow(
        letter.id,
        row.farm.name,
        row.farm.key,
        row.recipient.name,
        row.recipient.address,
        f"{row.recipient.language}, {'inches' if row.recipient.units == 'us' else 'mm'}",
        LETTER_STATES[letter.state],
        SHAPES.get(letter.state, "wet"),
        _says(row, zone),
        when(letter.due, zone),
        letter.due < now and letter.state in ("draft", "held"),
        letter.subject if said is None else subject(said, reader_of(row)),
        0 if said is None else len(said.doubts),
        HELD_WHY.get(letter.words, letter.words),
        _answered(row, said, answers),
        letter.state in ("draft", "held"),
    )


def when(at: datetime, zone: tzinfo) -> str:
    """`Sun 12 Jul, 18:00`, by the clock of the farm."""
    there = at.astimezone(zone)
    return f"{wording.short_day(there.date())}, {there:%H:%M}"


def _says(row: LetterRow, zone: tzinfo) -> str:
    letter = row.letter
    says = STATE_WORDS[letter.state]
    if letter.state == "draft" and row.farm.details.get("letters") == AUTOMATIC:
        says = "leaves by itself when it is due"
    if letter.state == "held" and letter.why:
        says += f": {HELD_WHY.get(letter.why, letter.why)}"
    if letter.state == "released" and letter.next_try is not None:
        says = f"put off; try {letter.tries + 1} at {when(letter.next_try, zone)}"
    if letter.settled_at is not None and letter.state == "sent":
        says += f" {when(letter.settled_at, zone)}"
    if letter.state in ("released", "sent"):
        by_itself = letter.released_by == AUTOMATIC
        says += ", by itself" if by_itself else f", released by {letter.released_by}"
    if letter.revision:
        says = f"correction {letter.revision}; {says}"
    return says


def _answered(
    row: LetterRow, said: Content | None, answers: Mapping[tuple[int, int], LetterAnswer]
) -> str:
    if row.letter.state != "sent" or said is None or not said.items:
        return ""
    found = [
        answers[key] for item in said.items if (key := (row.letter.id, item.number)) in answers
    ]
    done = sum(one.said == "done" for one in found)
    other = len(found) - done
    parts = [f"{done} done"] if done else []
    parts += [f"{other} otherwise"] if other else []
    return f"{', '.join(parts) or 'nothing'} of {len(said.items)} answered"


def content_of(
    row: LetterRow, today: Mapping[int, tuple[Content, list[Item]] | None]
) -> Content | None:
    """What a letter says: as it was released, or as it would be today."""
    if row.letter.content is not None:
        return Content.model_validate(row.letter.content)
    found = today.get(row.letter.id)
    return None if found is None else found[0]


def in_order(rows: Sequence[DeskRow]) -> list[DeskRow]:
    """Letters that need somebody first, then by farm."""
    return sorted(
        rows, key=lambda row: (row.state == "sent", not row.overdue, row.shape != "late", row.farm)
    )


def weeks_shown(today: date) -> list[date]:
    """The Mondays of this week, the next and the last."""
    start = monday(today)
    return [start + timedelta(days=7 * step) for step in (0, 1, -1)]
