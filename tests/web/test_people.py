"""Accounts from the first admin to a grower's sign-in, as people do it; on both databases."""

import re
from datetime import UTC, datetime, timedelta
from email import policy
from email.message import EmailMessage
from email.parser import BytesParser
from pathlib import Path

import pyotp
import pytest

from app.settings import Mail
from app.storage import people as store
from app.storage.database import Database
from app.storage.tables_people import Account, OneTimeLink, SignIn
from app.workflows import people, sign_in
from app.workflows.passwords import hashed
from tests.web import factory
from tests.web.conftest import Browser

PASSWORD = "seven brown herons"
ADMIN, ADVISOR, GROWER = "ada@example.org", "bo@example.org", "cy@example.org"


@pytest.fixture
def filled(db: Database) -> Database:
    """The factory's rows on either database, and an admin who can sign in."""
    factory.fill(db, fields=4, days=6)
    add(db, ADMIN, "Ada Reed", "admin")
    return db


def add(db: Database, address: str, name: str, role: str, *farms: str) -> int:
    """An account that can sign in."""
    browser = Browser(db)
    with db.write() as session:
        person = people.Person(address, name, role, frozenset(farms))
        account = people.add_account(session, person, "test")
        account.password = hashed(PASSWORD, browser.app.state.settings)
        return account.id


def enter(db: Database, address: str, folder: Path = Path("/nowhere"), code: str = "") -> Browser:
    """A browser that has signed in by the form."""
    browser = Browser(db, signed_in=True, mail=Mail(folder=folder))
    form = {"address": address, "password": PASSWORD, "code": code}
    answer = browser.post("/sign-in", data=form)
    assert answer.status_code == 303, answer.text
    return browser


def letters(folder: Path) -> list[EmailMessage]:
    """The letters written, oldest first."""
    found = sorted(folder.glob("*.eml"), key=lambda path: path.stat().st_mtime_ns)
    strict = policy.SMTP.clone(raise_on_defect=True)
    return [BytesParser(policy=strict).parsebytes(path.read_bytes()) for path in found]  # type: ignore[arg-type]


def link_in(letter: EmailMessage) -> str:
    """The path of the one-time link in a letter."""
    found = re.search(r"http://127\.0\.0\.1:8000(/link/\S+)", letter.get_content())
    assert found is not None
    return found[1]


def test_once_an_admin_can_sign_in_everybody_has_to(db: Database) -> None:
    assert Browser(db).get("/people").status_code == 200
    add(db, ADMIN, "Ada Reed", "admin")
    browser = Browser(db)
    assert browser.get("/people").headers["location"] == "/sign-in?to=%2Fpeople"
    refused = browser.get("/api/v1/rounds")
    assert refused.status_code == 401
    assert refused.headers["www-authenticate"] == "Bearer"
    assert browser.get("/methods").status_code == 303


def test_an_invited_grower_chooses_a_password_and_sees_the_own_farm(
    filled: Database, tmp_path: Path
) -> None:
    admin = enter(filled, ADMIN, tmp_path)
    form = {"address": GROWER, "name": "Cy Moor", "role": "grower", "language": "es"}
    answer = admin.post("/people", data={**form, "farm": ["hollin"]})
    assert answer.status_code == 200
    assert "The link for Cy Moor was written to" in answer.text
    (letter,) = letters(tmp_path)
    assert letter["To"] == f"Cy Moor <{GROWER}>"
    assert letter["Content-Language"] == "es"
    assert "Ada Reed le abrió" in letter.get_content()
    assert "agua" in letter.get_content()
    path = link_in(letter)
    with filled.read() as session:
        kept = [row.secret for row in session.query(OneTimeLink)]
    assert all(secret not in path for secret in kept)

    grower = Browser(filled, signed_in=True)
    for _ in range(2):  # looking changes nothing
        assert "Cy Moor" in grower.get(path).text
    short = {"password": "short", "again": "short"}
    assert grower.post(path, data=short).status_code == 422
    own = {"password": "cy moor waters", "again": "cy moor waters"}
    assert "guessed early" in grower.post(path, data=own).text
    chosen = {"password": PASSWORD, "again": PASSWORD}
    answer = grower.post(path, data=chosen)
    assert answer.headers["location"] == "/"
    cookie = answer.headers["set-cookie"]
    assert "HttpOnly" in cookie
    assert "SameSite=lax" in cookie
    assert "Tern Creek" not in grower.get("/").text
    assert grower.get("/fields/field-3").status_code == 200
    assert grower.get("/fields/field-1").status_code == 404
    assert grower.get("/people").status_code == 403
    # a link works once
    assert grower.post(path, data=chosen).status_code == 404
    assert enter(filled, GROWER).get("/me").status_code == 200


