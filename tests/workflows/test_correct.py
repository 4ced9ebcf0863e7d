"""When a letter is corrected, and what the correction says (checks of our own rules)."""

from datetime import date, timedelta

import pytest

from app.letters.content import Content, Item
from app.workflows.correct import Thresholds, changed_fields, corrected
from tests.letters.samples import MONDAY, content

RULE = Thresholds(days=2, share=0.25)
WEDNESDAY = MONDAY + timedelta(days=2)


def letter(*items: tuple[str, int, float], start: date = MONDAY) -> Content:
    """A letter of items: field, day of the week from Monday, hours."""
    made = [
        Item(
            number=number,
            uid=f"2026-07-13.{field}.{number}@example.org",
            field_key=field,
            field=field.title(),
            day=MONDAY + timedelta(days=day),
            hours=hours,
            gross_mm=10.0,
        )
        for number, (field, day, hours) in enumerate(items, 1)
    ]
    return content(items=made, morning=start, past_last=start - timedelta(days=1))


@pytest.mark.parametrize(
    ("was", "now", "watered", "changed"),
    [
        # the same, or nearly
        ([("long", 3, 8.0)], [("long", 3, 8.0)], {}, []),
        ([("long", 3, 8.0)], [("long", 4, 9.9)], {}, []),
        # two days later or earlier, a quarter more or less
        ([("long", 3, 8.0)], [("long", 5, 8.0)], {}, ["Long"]),
        ([("long", 5, 8.0)], [("long", 3, 8.0)], {}, ["Long"]),
        ([("long", 3, 8.0)], [("long", 3, 10.0)], {}, ["Long"]),
        ([("long", 3, 8.0)], [("long", 3, 6.0)], {}, ["Long"]),
        # no longer needed, or newly needed; at the week's end neither is news
        ([("long", 3, 8.0)], [], {}, ["Long"]),
        ([], [("long", 3, 8.0)], {}, ["Long"]),
        ([("long", 6, 8.0)], [], {}, []),
        ([], [("long", 6, 8.0)], {}, []),
        # done as advised: the next one counts
        ([("long", 0, 8.0), ("long", 4, 8.0)], [("long", 4, 8.0)], {"long": 1}, []),
        ([("long", 0, 8.0), ("long", 3, 8.0)], [("long", 5, 8.0)], {"long": 1}, ["Long"]),
        # due on Monday, not said to be done, and so due on Wednesday morning still
        ([("long", 0, 8.0)], [("long", 2, 8.0)], {}, []),
        ([("long", 0, 8.0)], [("long", 4, 8.0)], {}, ["Long"]),
        # each field for itself
        (
            [("long", 3, 8.0), ("east", 3, 4.0)],
            [("long", 3, 8.0), ("east", 3, 8.0)],
            {},
            ["East"],
        ),
    ],
)
def test_what_is_worth_a_correction(
    was: list[tuple[str, int, float]],
    now: list[tuple[str, int, float]],
    watered: dict[str, int],
    changed: list[str],
) -> None:
    old, new = letter(*was), letter(*now, start=WEDNESDAY)
    assert changed_fields(old, new, watered, WEDNESDAY, RULE) == changed


def test_a_correction_keeps_uids_and_calls_off_what_no_longer_holds() -> None:
    old = letter(("long", 0, 8.0), ("long", 3, 8.0), ("east", 4, 4.0))
    new = letter(("long", 5, 8.0), ("long", 6, 8.0), start=WEDNESDAY)
    made, gone = corrected(old, new, ["Long", "East"], {})
    first, second = made.items
    assert first.uid == old.items[1].uid  # Thursday's moves to Saturday
    assert second.uid not in {item.uid for item in old.items}
    assert [item.field for item in gone] == ["East"]  # Monday's has been; it is not called off
    assert made.changed == ["Long", "East"]


def test_water_already_done_does_not_lend_its_calendar_entry() -> None:
    old = letter(("long", 0, 8.0), ("long", 4, 8.0))
    new = letter(("long", 2, 8.0))
    told, gone = corrected(old, new, ["Long"], {"long": 1})
    assert [item.uid for item in told.items] == [old.items[1].uid]
    assert gone == []
