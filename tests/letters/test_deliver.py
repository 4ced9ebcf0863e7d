"""Handing messages to a real SMTP server, which agrees, refuses, breaks off or dawdles."""

from dataclasses import replace
from email import policy
from email.message import EmailMessage
from email.parser import BytesParser
from pathlib import Path

import pytest

from app.letters import deliver
from app.settings import Mail, Settings, SettingsError, read_mail
from tests.letters.server import (
    PASSWORD,
    USER,
    Post,
    certificate,
    free_port,
    knows_password,
    serving,
)

LONG = "Riegue la Pieza Larga el miércoles: 7.4 h. " * 40


def message() -> EmailMessage:
    """A letter with what servers stumble over: long lines, accents, lines that begin with a dot."""
    letter = EmailMessage(policy=policy.SMTP)
    letter["From"] = "Tarrow Advice <letters@example.org>"
    letter["To"] = "Ana Núñez <grower@example.org>"
    letter["Subject"] = "Semana del 13 de julio: riegue 3 campos"
    letter["Message-ID"] = "<week.7@example.org>"
    letter.set_content(f"{LONG}\n.\n..two dots\nFrom here\n", cte="quoted-printable")
    return letter


def settings(mail: Mail) -> Settings:
    """Settings of nothing but mail."""
    return Settings(database="sqlite://", mail=mail)


def test_the_letter_arrives_as_it_was_written() -> None:
    post = Post()
    with serving(post) as mail:
        assert deliver.send(message(), settings(mail)).startswith("250")
    (envelope,) = post.taken
    assert envelope.mail_from == "letters@example.org"
    assert envelope.rcpt_tos == ["grower@example.org"]
    raw = envelope.content
    assert max(map(len, raw.split(b"\r\n"))) <= 78  # RFC 5322 2.1.1
    assert raw.isascii()
    arrived = BytesParser(policy=policy.SMTP).parsebytes(raw)
    assert not arrived.defects
    assert arrived["Subject"] == message()["Subject"]
    assert arrived.get_content().splitlines() == message().get_content().splitlines()


@pytest.mark.parametrize(
    ("post", "error", "words"),
    [
        (Post(at_rcpt="450 Mailbox busy"), deliver.TemporaryError, "450 Mailbox busy"),
        (Post(at_rcpt="550 No such mailbox"), deliver.RejectedError, "550 No such mailbox"),
        (Post(at_data="451 Try later"), deliver.TemporaryError, "451 Try later"),
        (Post(at_data="554 Refused"), deliver.RejectedError, "554 Refused"),
        (Post(at_data="drop"), deliver.UnsureError, "before the answer"),
        (Post(at_data="keep-drop"), deliver.UnsureError, "before the answer"),
    ],
)
def test_what_a_server_says_decides(
    post: Post, error: type[deliver.DeliveryError], words: str
) -> None:
    with serving(post) as mail, pytest.raises(error, match=words):
        deliver.send(message(), settings(mail))


def test_a_slow_server_is_waited_for_and_a_silent_one_leaves_doubt(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    slow = Post(wait_s=0.4)
    with serving(slow) as mail:
        assert deliver.send(message(), settings(mail)).startswith("250")
    monkeypatch.setattr(deliver, "DOT_S", 0.2)
    with serving(slow) as mail, pytest.raises(deliver.UnsureError):
        deliver.send(message(), settings(mail))


def test_nobody_there_is_temporary() -> None:
    mail = Mail(host="127.0.0.1", port=free_port(), tls="none")
    with pytest.raises(deliver.TemporaryError, match=r"127\.0\.0\.1"):
        deliver.send(message(), settings(mail))


def test_what_stops_it_before_the_dot_stops_the_letter() -> None:
    class NotMineError(Exception):
        pass

    def refuse() -> None:
        raise NotMineError

    post = Post()
    with serving(post) as mail, pytest.raises(NotMineError):
        deliver.send(message(), settings(mail), refuse)
    assert post.taken == []


@pytest.mark.filterwarnings("ignore:Requiring AUTH while not requiring TLS")
@pytest.mark.parametrize("tls", ["starttls", "tls"])
def test_encrypted_and_logged_in(tls: str, tmp_path: Path) -> None:
    trusted, context = certificate(tmp_path)
    how = {"tls_context": context} if tls == "starttls" else {"ssl_context": context}
    login = {"authenticator": knows_password, "auth_required": True}
    if tls == "tls":  # the server does not know that its connection is encrypted
        login["auth_require_tls"] = False
    post = Post()
    with serving(post, **how, **login) as plain:
        mail = replace(plain, tls=tls, user=USER, password=PASSWORD, ca_file=str(trusted))
        deliver.send(message(), settings(mail))
        assert len(post.taken) == 1
        with pytest.raises(deliver.TemporaryError, match="535"):
            deliver.send(message(), settings(replace(mail, password="wrong")))
        with pytest.raises(deliver.TemporaryError, match="certificate"):
            deliver.send(message(), settings(replace(mail, ca_file="")))
    assert len(post.taken) == 1


def test_without_a_server_a_file_is_written_once(tmp_path: Path) -> None:
    mail = Mail(folder=tmp_path / "out")
    first = deliver.send(message(), settings(mail))
    assert deliver.send(message(), settings(mail)) == first
    (file,) = (tmp_path / "out").iterdir()
    assert file.name == "week.7.eml"
    parsed = BytesParser(policy=policy.SMTP).parsebytes(file.read_bytes())
    assert "Pieza Larga" in parsed.get_content()


def test_a_folder_that_cannot_be_written_is_said(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("a file")
    with pytest.raises(deliver.TemporaryError, match="out"):
        deliver.send(message(), settings(Mail(folder=tmp_path / "out")))


@pytest.mark.parametrize(
    ("environment", "says"),
    [
        ({"SMTP_HOST": "mail.example.org", "MAIL_FROM": ""}, "MAIL_FROM"),
        ({"SMTP_HOST": "mail.example.org", "SMTP_TLS": "none", "MAIL_FROM": "a@b"}, "unencrypted"),
        ({"SMTP_TLS": "ssl"}, "starttls, tls or none"),
        ({"SMTP_PORT": "70000"}, "65535"),
        ({"URL": "rillbook"}, "https://"),
    ],
)
def test_a_wrong_setting_is_refused_with_its_remedy(environment: dict[str, str], says: str) -> None:
    with pytest.raises(SettingsError, match=says):
        read_mail({f"RILLBOOK_{name}": value for name, value in environment.items()})


def test_settings_of_a_server() -> None:
    mail = read_mail(
        {
            "RILLBOOK_SMTP_HOST": "mail.example.org",
            "RILLBOOK_SMTP_USER": "u",
            "RILLBOOK_SMTP_PASSWORD": "p",
            "RILLBOOK_MAIL_FROM": "Advice <letters@example.org>",
            "RILLBOOK_URL": "https://rillbook.example.org/",
        }
    )
    assert (mail.port, mail.tls, mail.domain) == (587, "starttls", "example.org")
    assert mail.base_url == "https://rillbook.example.org"
    assert "p" not in repr(mail).split("host")[0]
    assert "password" not in repr(mail)
