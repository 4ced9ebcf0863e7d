"""Signed links that run out: what a letter's reader may do without signing in.

A token is `purpose.part.part.last day.signature`; the signature (HMAC-SHA256) covers all before it.
"""

import hmac
from datetime import date
from hashlib import sha256

FOREVER = date(9999, 12, 31)


class LinkError(Exception):
    """A link that does not count; `expired` where it did once."""

    def __init__(self, expired: bool = False) -> None:
        super().__init__("expired" if expired else "not signed by us")
        self.expired = expired


def sign(key: bytes, purpose: str, *parts: int | str, until: date = FOREVER) -> str:
    """A token for `purpose`, good through the day `until`; parts hold no dots."""
    said = ".".join([purpose, *map(str, parts), until.strftime("%Y%m%d")])
    return f"{said}.{_signature(key, said)}"


def read(key: bytes, purpose: str, token: str, today: date) -> list[str]:
    """The parts of a token for `purpose`; raises LinkError where it is forged or has run out."""
    said, _, signature = token.rpartition(".")
    if not token.isascii() or not hmac.compare_digest(_signature(key, said), signature):
        raise LinkError
    found, *parts, until = said.split(".")
    if found != purpose:
        raise LinkError
    if today > date.fromisoformat(until):
        raise LinkError(expired=True)
    return parts


def _signature(key: bytes, said: str) -> str:
    return hmac.new(key, said.encode(), sha256).hexdigest()[:24]
