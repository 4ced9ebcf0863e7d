"""A worker that posts letters and is killed (SIGKILL) at a named point, run by
test_killed_letters.py: DATABASE HOST PORT MOMENT POINT."""

import os
import signal
import sys
from collections.abc import Callable
from datetime import datetime
from typing import Any

from app.letters import deliver
from app.settings import Mail, Settings
from app.storage.database import Database
from app.workflows import post_letters

POINTS = (
    "before the claim",
    "claimed, not committed",
    "claimed",
    "connected",
    "body sent, no dot",
    "sending, not committed",
    "sending, no dot",
    "dot sent, no answer read",
    "answer read, not kept",
    "sent, not committed",
    "sent",
)


def die() -> None:
    """As the kernel, or a pulled plug, would end it."""
    os.kill(os.getpid(), signal.SIGKILL)


def before(owner: Any, name: str) -> None:
    """Die when a function is called."""

    def dead(*_: Any, **__: Any) -> None:
        die()

    setattr(owner, name, dead)


def after(owner: Any, name: str) -> None:
    """Die when a function has returned."""
    honest: Callable[..., Any] = getattr(owner, name)

    def doomed(*args: Any, **more: Any) -> Any:
        honest(*args, **more)
        die()

    setattr(owner, name, doomed)


def arm(point: str) -> None:
    """Set the point of death."""
    store = post_letters.store
    if point == "before the claim":
        before(store, "claim_next")
    elif point == "claimed, not committed":
        after(store, "claim_next")
    elif point == "claimed":
        before(deliver, "send_bytes")
    elif point == "connected":
        after(deliver, "_connect")
    elif point == "body sent, no dot":
        before(store, "mark_sending")
    elif point == "sending, not committed":
        after(store, "mark_sending")
    elif point == "sending, no dot":
        dot(before_it=True)
    elif point == "dot sent, no answer read":
        dot(before_it=False)
    elif point == "answer read, not kept":
        after(deliver, "send_bytes")
    elif point == "sent, not committed":
        after(store, "settle")
    elif point == "sent":
        after(post_letters, "post_one")
    else:
        raise ValueError(point)


def dot(before_it: bool) -> None:
    """Die as the dot that ends DATA is sent, before or after."""
    honest = deliver.smtplib.SMTP.send

    def doomed(server: Any, data: bytes) -> None:
        if data == b".\r\n" and before_it:
            die()
        honest(server, data)
        if data == b".\r\n":
            die()

    deliver.smtplib.SMTP.send = doomed  # type: ignore[method-assign, assignment]


if __name__ == "__main__":
    url, host, port, moment, point = sys.argv[1:]
    arm(point)
    db = Database(url)
    mail = Mail(host=host, port=int(port), tls="none", sender="letters@example.org")
    now = datetime.fromisoformat(moment)
    post_letters.post(db, Settings(database=url, mail=mail), lambda: now, now.date)
