"""A real SMTP server on the loopback address that does as it is told: takes letters, refuses them
for now or for good, breaks the connection, dawdles."""

import asyncio
import datetime
import socket
import ssl
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from aiosmtpd.controller import Controller
from aiosmtpd.smtp import SMTP, AuthResult, Envelope, Session
from cryptography import x509
from cryptography.hazmat.primitives import hashes, serialization
from cryptography.hazmat.primitives.asymmetric import ec

from app.settings import Mail

USER, PASSWORD = "letters", "a password"


@dataclass
class Post:
    """What the server does at RCPT and at the end of DATA, and what it has taken.

    at_rcpt, at_data: an answer, or drop (close without one), or keep-drop (keep the letter, close
    without an answer). wait_s: before the answer to DATA.
    """

    at_rcpt: str = "250 OK"
    at_data: str = "250 OK"
    wait_s: float = 0.0
    taken: list[Envelope] = field(default_factory=list)

    async def handle_RCPT(  # noqa: N802
        self, server: SMTP, session: Session, envelope: Envelope, address: str, options: Any
    ) -> str:
        """RCPT TO."""
        if self.at_rcpt.startswith("250"):
            envelope.rcpt_tos.append(address)
        return self.at_rcpt

    async def handle_DATA(  # noqa: N802
        self, server: SMTP, session: Session, envelope: Envelope
    ) -> str:
        """The end of DATA."""
        if self.at_data[:3] in ("250", "kee"):
            self.taken.append(envelope)
        await asyncio.sleep(self.wait_s)
        if self.at_data.endswith("drop"):
            server.transport.abort()
        return self.at_data

    @property
    def ids(self) -> list[str]:
        """The Message-IDs of the letters taken."""
        lines = [envelope.content.decode().splitlines() for envelope in self.taken]
        return [
            line.split(":", 1)[1].strip()
            for letter in lines
            for line in letter
            if line.lower().startswith("message-id:")
        ]


def free_port() -> int:
    """A port nobody listens on."""
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


@contextmanager
def serving(post: Post, **more: Any) -> Iterator[Mail]:
    """The server on a free port, and the settings that reach it without encryption."""
    controller = Controller(post, hostname="127.0.0.1", port=free_port(), **more)
    controller.start()
    try:
        yield Mail(
            host="127.0.0.1",
            port=controller.port,
            tls="none",
            sender="Tarrow Advice <letters@example.org>",
            base_url="https://rillbook.example.org",
        )
    finally:
        controller.stop()


def knows_password(server: Any, session: Any, envelope: Any, mechanism: str, data: Any) -> Any:
    """Whether somebody may log in."""
    right = (data.login, data.password) == (USER.encode(), PASSWORD.encode())
    return AuthResult(success=right, handled=right)


def certificate(folder: Path) -> tuple[Path, ssl.SSLContext]:
    """A certificate for 127.0.0.1 that signs itself, and a server's context with it."""
    import ipaddress

    key = ec.generate_private_key(ec.SECP256R1())
    name = x509.Name([x509.NameAttribute(x509.NameOID.COMMON_NAME, "127.0.0.1")])
    now = datetime.datetime.now(datetime.UTC)
    day = datetime.timedelta(days=1)
    made = (
        x509.CertificateBuilder()
        .subject_name(name)
        .issuer_name(name)
        .public_key(key.public_key())
        .serial_number(x509.random_serial_number())
        .not_valid_before(now - day)
        .not_valid_after(now + day)
        .add_extension(
            x509.SubjectAlternativeName([x509.IPAddress(ipaddress.ip_address("127.0.0.1"))]), False
        )
        .add_extension(x509.BasicConstraints(ca=True, path_length=0), True)
        .sign(key, hashes.SHA256())
    )
    cert_file, key_file = folder / "cert.pem", folder / "key.pem"
    cert_file.write_bytes(made.public_bytes(serialization.Encoding.PEM))
    key_file.write_bytes(
        key.private_bytes(
            serialization.Encoding.PEM,
            serialization.PrivateFormat.PKCS8,
            serialization.NoEncryption(),
        )
    )
    context = ssl.SSLContext(ssl.PROTOCOL_TLS_SERVER)
    context.load_cert_chain(cert_file, key_file)
    return cert_file, context
