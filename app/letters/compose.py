"""A letter as a message: text, HTML, chart and calendar, byte for byte the same each time."""

import re
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from email import policy
from email.headerregistry import Address
from email.message import EmailMessage
from email.utils import format_datetime
from functools import cache
from hashlib import sha256

from jinja2 import Environment, FileSystemLoader, StrictUndefined

from app.letters.calendar import letter_calendar
from app.letters.chart import bars
from app.letters.content import Content, Item, one_line
from app.letters.deliver import LETTER
from app.letters.view import COLUMNS, Links, View, view
from app.resources import resource
from app.settings import Mail
from app.wording.reader import Reader

CHART = "chart"


@dataclass(frozen=True)
class Envelope:
    """To whom a letter goes, under which Message-ID (without its brackets), and when (UTC)."""

    name: str
    address: str
    message_id: str
    at: datetime


def message_id(recipient: int, week: str, revision: int, mail: Mail) -> str:
    """The Message-ID of a letter, the same however often it is tried."""
    return f"letter.{week}.{recipient}.{revision}@{mail.domain}"


def compose(
    content: Content,
    reader: Reader,
    links: Links,
    envelope: Envelope,
    mail: Mail,
    gone: Sequence[Item] = (),
) -> EmailMessage:
    """The whole message; `gone` are items of the letter it corrects that no longer hold."""
    worded = view(content, reader, links)
    letter = EmailMessage(policy=LETTER)
    _head(letter, worded, envelope, mail)
    letter.set_content(body_text(worded), cte="quoted-printable")
    letter.add_alternative(body_html(worded), subtype="html", cte="quoted-printable")
    if content.dryness:
        _add_chart(letter, bars(content.dryness), envelope)
    days = letter_calendar(content, gone, reader, envelope.at, mail.sender_address)
    if content.items or gone:
        letter.add_attachment(
            days.decode(),
            subtype="calendar",
            cte="quoted-printable",
            params={"method": "PUBLISH"},
            filename=f"{content.farm_key}-{content.first_day}.ics",
        )
    letter["Content-Language"] = reader.language
    _fix_boundaries(letter, envelope.message_id)
    return letter


def as_bytes(letter: EmailMessage) -> bytes:
    """The message as it is sent."""
    return letter.as_bytes(policy=LETTER)


def body_html(worded: View, chart: str = f"cid:{CHART}") -> str:
    """The HTML body, its chart at the address `chart`."""
    return _environment().get_template("weekly/body.html").render(letter=worded, chart=chart)


def body_text(worded: View) -> str:
    """The plain text body."""
    text = _environment().get_template("weekly/body.txt").render(letter=worded)
    plain = text.replace("\u00a0", " ").replace("\u202f", " ")  # text clients break them
    return re.sub(r"\n{3,}", "\n\n", plain).strip() + "\n"


def _head(letter: EmailMessage, worded: View, envelope: Envelope, mail: Mail) -> None:
    letter["From"] = mail.sender
    letter["To"] = Address(one_line(envelope.name), addr_spec=envelope.address)
    letter["Subject"] = one_line(
        _environment().get_template("weekly/subject.txt").render(letter=worded)
    )
    letter["Date"] = format_datetime(envelope.at)
    letter["Message-ID"] = f"<{envelope.message_id}>"
    letter["Auto-Submitted"] = "auto-generated"  # RFC 3834 5
    letter["List-Unsubscribe"] = f"<{worded.links.stop}>"  # RFC 8058 3.1, both
    letter["List-Unsubscribe-Post"] = "List-Unsubscribe=One-Click"


def _add_chart(letter: EmailMessage, picture: bytes, envelope: Envelope) -> None:
    html = letter.get_body(("html",))
    assert isinstance(html, EmailMessage)
    html.add_related(
        picture, "image", "png", cid=f"<{CHART}>", filename="chart.png", disposition="inline"
    )


def _fix_boundaries(letter: EmailMessage, identity: str) -> None:
    """Boundaries that depend on the letter alone, so that a preview is what is sent."""
    for number, part in enumerate(letter.walk()):
        if part.is_multipart():
            digest = sha256(f"{identity}/{number}".encode()).hexdigest()[:24]
            part.set_boundary(f"=_{digest}")


@cache
def _environment() -> Environment:
    """HTML is escaped; an unknown name is an error."""
    environment = Environment(
        loader=FileSystemLoader(resource("templates") / "letters"),
        autoescape=lambda name: name is not None and name.endswith(".html"),
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters["wrap"] = _wrap
    return environment


def _wrap(text: str, indent: int = 0) -> str:
    """Lines of at most 72 columns; a word longer than that stays whole."""
    pad = " " * indent
    return "\n".join(
        textwrap.fill(
            line,
            COLUMNS,
            initial_indent=pad,
            subsequent_indent=pad,
            break_long_words=False,
            break_on_hyphens=False,
        )
        for line in text.splitlines()
    )


STRICT = policy.SMTP.clone(raise_on_defect=True)
"""The policy under which a letter must parse back."""
