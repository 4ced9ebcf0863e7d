"""Letters parsed back by the standard library's policy-checked parser and by an iCalendar parser.

RFC 5322 (message), 2045-2047 and 2183 (MIME), 2387 (related), 5545 and 5546 (calendar), 2369 and
8058 (unsubscribing), 3834 (automatic mail).
"""

import io
import re
from dataclasses import replace
from datetime import timedelta
from email import policy
from email.message import EmailMessage
from email.parser import BytesParser
from html.parser import HTMLParser

import pytest
from icalendar import Calendar
from PIL import Image

from app.letters import chart
from app.letters.compose import as_bytes, compose
from app.letters.content import Content, Doubt
from app.wording import CAUTION
from app.wording.reader import Reader, reader
from tests.letters.samples import AT, ENVELOPE, HOSTILE, LONG, MAIL, MONDAY, content, item, links

STRICT = policy.SMTP.clone(raise_on_defect=True)
READERS = [reader(language, units) for language in ("en", "es") for units in ("metric", "us")]


def made(of: Content | None = None, who: Reader = READERS[0], **more: object) -> EmailMessage:
    """A letter sent and parsed back; a defect raises."""
    of = of or content()
    data = as_bytes(compose(of, who, links(of), ENVELOPE, MAIL, **more))  # type: ignore[arg-type]
    assert data.isascii()
    assert max(len(line) for line in data.split(b"\r\n")) <= 998  # RFC 5322 2.1.1
    assert b"\n" not in data.replace(b"\r\n", b"")
    letter = BytesParser(policy=STRICT).parsebytes(data)
    assert isinstance(letter, EmailMessage)
    for part in letter.walk():
        assert not part.defects
    return letter


def body(letter: EmailMessage, kind: str) -> str:
    """The text of a body."""
    part = letter.get_body((kind,))
    assert part is not None
    text: str = part.get_content()
    return text


@pytest.mark.parametrize("who", READERS, ids=lambda who: f"{who.language}-{who.units}")
def test_every_letter_parses_back_with_all_its_parts(who: Reader) -> None:
    letter = made(who=who)
    assert [part.get_content_type() for part in letter.walk()] == [
        "multipart/mixed",
        "multipart/alternative",
        "text/plain",
        "multipart/related",
        "text/html",
        "image/png",
        "text/calendar",
    ]
    for kind in ("plain", "html"):
        text = " ".join(body(letter, kind).split())
        assert who.say("common", "caution").split(".")[0] in text
        for name in ("Long Piece", "Tarrow North", "D. Arden"):
            assert name in text
        assert "{{ " not in text
        assert "None" not in text
    assert who.depth(53.3).replace("\u00a0", " ") in body(letter, "plain").replace("\u00a0", " ")
    assert letter["Content-Language"] == who.language


def test_headers() -> None:
    letter = made()
    assert letter["From"].addresses[0].addr_spec == "letters@example.org"
    assert letter["To"].addresses[0].display_name == "Ana Núñez"
    assert letter["Subject"] == "Week of 13 July: water 2 of 3 fields, Hollin Farm"
    assert letter["Date"].datetime == AT
    assert letter["Message-ID"] == "<letter.2026-07-13.7.0@example.org>"
    assert letter["Auto-Submitted"] == "auto-generated"
    assert letter["List-Unsubscribe-Post"] == "List-Unsubscribe=One-Click"
    raw = as_bytes(compose(content(), READERS[0], links(content()), ENVELOPE, MAIL)).decode()
    # a client reads the raw header: one URI in angle brackets, not encoded, not broken
    (found,) = re.findall(r"^List-Unsubscribe: <(https://\S+)>\r$", raw, re.M)
    assert found == links(content()).stop
    assert raw.count("Message-ID:") == raw.count("Subject:") == raw.count("\nTo:") == 1


@pytest.mark.parametrize("farm", ["Odd\r\nBcc: thief@example.org", LONG, "Añá " * 30, "\x00\x1b["])
def test_a_name_cannot_break_the_headers(farm: str) -> None:
    letter = made(content(farm=farm))
    assert letter["Bcc"] is None
    assert "\n" not in letter["Subject"]
    odd = replace(ENVELOPE, name=farm)
    data = as_bytes(compose(content(), READERS[0], links(content()), odd, MAIL))
    parsed = BytesParser(policy=STRICT).parsebytes(data)
    assert [one.addr_spec for one in parsed["To"].addresses] == ["ana@example.org"]
    assert parsed["Bcc"] is None


