"""The letter that carries a one-time link: an invitation, or a new password."""

import textwrap
from datetime import datetime
from email.headerregistry import Address
from email.message import EmailMessage
from email.utils import format_datetime, make_msgid

from app.letters.content import one_line
from app.letters.deliver import LETTER
from app.settings import Mail
from app.wording.reader import Reader


def link_letter(
    purpose: str,
    to: tuple[str, str],
    who: str,
    link: str,
    days: int,
    reader: Reader,
    mail: Mail,
    at: datetime,
) -> EmailMessage:
    """The message to a (name, address); purpose is invite or reset, `who` opened the account."""
    words = reader.say("people", purpose, days=str(days), who=who)
    letter = EmailMessage(policy=LETTER)
    letter["From"] = mail.sender
    letter["To"] = Address(one_line(to[0]), addr_spec=to[1])
    letter["Subject"] = reader.say("people", f"{purpose}_subject")
    letter["Date"] = format_datetime(at)
    letter["Message-ID"] = make_msgid(domain=mail.domain)
    letter["Auto-Submitted"] = "auto-generated"  # RFC 3834 5
    caution = f"{reader.say('common', 'caution_title')} {reader.say('common', 'caution')}"
    text = f"{textwrap.fill(words, 72)}\n\n{link}\n\n--\n{textwrap.fill(caution, 72)}\n"
    letter.set_content(text, cte="quoted-printable")
    letter["Content-Language"] = reader.language
    return letter
