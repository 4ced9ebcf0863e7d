"""Compose letters as they would be sent now: for a preview, and for good at their release."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date, datetime, timedelta

from sqlalchemy.orm import Session

from app.letters import links
from app.letters.compose import Envelope, as_bytes, compose
from app.letters.content import Content, Item
from app.letters.view import Links, View, view
from app.settings import Settings
from app.storage import letters as store
from app.storage import recipients as people
from app.storage.letters import LetterRow
from app.wording.reader import Reader, reader
from app.workflows.correct import corrected
from app.workflows.correct_letters import watered_since
from app.workflows.letter_facts import FarmFacts, farm_facts, letter_content

ANSWERABLE = timedelta(days=21)
"""How long after the last day of its week a letter's links take an answer."""


@dataclass(frozen=True)
class Written:
    """A letter as it would be sent: what it says, in its reader's words, and its bytes."""

    content: Content
    view: View
    data: bytes


def write_letters(
    session: Session, rows: Sequence[LetterRow], settings: Settings, now: datetime, today: date
) -> dict[int, Written | None]:
    """Letters by number; None where there is no advice to write from. Nothing is changed, but the
    signing key is made where there is none yet."""
    if not rows:
        return {}
    key = store.signing_key(session)
    return {
        row.letter.id: None if said is None else _written(*said, row, settings, now, key)
        for row, said in zip(rows, contents(session, rows, settings, today), strict=True)
    }


def contents(
    session: Session, rows: Sequence[LetterRow], settings: Settings, today: date
) -> list[tuple[Content, list[Item]] | None]:
    """What letters would say today, and the items that a correction calls off; None where there
    is no advice to write from."""
    facts = farm_facts(session, today, frozenset(row.farm.key for row in rows))
    covers = people.covers(session, today)
    corrections = [row for row in rows if row.letter.revision]
    before = _before(session, corrections)
    found: list[tuple[Content, list[Item]] | None] = []
    for row in rows:
        cover = covers.get(row.farm.id)
        advisor = row.farm.details.get("advisor") or ""
        content = _content(
            facts.get(row.farm.key),
            row,
            settings,
            signed=cover.name if cover else advisor,
            signed_for=advisor if cover else "",
        )
        old = before.get((row.recipient.id, row.letter.week))
        gone: list[Item] = []
        if content is not None and old is not None:
            watered = watered_since(session, facts[row.farm.key], old.morning)
            content, gone = corrected(old, content, row.letter.why.split("\n"), watered)
        found.append(None if content is None else (content, gone))
    return found


def _content(
    facts: FarmFacts | None, row: LetterRow, settings: Settings, signed: str, signed_for: str
) -> Content | None:
    if facts is None:
        return None
    return letter_content(
        facts,
        row.letter.week,
        row.letter.first_day,
        settings.mail.domain,
        note=row.letter.note,
        signed=signed,
        signed_for=signed_for,
        revision=row.letter.revision,
    )


def _written(
    content: Content,
    gone: Iterable[Item],
    row: LetterRow,
    settings: Settings,
    now: datetime,
    key: bytes,
) -> Written:
    who, addresses = reader_of(row), links_of(content, row, settings, key)
    envelope = Envelope(
        row.recipient.name,
        row.recipient.address,
        row.letter.message_id,
        now.replace(microsecond=0),
    )
    message = compose(content, who, addresses, envelope, settings.mail, list(gone))
    return Written(content, view(content, who, addresses), as_bytes(message))


def reader_of(row: LetterRow) -> Reader:
    """The reader a letter is for."""
    zone = row.farm.details.get("time_zone")
    return reader(row.recipient.language, row.recipient.units, zone)


def links_of(content: Content, row: LetterRow, settings: Settings, key: bytes) -> Links:
    """The signed addresses in a letter."""
    base, number = settings.mail.base_url, row.letter.id
    until = content.last_day + ANSWERABLE

    def answer(item: Item, said: str) -> str:
        return f"{base}/answer/{links.sign(key, said, number, item.number, until=until)}"

    return Links(
        {item.number: (answer(item, "done"), answer(item, "other")) for item in content.items},
        page=f"{base}/farm/{row.farm.key}",
        change=f"{base}/farm/{row.farm.key}#letters",
        stop=f"{base}/stop/{links.sign(key, 'stop', row.recipient.id)}",
    )


def _before(session: Session, rows: Sequence[LetterRow]) -> dict[tuple[int, date], Content]:
    """What the letters said that corrections take the place of, by recipient and week."""
    there = store.letter_keys(session, sorted({row.letter.week for row in rows})) if rows else {}
    return {
        (recipient, week): Content.model_validate(letter.content)
        for (recipient, week, revision), letter in there.items()
        if revision == 0 and letter.content is not None
    }