class Page(HTMLParser):
    """What there is in an HTML body."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.open: list[str] = []
        self.images: list[dict[str, str | None]] = []
        self.links: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        found = dict(attrs)
        if tag == "img":
            self.images.append(found)
        if tag == "a":
            self.links.append(found["href"] or "")
        if tag not in ("meta", "img", "br"):
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag


def test_html_is_whole_escaped_and_needs_nothing_from_elsewhere() -> None:
    letter = made()
    text = body(letter, "html")
    page = Page(text)
    assert page.open == []
    assert "script" not in page.tags
    assert "style" not in page.tags  # all of it inline: some mail programs drop the rest
    assert "link" not in page.tags
    assert "&lt;script&gt;" in text
    assert "49" not in re.findall(r"\{\{7\*7\}\}|49", text)
    (image,) = page.images
    assert image["alt"]
    assert "Long Piece" in image["alt"]
    picture = next(part for part in letter.walk() if part.get_content_type() == "image/png")
    assert image["src"] == f"cid:{picture['Content-ID'].strip('<>')}"
    assert all(link.startswith("https://rillbook.example.org/") for link in page.links)
    assert len(page.links) == 2 * 3 + 3


def test_plain_text_reads_within_72_columns() -> None:
    for who in READERS:
        for line in body(made(who=who), "plain").splitlines():
            if "https://" not in line and HOSTILE not in line:
                assert len(line) <= 72, line


def test_unsure_things_come_first() -> None:
    lines = [line for line in body(made(), "plain").splitlines() if line]
    assert lines[2].startswith("First: ")
    assert "Sand Lane has sent no weather since Friday 10 July" in " ".join(lines[2:5])
    old = content(doubts=[Doubt(kind="morning", day=MONDAY - timedelta(days=4))])
    assert "These figures are of Thursday 9 July" in body(made(old), "plain")


def test_the_chart_is_a_sharp_small_picture() -> None:
    picture = Image.open(io.BytesIO(chart.bars(content().dryness)))
    assert picture.format == "PNG"
    assert picture.width == chart.WIDTH * chart.SCALE
    assert len(chart.bars(content().dryness)) < 40_000
    colours = {found[1] for found in picture.convert("RGB").getcolors(1000) or []}
    assert (0xA5, 0x48, 0x2A) in colours  # the limit
    assert chart.driest(content().dryness)[0].field == HOSTILE
    assert chart.bars([])


def test_calendar_entries_keep_their_uid_when_the_advice_changes() -> None:
    first = content()
    second = content(revision=1, items=[item(1, days=2), item(3, days=5)])
    gone = [first.items[1]]
    one, two = (
        Calendar.from_ical(part.get_content())
        for letter in (made(first), made(second, gone=gone))
        for part in letter.walk()
        if part.get_content_type() == "text/calendar"
    )
    for found in (one, two):
        assert found["version"] == "2.0"
        assert found["method"] == "PUBLISH"
        assert found["prodid"]
        assert found.errors == []
        for event in found.walk("VEVENT"):
            for needed in ("uid", "dtstamp", "dtstart", "organizer", "summary"):
                assert needed in event
            assert event["dtstamp"].dt.utcoffset() == timedelta(0)
            assert CAUTION[:40] in event["description"]
    before = {str(event["uid"]): event for event in one.walk("VEVENT")}
    after = {str(event["uid"]): event for event in two.walk("VEVENT")}
    assert set(before) == set(after)
    moved = first.items[0].uid
    assert before[moved]["dtstart"].dt == MONDAY
    assert after[moved]["dtstart"].dt == MONDAY + timedelta(days=2)
    assert (before[moved]["sequence"], after[moved]["sequence"]) == (0, 1)
    assert after[gone[0].uid]["status"] == "CANCELLED"
    assert before[moved]["dtend"].dt - before[moved]["dtstart"].dt == timedelta(days=1)
    assert str(before[moved]["summary"]) == "Water Long Piece: 7.4 h (53 mm)"


def test_a_letter_composed_twice_is_the_same_to_the_byte() -> None:
    pair = {
        as_bytes(compose(content(), READERS[1], links(content()), ENVELOPE, MAIL)) for _ in range(2)
    }
    assert len(pair) == 1


@pytest.mark.parametrize("who", READERS, ids=lambda who: f"{who.language}-{who.units}")
def test_odd_weeks_are_worded(who: Reader) -> None:
    nothing = content(items=[], doubts=[], troubles=[], past=[], energy=[], note="", signed="")
    assert made(nothing, who)["Subject"].endswith("Hollin Farm")
    assert who.say("letter", "title_none").upper() in body(made(nothing, who), "plain")
    correction = content(revision=1, changed=["Long Piece"], signed_for="E. Torvane")
    letter = made(correction, who)
    assert letter["Subject"].startswith("Correc")
    assert "E. Torvane" in body(letter, "html")
    one = content(items=[item(1)])
    assert who.say("letter", "title_one", field="Long Piece") in body(made(one, who), "html")
    assert made(content(dryness=[]), who)["Subject"]
