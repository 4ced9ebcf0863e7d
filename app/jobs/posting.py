"""Letters leave while the server runs: one thread looks every minute for what is due."""

import logging
import threading
from collections.abc import Iterator
from contextlib import contextmanager

from app.settings import Settings
from app.storage import letters as store
from app.storage.database import Database
from app.workflows.day_it_is import day_it_is, moment_it_is
from app.workflows.post_letters import Posted, post

EVERY_S = 60.0


@contextmanager
def posting(db: Database, settings: Settings, every_s: float = EVERY_S) -> Iterator[None]:
    """Post what is due, at once and then every minute, until the block ends.

    Any number of servers and `rillbook letters --send` may do so side by side.
    """
    stop = threading.Event()
    thread = threading.Thread(
        target=_rounds, args=(db, settings, every_s, stop), name="letters", daemon=True
    )
    thread.start()
    try:
        yield
    finally:
        stop.set()
        thread.join(timeout=5.0)


def _rounds(db: Database, settings: Settings, every_s: float, stop: threading.Event) -> None:
    looked_at = -1
    while not stop.is_set():
        try:
            with db.read() as session:
                newest = store.newest_advice(session)
            one_round(db, settings, correct=newest != looked_at)
            looked_at = newest
        except Exception:  # a round that fails must not end the rounds
            logging.getLogger(__name__).exception("a round of letters failed; trying again")
        stop.wait(every_s)


def one_round(db: Database, settings: Settings, correct: bool = True) -> Posted:
    """One round. `correct`: also look whether the advice moved away from letters already sent,
    which is needed only where there is new advice."""
    return post(
        db,
        settings,
        lambda: moment_it_is(db, settings),
        lambda: day_it_is(db, settings),
        correct,
    )