def test_a_link_runs_out_and_a_newer_one_takes_its_place(filled: Database) -> None:
    now = datetime.now(UTC)
    with filled.write() as session:
        account = store.account_at(session, ADMIN)
        assert account is not None
        first = people.make_link(session, account, "reset", now)
        second = people.make_link(session, account, "reset", now)
    with filled.read() as session:
        assert store.link_of(session, first, now) is None
        assert store.link_of(session, second, now + timedelta(hours=23)) is not None
        assert store.link_of(session, second, now + timedelta(hours=25)) is None


def test_asking_for_a_new_password_tells_nobody_who_has_an_account(
    filled: Database, tmp_path: Path
) -> None:
    browser = Browser(filled, signed_in=True, mail=Mail(folder=tmp_path))
    there = browser.post("/forgot", data={"address": ADMIN}).text
    not_there = browser.post("/forgot", data={"address": "zz@example.org"}).text
    assert there.replace(ADMIN, "") == not_there.replace("zz@example.org", "")
    assert len(letters(tmp_path)) == 1
    old = enter(filled, ADMIN)
    path = link_in(letters(tmp_path)[0])
    new = "nine quiet willows"
    assert browser.post(path, data={"password": new, "again": new}).status_code == 303
    assert old.get("/").status_code == 303  # signed out everywhere
    for _ in range(5):
        browser.post("/forgot", data={"address": ADMIN})
    assert len(letters(tmp_path)) == people.RESETS


def test_tries_are_counted_in_the_database_for_every_process(filled: Database) -> None:
    wrong = {"address": ADMIN, "password": "not the right one"}
    answers = [Browser(filled).post("/sign-in", data=wrong) for _ in range(sign_in.PAIR_TRIES)]
    assert {answer.status_code for answer in answers} == {422}
    assert "not right" in answers[-1].text
    other = Database(filled.url)
    again = Browser(other).post("/sign-in", data={"address": ADMIN, "password": PASSWORD})
    other.close()
    assert again.status_code == 422
    assert "Too many tries" in again.text


def test_an_unknown_address_is_refused_in_the_same_words(filled: Database) -> None:
    said = [
        Browser(filled).post("/sign-in", data={"address": address, "password": "wrong"}).text
        for address in (ADMIN, "zz@example.org")
    ]
    assert said[0].replace(ADMIN, "") == said[1].replace("zz@example.org", "")


def test_one_time_codes_follow_the_standard_and_count_once() -> None:
    # RFC 6238, appendix B: the SHA-1 seed; its eight digits end in these six
    seed = "GEZDGNBVGY3TQOJQGEZDGNBVGY3TQOJQ"
    for seconds, code in ((59, "287082"), (1111111109, "081804"), (20000000000, "353130")):
        at = datetime.fromtimestamp(seconds, UTC)
        assert sign_in.step_of(seed, code, at) == seconds // 30
    account = Account(code_secret=seed, code_step=None)
    at = datetime.fromtimestamp(59, UTC)
    assert sign_in.takes_code(account, "287 082", at)
    assert not sign_in.takes_code(account, "287082", at)
    assert not sign_in.takes_code(account, "", at)


