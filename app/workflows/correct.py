"""What changed between a letter and today's advice, and a correction that says it."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date, timedelta
from itertools import zip_longest

from app.letters.content import Content, Item


@dataclass(frozen=True)
class Thresholds:
    """What is worth a correction: days an irrigation moves, share its hours change."""

    days: int
    share: float


def open_items(content: Content, watered: Mapping[str, int]) -> dict[str, list[Item]]:
    """The items of a letter by field that are not done yet: the first ones of a field are, as many
    as irrigations were logged since."""
    found: dict[str, list[Item]] = {}
    for item in content.items:
        found.setdefault(item.field_key, []).append(item)
    return {key: items[watered.get(key, 0) :] for key, items in found.items()}


def changed_fields(
    old: Content,
    new: Content,
    watered: Mapping[str, int],
    today: date,
    thresholds: Thresholds,
) -> list[str]:
    """The names of fields whose advice changed by at least the thresholds since a letter.

    old: what the letter said; new: what it would say today, of the same days; watered: irrigations
    logged since, by field. What was due before today and is still not logged has not moved if it
    is due today.
    """
    before, after = open_items(old, watered), open_items(new, {})
    end = old.last_day + timedelta(days=1)
    names = {item.field_key: item.field for item in (*old.items, *new.items)}
    return [
        names[key]
        for key in sorted(names, key=lambda key: names[key].casefold())
        if any(
            _differs(was, now, today, end, thresholds)
            for was, now in zip_longest(before.get(key, []), after.get(key, []))
        )
    ]


def _differs(
    was: Item | None, now: Item | None, today: date, end: date, thresholds: Thresholds
) -> bool:
    """Whether an item changed enough; one that came or went moved from or to the week's end."""
    then = max(was.day, today) if was else end
    moved = abs(((now.day if now else end) - then).days)
    if moved >= thresholds.days:
        return True
    return bool(
        was
        and now
        and was.hours > 0
        and abs(now.hours - was.hours) >= thresholds.share * was.hours - 1e-9
    )


def corrected(
    old: Content, new: Content, changed: Sequence[str], watered: Mapping[str, int]
) -> tuple[Content, list[Item]]:
    """A correction's content: items keep the UIDs of those they take the place of; and the items
    of the old letter from the correction's day on that no longer hold.

    watered: irrigations logged since the old letter, by field: their items are done, and stay as
    they were, as does what lay before the first day the new content speaks of.
    """
    start = min([item.day for item in new.items], default=new.morning)
    start = min(start, new.past_last + timedelta(days=1))
    left: dict[str, list[Item]] = {}
    taken = {item.uid for item in old.items}
    for items in open_items(old, watered).values():
        for item in items:
            if item.day >= start:
                left.setdefault(item.field_key, []).append(item)
    kept = []
    for item in new.items:
        queue = left.get(item.field_key, [])
        uid = queue.pop(0).uid if queue else _fresh(item.uid, taken)
        taken.add(uid)
        kept.append(item.model_copy(update={"uid": uid}))
    gone = [item for queue in left.values() for item in queue]
    named = [name for name in changed if name]
    return new.model_copy(update={"items": kept, "changed": named}), gone


def _fresh(uid: str, taken: Iterable[str]) -> str:
    """A UID of the same pattern that no item of the week has had."""
    head, _, tail = uid.partition("@")
    stem = head.rpartition(".")[0]
    used = set(taken)
    number = 1
    while (made := f"{stem}.{number}@{tail}") in used:
        number += 1
    return made
