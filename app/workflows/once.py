"""What makes an entry safe to send twice."""

import re

from app.errors import InputError


class EntryError(InputError):
    """Something a person entered that cannot be taken; the message says what and the remedy."""


TOKEN = re.compile(r"[A-Za-z0-9._-]{1,200}")


def once(token: str, owner: int) -> str:
    """A form's once-only token as kept, told apart by the block or station it was sent for.

    Raises EntryError for a token that could be taken for another's.
    """
    if not TOKEN.fullmatch(token):
        raise EntryError(
            f"token is {token[:40]!r}; it must be 1 to 200 letters, figures and any of . - _"
        )
    return f"{token}/{owner}"
