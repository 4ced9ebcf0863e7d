"""Send what is due: each letter claimed by one worker, tried, and its outcome kept.

Never two: a letter leaves `released` only by a claim that one worker wins, and the state `sending`
is committed before the dot that ends DATA. Whoever is killed before that has sent nothing, and the
claim runs out; whoever is killed after it leaves `sending`, which nobody tries again: it becomes
unsure, for a person to decide.
"""

import secrets
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date, datetime, timedelta

from sqlalchemy.orm import Session

from app.letters import deliver
from app.settings import Settings
from app.storage import letters as store
from app.storage import recipients as people
from app.storage.database import Database
from app.storage.letters import Claimed
from app.workflows.correct_letters import correct_letters
from app.workflows.draft_letters import draft_letters, gets_letters
from app.workflows.release_letters import release_rows

CLAIM = timedelta(minutes=15)
"""Longer than a letter takes up to the dot: five commands of a minute each."""
SENDING = timedelta(seconds=deliver.DOT_S) + timedelta(minutes=5)
GIVE_UP = timedelta(days=3)
"""A weekly letter is of no use later (working value; RFC 5321 4.5.4.1 gives relays 4 to 5 days)."""
FIRST_PAUSE, LONGEST_PAUSE = timedelta(minutes=5), timedelta(hours=4)
AUTOMATIC = "automatic"
STOPPED = "stopped"


class NotOursError(Exception):
    """Another worker has the letter now."""


@dataclass(frozen=True)
class Posted:
    """What one round did: letters by outcome."""

    drafted: int = 0
    released: int = 0
    corrections: int = 0
    sent: int = 0
    put_off: int = 0
    refused: int = 0
    unsure: int = 0


def post(
    db: Database,
    settings: Settings,
    clock: Callable[[], datetime],
    today: Callable[[], date],
    correct: bool = True,
) -> Posted:
    """Draft, correct, release what goes by itself, and send everything that is due. Safe to run at
    any time, by any number of workers."""
    with db.write() as session:
        _, doubted = store.recover(session, clock())
        drafted, released, corrections = ready(session, settings, clock(), today(), correct)
    counts = {"sent": 0, "put_off": 0, "refused": 0, "unsure": doubted}
    while (outcome := post_one(db, settings, clock)) is not None:
        counts[outcome.removesuffix(", nobody there")] += 1
        if outcome.endswith("nobody there"):
            break
    return Posted(drafted, released, corrections, **counts)


def ready(
    session: Session, settings: Settings, now: datetime, today: date, correct: bool
) -> tuple[int, int, int]:
    """Drafts that were missing, letters of automatic farms released now that they are due, and
    corrections; how many of each."""
    drafted = draft_letters(session, settings.mail, now)
    corrections = correct_letters(session, settings, now, today) if correct else 0
    due = [
        row
        for row in store.letters(session, states=("draft",))
        if row.letter.due <= now and row.farm.details.get("letters") == AUTOMATIC
    ]
    late = [row for row in due if now - row.letter.due > GIVE_UP]
    for row in late:
        row.letter.state, row.letter.why = "held", "too_late"
    wanted = [row for row in due if row not in late]
    released = release_rows(session, wanted, AUTOMATIC, settings, now, today)
    return drafted, len(released), corrections


def post_one(db: Database, settings: Settings, clock: Callable[[], datetime]) -> str | None:
    """Send the next letter that is due; its outcome, None where none is due."""
    claim, now = secrets.token_hex(8), clock()
    with db.write() as session:
        letter = store.claim_next(session, now, claim, now + CLAIM)
        if letter is None:
            return None
        if _is_stopped(session, letter):
            store.settle(session, letter.id, claim, state="refused", words=STOPPED, settled_at=now)
            return "refused"

    def about_to_send() -> None:
        with db.write() as session:
            if not store.mark_sending(session, letter.id, claim, clock() + SENDING):
                raise NotOursError

    try:
        words = deliver.send_bytes(letter.data, [letter.to], settings, about_to_send)
    except NotOursError:
        return "put_off"
    except deliver.DeliveryError as error:
        return _failed(db, letter, claim, error, clock())
    with db.write() as session:
        store.settle(session, letter.id, claim, state="sent", words=words, settled_at=clock())
    return "sent"


def _is_stopped(session: Session, letter: Claimed) -> bool:
    """Whether the recipient asked for no more letters since this one was released."""
    row = store.letters(session, one=letter.id)[0]
    (recipient,) = people.recipients(session, one=row.recipient.id)
    return not gets_letters(recipient)


def _failed(
    db: Database, letter: Claimed, claim: str, error: deliver.DeliveryError, now: datetime
) -> str:
    """Keep how a try failed: put off with a growing pause, refused, or unsure."""
    words, tries = str(error), letter.tries + 1
    if isinstance(error, deliver.UnsureError):
        values = {"state": "unsure", "settled_at": now}
    elif isinstance(error, deliver.TemporaryError) and now - letter.due < GIVE_UP:
        values = {"state": "released", "next_try": now + pause(tries)}
    else:
        values = {"state": "refused", "settled_at": now}
    with db.write() as session:
        store.settle(session, letter.id, claim, words=words, tries=tries, **values)
    outcome = {"released": "put_off"}.get(str(values["state"]), str(values["state"]))
    return f"{outcome}, nobody there" if isinstance(error, deliver.UnreachableError) else outcome


def still_waiting(db: Database, now: datetime) -> dict[str, int]:
    """How many letters that are due are not sent, by state."""
    with db.read() as session:
        return store.waiting(session, now)


def pause(tries: int) -> timedelta:
    """How long to wait after this many tries: 5, 10, 20 minutes and so on, at most 4 hours."""
    doubled: int = 2 ** min(tries - 1, 20)
    return min(FIRST_PAUSE * doubled, LONGEST_PAUSE)
