"""Days to water as an iCalendar (RFC 5545): one entry an item, found again by its UID."""

from collections.abc import Iterable, Sequence
from datetime import datetime, timedelta

from icalendar import Calendar, Event, vCalAddress

from app.letters.content import Content, Item, one_line
from app.wording.reader import Reader

PRODUCT = "-//Rillbook//Weekly letter//EN"


def letter_calendar(
    content: Content,
    gone: Iterable[Item],
    reader: Reader,
    at: datetime,
    organizer: str,
) -> bytes:
    """The calendar that goes with a letter; `gone` are items of the letter it takes the place of
    that are no longer advised. `at` is the instant of the letter, UTC."""
    return calendar([(content, gone, at)], reader, organizer)


def calendar(
    letters: Sequence[tuple[Content, Iterable[Item], datetime]], reader: Reader, organizer: str
) -> bytes:
    """Every item of some letters, each as it was said last; a later letter's SEQUENCE is higher."""
    book = Calendar()
    book.add("prodid", PRODUCT)
    book.add("version", "2.0")
    book.add("method", "PUBLISH")
    if letters:
        name = reader.say("letter", "calendar_name", farm=letters[-1][0].farm)
        book.add("x-wr-calname", one_line(name))
    entries: dict[str, Event] = {}
    for content, gone, at in letters:
        for item in content.items:
            entries[item.uid] = _entry(item, content, reader, at, organizer)
        for item in gone:
            entries[item.uid] = _entry(item, content, reader, at, organizer, cancelled=True)
    for entry in entries.values():
        book.add_component(entry)
    made: bytes = book.to_ical()
    return made


def _entry(
    item: Item,
    content: Content,
    reader: Reader,
    at: datetime,
    organizer: str,
    cancelled: bool = False,
) -> Event:
    entry = Event()
    entry.add("uid", item.uid)
    entry.add("sequence", content.revision)
    entry.add("dtstamp", at)
    entry.add("dtstart", item.day)
    entry.add("dtend", item.day + timedelta(days=1))
    entry.add("transp", "TRANSPARENT")
    entry.add("status", "CANCELLED" if cancelled else "CONFIRMED")
    entry.add("organizer", vCalAddress(f"mailto:{organizer}"))
    hours, depth = reader.hours(item.hours), reader.depth(item.gross_mm)
    words = reader.say("letter", "calendar_item", field=item.field, hours=hours, depth=depth)
    entry.add("summary", one_line(words))
    title, caution = reader.say("common", "caution_title"), reader.say("common", "caution")
    expected = f"{reader.say('letter', 'expected').lstrip('* ')}. " if item.expected else ""
    entry.add("description", one_line(f"{content.farm}. {expected}{title} {caution}"))
    return entry
