"""The record of changes in words: only what differs, before and after."""

from collections.abc import Sequence
from typing import Any, NamedTuple

from app.storage.audit import Change

LONGEST = 160


class AuditRow(NamedTuple):
    """One line of the record; each difference is a name, what stood before, and after."""

    at: str
    who: str
    what: str
    key: str
    done: str
    differences: list[tuple[str, str, str]]


def audit_rows(changes: Sequence[Change]) -> list[AuditRow]:
    """Changes as the page shows them; times in UTC."""
    return [
        AuditRow(
            f"{change.at:%Y-%m-%d %H:%M}",
            change.who,
            change.kind.replace("_", " "),
            change.key,
            _done(change),
            _differences(change.before or {}, change.after or {}),
        )
        for change in changes
    ]


def _done(change: Change) -> str:
    if change.before is None:
        return "added"
    if change.after is None or change.after.get("kind") == "void":
        return "deleted"
    return "changed"


def _differences(before: dict[str, Any], after: dict[str, Any]) -> list[tuple[str, str, str]]:
    names = dict.fromkeys([*before, *after])
    found = [
        (name.replace("_", " "), _text(before.get(name)), _text(after.get(name)))
        for name in names
        if before.get(name) != after.get(name)
    ]
    return [row for row in found if row[1] or row[2]]


def _text(value: Any) -> str:
    if value is None or value is False or value == "" or value == []:
        return ""
    if value is True:
        return "yes"
    text = ", ".join(map(str, value)) if isinstance(value, list) else str(value)
    return text if len(text) <= LONGEST else f"{text[:LONGEST]}…"
