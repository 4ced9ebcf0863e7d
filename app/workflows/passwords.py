"""Passwords: chosen, hashed (argon2id, RFC 9106), checked; few at a time: each takes memory."""

from threading import BoundedSemaphore

from argon2 import PasswordHasher
from argon2.exceptions import InvalidHashError, VerificationError

from app.errors import InputError
from app.settings import Settings

SHORTEST, LONGEST = 12, 200
FEWEST_SIGNS = 5
AT_ONCE = BoundedSemaphore(2)
NOBODY: dict[int, str] = {}
"""By memory, a hash that no password opens, checked where there is no account: it takes as long."""


class PasswordError(InputError):
    """A password that will not do; the message says why."""


def hasher(settings: Settings) -> PasswordHasher:
    """The hasher of the settings."""
    return PasswordHasher(time_cost=3, memory_cost=settings.password_memory_kib, parallelism=1)


def hashed(password: str, settings: Settings) -> str:
    """What is kept of a password."""
    with AT_ONCE:
        return hasher(settings).hash(password)


def is_right(kept: str | None, password: str, settings: Settings) -> bool:
    """Whether a password is the one kept; as slow where none is kept."""
    memory = settings.password_memory_kib
    if kept is None and memory not in NOBODY:
        NOBODY[memory] = hashed("nobody's", settings)
    with AT_ONCE:
        try:
            matches = hasher(settings).verify(kept or NOBODY[memory], password[:LONGEST])
        except (VerificationError, InvalidHashError):
            return False
    return matches and kept is not None


def check_chosen(password: str, again: str, about: tuple[str, ...]) -> None:
    """Refuse what is guessed first; `about` are the person's address and name."""
    if password != again:
        raise PasswordError("The two are not the same.")
    if not SHORTEST <= len(password) <= LONGEST:
        raise PasswordError(
            f"A password takes {SHORTEST} to {LONGEST} signs; this one has {len(password)}. "
            "A few words in a row will do."
        )
    plain = password.lower()
    known = [text for text in (*about, "rillbook") if text and text.lower() in plain]
    if known or len(set(plain)) < FEWEST_SIGNS:
        raise PasswordError(
            "This password is guessed early: it holds your name or address, or few different "
            "signs. Choose one that does not."
        )
