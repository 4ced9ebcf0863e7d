"""A composed letter taken apart again for its preview."""

import base64
from email import policy
from email.message import EmailMessage
from email.parser import BytesParser

from fastapi.responses import HTMLResponse

LETTER_POLICY = (
    "default-src 'none'; img-src data:; style-src 'unsafe-inline'; "
    "frame-ancestors 'self'; base-uri 'none'; form-action 'none'; sandbox allow-popups"
)
"""For a letter's own HTML, which is inline-styled as mail programs want it: no script, no form."""


def parsed(data: bytes) -> EmailMessage:
    """A message from its bytes."""
    message = BytesParser(policy=policy.SMTP).parsebytes(data)
    assert isinstance(message, EmailMessage)
    return message


def headers(message: EmailMessage) -> list[tuple[str, str]]:
    """The headers a reader sees."""
    return [(name, str(message[name])) for name in ("From", "To", "Subject", "Date", "Message-ID")]


def body(message: EmailMessage, kind: str) -> str:
    """The text of the body of a kind, plain or html."""
    part = message.get_body((kind,))
    text: str = "" if part is None else part.get_content()
    return text


def letter_html(data: bytes) -> HTMLResponse:
    """A letter's HTML as a document of its own, its picture inside it."""
    message = parsed(data)
    text = body(message, "html")
    for part in message.walk():
        if part.get_content_type() == "image/png":
            picture = base64.b64encode(part.get_content()).decode()
            name = str(part["Content-ID"]).strip("<>")
            text = text.replace(f"cid:{name}", f"data:image/png;base64,{picture}")
    return HTMLResponse(text, headers={"Content-Security-Policy": LETTER_POLICY})
