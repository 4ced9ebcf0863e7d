"""Handing a finished message to the mail server, or to a folder where there is none.

What matters is the moment at which a letter can no longer be taken back: the dot that ends DATA.
`send` calls `about_to_send` just before it. A failure before that moment is safe to try again; one
between the dot and the server's answer is not, and raises `UnsureError`.
"""

import os
import re
import smtplib
import ssl
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from email import policy
from email.headerregistry import BaseHeader, HeaderRegistry, UnstructuredHeader
from email.message import EmailMessage
from email.policy import Policy
from email.utils import getaddresses
from pathlib import Path

from app.settings import Mail, Settings

COMMAND_S = 60.0
"""How long a reply to a command is waited for (RFC 5321 4.5.3.2 asks 5 minutes of relays)."""
DOT_S = 600.0
"""How long the reply to the end of DATA is waited for (RFC 5321 4.5.3.2.6)."""


class _WholeHeader(UnstructuredHeader, BaseHeader):
    """A header whose address must not be broken or encoded, however long its line is."""

    def fold(self, *, policy: Policy) -> str:
        """The header on one line (up to 998 signs, RFC 5322 2.1.1)."""
        return f"{self.name}: {self}{policy.linesep}"


_HEADERS = HeaderRegistry()
_HEADERS.map_to_type("list-unsubscribe", _WholeHeader)
LETTER = policy.SMTP.clone(cte_type="7bit", max_line_length=76, header_factory=_HEADERS)
"""Header and body lines as every server takes them, with or without 8BITMIME."""


class DeliveryError(Exception):
    """A message was not handed over; the message holds the server's words, or what went wrong."""


class TemporaryError(DeliveryError):
    """Not now: the server refused for the time being (4xx), or could not be reached."""


class UnreachableError(TemporaryError):
    """The server could not be reached, or does not let us in: no letter can leave just now."""


class RejectedError(DeliveryError):
    """Not at all: the server refused for good (5xx)."""


class UnsureError(DeliveryError):
    """The connection broke after the end of DATA: the letter may have gone, or not."""


def send(
    message: EmailMessage, settings: Settings, about_to_send: Callable[[], None] = lambda: None
) -> str:
    """Hand a message over, to the addresses of its To header; returns the server's words.

    Without SMTP settings it is written as an .eml file, and the file's name is returned. Raises
    TemporaryError, RejectedError or UnsureError; what `about_to_send` raises stops the message.
    """
    to = [address for _, address in getaddresses(message.get_all("To", []))]
    return send_bytes(message.as_bytes(policy=LETTER), to, settings, about_to_send)


def send_bytes(
    data: bytes, to: list[str], settings: Settings, about_to_send: Callable[[], None] = lambda: None
) -> str:
    """The same for a message already in bytes."""
    if not settings.mail.host:
        return write_file(data, settings.mail.folder, about_to_send)
    with _connected(settings.mail) as server:
        return _hand_over(server, settings.mail.sender_address, to, data, about_to_send)


def write_file(data: bytes, folder: Path, about_to_send: Callable[[], None] = lambda: None) -> str:
    """Write a message as `<its Message-ID>.eml`, whole or not at all; returns the path."""
    found = re.search(rb"(?im)^message-id:\s*<([^@>]+)", data)
    name = re.sub(r"[^A-Za-z0-9._-]", "-", found[1].decode("ascii", "replace")) if found else "mail"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        half = folder / f".{name}.{os.getpid()}.part"
        half.write_bytes(data)
        about_to_send()
        os.replace(half, folder / f"{name}.eml")
    except OSError as error:
        raise UnreachableError(f"{error.filename or folder}: {error.strerror}") from error
    return str(folder / f"{name}.eml")


@contextmanager
def _connected(mail: Mail) -> Iterator[smtplib.SMTP]:
    """A greeted, encrypted and logged-in connection; every failure up to here is temporary."""
    try:
        server = _connect(mail)
    except smtplib.SMTPResponseException as error:
        raise UnreachableError(_words(mail, error.smtp_code, error.smtp_error)) from error
    except (smtplib.SMTPException, OSError) as error:
        raise UnreachableError(f"{mail.host}:{mail.port}: {error}") from error
    try:
        yield server
    finally:
        with suppress(smtplib.SMTPException, OSError):
            server.quit()
        server.close()


def _connect(mail: Mail) -> smtplib.SMTP:
    trust = ssl.create_default_context(cafile=mail.ca_file or None)
    server: smtplib.SMTP
    if mail.tls == "tls":
        server = smtplib.SMTP_SSL(mail.host, mail.port, timeout=COMMAND_S, context=trust)
    else:
        server = smtplib.SMTP(mail.host, mail.port, timeout=COMMAND_S)
    try:
        server.ehlo_or_helo_if_needed()
        if mail.tls == "starttls":
            server.starttls(context=trust)
            server.ehlo()
        if mail.user:
            server.login(mail.user, mail.password)
    except BaseException:
        server.close()
        raise
    return server


def _hand_over(
    server: smtplib.SMTP, sender: str, to: list[str], data: bytes, about_to_send: Callable[[], None]
) -> str:
    try:
        _expect(server.mail(sender))
        for address in to:
            _expect(server.rcpt(address))
        _expect(server.docmd("DATA"), 354)
        server.send(_stuffed(data))
    except (smtplib.SMTPException, OSError) as error:
        server.close()
        raise TemporaryError(f"the connection broke: {error}") from error
    try:
        about_to_send()
    except BaseException:
        server.close()  # without the dot there is no message
        raise
    try:
        if server.sock is not None:
            server.sock.settimeout(DOT_S)
        server.send(b".\r\n")
        reply = server.getreply()
    except (smtplib.SMTPException, OSError) as error:
        server.close()
        raise UnsureError(f"the connection broke before the answer came: {error}") from error
    return _expect(reply)


def _stuffed(data: bytes) -> bytes:
    """Lines ended by CRLF, and a dot at the start of a line doubled (RFC 5321 4.5.2)."""
    lines = re.sub(rb"\r?\n|\r", b"\r\n", data)
    lines = re.sub(rb"(?m)^\.", b"..", lines)
    return lines if lines.endswith(b"\r\n") else lines + b"\r\n"


def _expect(reply: tuple[int, bytes], wanted: int | None = None) -> str:
    """The server's words where it agreed; else TemporaryError or RejectedError with them."""
    code, said = reply
    words = f"{code} {said.decode('utf-8', 'replace')}"
    if code == wanted or (wanted is None and 200 <= code < 300):
        return words
    raise RejectedError(words) if 500 <= code < 600 else TemporaryError(words)


def _words(mail: Mail, code: int, said: bytes | str) -> str:
    text = said.decode("utf-8", "replace") if isinstance(said, bytes) else said
    return f"{mail.host}: {code} {text}"