def test_codes_are_switched_on_and_then_asked_for(filled: Database) -> None:
    admin = enter(filled, ADMIN)
    page = admin.post("/me/codes").text
    found = re.search(r'name="secret" value="([A-Z2-7]{32})"', page)
    assert found is not None
    assert "<svg" in page
    assert "style=" not in page
    secret = found[1]
    wrong = admin.post("/me/codes/on", data={"secret": secret, "code": "abc"})
    assert wrong.status_code == 422
    code = pyotp.TOTP(secret).now()
    assert admin.post("/me/codes/on", data={"secret": secret, "code": code}).status_code == 303
    form = {"address": ADMIN, "password": PASSWORD}
    assert Browser(filled).post("/sign-in", data=form).status_code == 422
    later = pyotp.TOTP(secret).at(datetime.now(UTC) + timedelta(seconds=30))
    assert Browser(filled).post("/sign-in", data={**form, "code": later}).status_code == 303
    assert admin.post("/me/codes/off", data={"old": "wrong"}).status_code == 422
    assert admin.post("/me/codes/off", data={"old": PASSWORD}).status_code == 303


def test_sign_ins_are_listed_and_ended(filled: Database) -> None:
    first, second = enter(filled, ADMIN), enter(filled, ADMIN)
    with filled.read() as session:
        number = session.query(SignIn.id).order_by(SignIn.id).first()[0]  # type: ignore[index]
    assert f"/me/sign-ins/{number}/end" in second.get("/me").text
    assert second.post(f"/me/sign-ins/{number}/end").status_code == 303
    assert first.get("/").status_code == 303
    assert second.get("/").status_code == 200
    second.post("/sign-out")
    assert second.get("/").status_code == 303


def test_a_changed_password_signs_other_browsers_out(filled: Database) -> None:
    first, second = enter(filled, ADMIN), enter(filled, ADMIN)
    new = "nine quiet willows"
    form = {"old": PASSWORD, "password": new, "again": new}
    assert second.post("/me/password", data={**form, "old": "wrong"}).status_code == 422
    assert second.post("/me/password", data=form).status_code == 303
    assert first.get("/").status_code == 303
    assert second.get("/").status_code == 200


def test_a_stopped_account_is_out_at_once_and_the_last_admin_stays(filled: Database) -> None:
    number = add(filled, ADVISOR, "Bo Lane", "advisor", "hollin", "tern")
    admin, advisor = enter(filled, ADMIN), enter(filled, ADVISOR)
    token = re.search(r"rlr_[\w-]+", advisor.post("/me/tokens", data={"name": "x"}).text)
    assert token is not None
    bearer = {"Authorization": f"Bearer {token[0]}"}
    assert Browser(filled).get("/api/v1/fields", headers=bearer).status_code == 200
    assert admin.post(f"/people/{number}/stop").status_code == 303
    assert advisor.get("/").status_code == 303
    assert Browser(filled).get("/api/v1/fields", headers=bearer).status_code == 401
    form = {"address": ADVISOR, "password": PASSWORD}
    assert Browser(filled).post("/sign-in", data=form).status_code == 422
    with filled.read() as session:
        own = store.account_at(session, ADMIN)
    assert own is not None
    last = admin.post(f"/people/{own.id}/stop")
    assert last.status_code == 422
    assert "only admin" in last.text
    changed = admin.post(f"/people/{own.id}", data={"name": "Ada Reed", "role": "grower"})
    assert changed.status_code == 422


def test_the_audit_shows_who_changed_what_before_and_after(filled: Database) -> None:
    number = add(filled, ADVISOR, "Bo Lane", "advisor", "hollin")
    admin = enter(filled, ADMIN)
    change = {"name": "Bo Lane", "role": "advisor", "language": "en", "farm": ["hollin", "tern"]}
    assert admin.post(f"/people/{number}", data=change).status_code == 303
    text = admin.get("/audit").text
    assert "<del>hollin</del> hollin, tern" in text
    assert "Ada Reed" in text
    assert factory.HOSTILE not in text
    with filled.read() as session:
        account = session.get(Account, number)
    assert account is not None
    assert str(account.password) not in text
    assert enter(filled, ADVISOR).get("/audit").status_code == 403


