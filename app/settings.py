"""The environment, read once into one frozen object; a wrong value is refused with its remedy."""

import os
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date
from email.utils import parseaddr
from pathlib import Path
from urllib.parse import urlsplit

from app.errors import InputError


class SettingsError(InputError):
    """A setting that cannot be used; the message says which, why and how to mend it."""


@dataclass(frozen=True)
class Mail:
    """How letters and invitations leave.

    host: SMTP server; without one messages are written as .eml files to `folder`.
    tls: starttls (from a plain connection), tls (from the first byte), none (loopback only).
    sender: From header. base_url: the address of the pages, for links in letters.
    """

    host: str = ""
    port: int = 587
    tls: str = "starttls"
    user: str = ""
    password: str = field(default="", repr=False)
    ca_file: str = ""
    sender: str = "Rillbook <letters@rillbook.example.org>"
    folder: Path = Path("rillbook-letters")
    base_url: str = "http://127.0.0.1:8000"

    @property
    def sender_address(self) -> str:
        """The bare address of the sender."""
        return parseaddr(self.sender)[1]

    @property
    def domain(self) -> str:
        """The right side of Message-IDs and of calendar entries' UIDs."""
        return self.sender_address.rpartition("@")[2]


@dataclass(frozen=True)
class Settings:
    """What the environment decides.

    database: SQLAlchemy URL (`sqlite:///...` or `postgresql://...`).
    today: the day it is for every station, or None for each station's own date.
    demo: True only under `rillbook demo`; opens the three ways in without an account.
    mail: how letters leave.
    correction_days, correction_share: what makes a correction letter: days an irrigation moves,
    share its hours change (working values).
    password_memory_kib: memory that one check of a password takes (RFC 9106 4 gives 64 MiB).
    """

    database: str
    today: date | None = None
    demo: bool = False
    mail: Mail = field(default_factory=Mail)
    correction_days: int = 2
    correction_share: float = 0.25
    password_memory_kib: int = 65536


def default_database() -> str:
    """The database of a plain `rillbook serve`: one SQLite file in the folder it is run from."""
    return f"sqlite:///{Path.cwd() / 'rillbook.sqlite'}"


def read_settings(environment: Mapping[str, str] = os.environ) -> Settings:
    """Settings of the `RILLBOOK_...` variables; raises SettingsError."""
    database = environment.get("RILLBOOK_DATABASE", "").strip() or default_database()
    if database.split(":", 1)[0].split("+")[0] not in {"sqlite", "postgresql"}:
        raise SettingsError(
            f"RILLBOOK_DATABASE is {database!r}; it must begin with sqlite:/// or postgresql://"
        )
    stated = environment.get("RILLBOOK_TODAY", "").strip()
    try:
        today = date.fromisoformat(stated) if stated else None
    except ValueError:
        raise SettingsError(
            f"RILLBOOK_TODAY is {stated!r}; it must be a date such as 2026-07-14, or not set"
        ) from None
    if today is not None and not 1980 <= today.year <= 2200:
        raise SettingsError(f"RILLBOOK_TODAY is {stated!r}; it must lie in the years 1980 to 2200")
    return Settings(
        database=database,
        today=today,
        mail=read_mail(environment),
        correction_days=int(_between(environment, "CORRECTION_DAYS", 2, 1, 7)),
        correction_share=_between(environment, "CORRECTION_SHARE", 0.25, 0.01, 10.0),
    )


def _between(
    environment: Mapping[str, str], name: str, plain: float, low: float, high: float
) -> float:
    """A number of the environment within bounds, `plain` where it is not set."""
    stated = environment.get(f"RILLBOOK_{name}", "").strip()
    try:
        value = float(stated) if stated else plain
    except ValueError:
        value = high + 1
    if not low <= value <= high:
        raise SettingsError(
            f"RILLBOOK_{name} is {stated!r}; it must be a number from {low:g} to {high:g}"
        )
    return value


LOOPBACK = frozenset({"127.0.0.1", "localhost", "::1"})
PORTS = {"starttls": 587, "tls": 465, "none": 25}


def read_mail(environment: Mapping[str, str]) -> Mail:
    """The mail settings; raises SettingsError."""

    def stated(name: str) -> str:
        return environment.get(f"RILLBOOK_{name}", "").strip()

    plain = Mail()
    host, tls = stated("SMTP_HOST"), stated("SMTP_TLS") or "starttls"
    if tls not in PORTS:
        raise SettingsError(f"RILLBOOK_SMTP_TLS is {tls!r}; choose starttls, tls or none")
    if tls == "none" and host not in LOOPBACK | {""}:
        raise SettingsError(
            f"RILLBOOK_SMTP_TLS is none for {host!r}; letters go unencrypted to this machine only: "
            "choose starttls or tls"
        )
    port = stated("SMTP_PORT") or str(PORTS[tls])
    if not (port.isascii() and port.isdecimal() and 0 < int(port) < 65536):
        raise SettingsError(f"RILLBOOK_SMTP_PORT is {port!r}; it must be a number up to 65535")
    sender = stated("MAIL_FROM") or plain.sender
    if "@" not in parseaddr(sender)[1] or (host and not stated("MAIL_FROM")):
        raise SettingsError(
            f"RILLBOOK_MAIL_FROM is {stated('MAIL_FROM')!r}; with RILLBOOK_SMTP_HOST it must be "
            "the sender, such as 'Tarrow Advice <letters@example.org>'"
        )
    base_url = (stated("URL") or plain.base_url).rstrip("/")
    parts = urlsplit(base_url)
    if parts.scheme not in ("http", "https") or not parts.netloc:
        raise SettingsError(
            f"RILLBOOK_URL is {base_url!r}; it must be the address of the pages, such as "
            "https://rillbook.example.org"
        )
    return Mail(
        host=host,
        port=int(port),
        tls=tls,
        user=stated("SMTP_USER"),
        password=environment.get("RILLBOOK_SMTP_PASSWORD", ""),
        ca_file=stated("SMTP_CA"),
        sender=sender,
        folder=Path(stated("MAIL_FOLDER") or plain.folder),
        base_url=base_url,
    )