def test_a_loggers_token_pushes_to_its_station_and_opens_nothing_else(filled: Database) -> None:
    admin = enter(filled, ADMIN)
    page = admin.post("/stations/north/tokens", data={"name": "box 3"}).text
    found = re.search(r"rlp_[\w-]+", page)
    assert found is not None
    bearer = {"Authorization": f"Bearer {found[0]}"}
    rows = {
        "interval_s": 600,
        "units": {"air_temperature": "degC"},
        "rows": [{"at": "2026-07-13T10:10:00-07:00", "values": {"air_temperature": 24.1}}],
    }
    logger = Browser(filled)
    push = "/api/v1/stations/{}/readings"
    assert logger.post(push.format("north"), json=rows, headers=bearer).status_code == 200
    assert logger.post(push.format("bench"), json=rows, headers=bearer).status_code == 404
    assert logger.post(push.format("north"), json=rows).status_code == 401
    assert logger.get("/api/v1/rounds", headers=bearer).status_code == 403
    assert logger.get("/", headers=bearer).status_code == 303
    assert "north: box 3" in admin.get("/intake").text
    assert found[0] not in admin.get("/stations/north/tokens").text
    revoke = re.search(r"/stations/north/tokens/\d+/revoke", page)
    assert revoke is not None
    assert admin.post(revoke[0]).status_code == 303
    assert logger.post(push.format("north"), json=rows, headers=bearer).status_code == 401


def test_a_change_by_cookie_without_word_of_where_it_comes_from_is_refused(
    filled: Database,
) -> None:
    admin = enter(filled, ADMIN)
    admin.headers = {}
    assert admin.post("/me/tokens", data={"name": "x"}).status_code == 403
    near = {"Origin": "http://localhost"}
    assert admin.post("/me/tokens", data={"name": "x"}, headers=near).status_code == 200
    assert admin.get("/me").status_code == 200


@pytest.fixture
def https(filled: Database) -> Browser:
    """A browser on pages that are reached by https under a name of their own."""
    mail = Mail(base_url="https://rill.example.org", folder=Path("/nowhere"))
    return Browser(filled, mail=mail)


def test_under_https_cookies_are_secure_and_the_own_name_is_answered(https: Browser) -> None:
    host = {"Host": "rill.example.org", "Origin": "https://rill.example.org"}
    form = {"address": ADMIN, "password": PASSWORD}
    answer = https.post("/sign-in", data=form, headers=host)
    assert answer.status_code == 303
    assert answer.headers["set-cookie"].startswith("__Host-rillbook_sign_in=")
    assert "Secure" in answer.headers["set-cookie"]
    assert "strict-transport-security" in answer.headers
    evil = {"Host": "evil.example.org"}
    assert https.get("/sign-in", headers=evil).status_code == 421


@pytest.mark.parametrize("to", ["//evil.example.org", "https://evil.example.org", "/\\evil", "x"])
def test_signing_in_leads_nowhere_else(filled: Database, to: str) -> None:
    form = {"address": ADMIN, "password": PASSWORD, "to": to}
    assert Browser(filled).post("/sign-in", data=form).headers["location"] == "/"


def test_an_account_is_refused_with_the_reason(filled: Database) -> None:
    admin = enter(filled, ADMIN)
    for form, says in (
        ({"address": "no", "name": "X", "role": "grower"}, "no e-mail address"),
        ({"address": ADMIN, "name": "X", "role": "grower"}, "already"),
        ({"address": "x@example.org", "name": "ADA reed", "role": "grower"}, "already"),
        ({"address": "x@example.org", "name": " ", "role": "grower"}, "name is needed"),
        ({"address": "x@example.org", "name": "X", "role": "king"}, "no role"),
    ):
        answer = admin.post("/people", data=form)
        assert answer.status_code == 422
        assert says in answer.text
