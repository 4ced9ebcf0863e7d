"""The desk, a letter's links, the grower's farm page and its calendar, through the real app."""

import re
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from email import policy
from email.parser import BytesParser
from pathlib import Path

import pytest
from icalendar import Calendar
from sqlalchemy import select

from app.letters import links
from app.main import create_app
from app.settings import Mail, Settings
from app.storage import letters as store
from app.storage.database import Database
from app.storage.tables import BookChange, Event
from app.storage.tables_letters import LetterAnswer, Recipient
from app.workflows.load_book import load_book
from app.workflows.post_letters import post
from tests.web.conftest import Browser
from tests.workflows import basin
from tests.workflows import letter_basin as world

TODAY = basin.TODAY
NOON = datetime(2026, 7, 2, 3, 0, tzinfo=UTC)


@pytest.fixture
def desk(live: Browser, tmp_path: Path) -> Browser:
    """The admin's browser on the basin with two recipients, letters going to a folder."""
    settings = Settings(database=live.db.url, today=TODAY, mail=Mail(folder=tmp_path / "out"))
    live.app = create_app(settings, live.db)
    with live.db.write() as session:
        load_book(session, world.book(), "admin")
    live.get("/letters")
    return live


def numbers(desk: Browser) -> dict[str, int]:
    """The letters' numbers by their recipients' first names."""
    with desk.db.read() as session:
        return {row.recipient.name.split()[0]: row.letter.id for row in store.letters(session)}


def state(desk: Browser, number: int) -> str:
    """A letter's state."""
    with desk.db.read() as session:
        return store.letters(session, one=number)[0].letter.state


def send_all(desk: Browser) -> None:
    """Release everything and post it."""
    for number in numbers(desk).values():
        assert desk.post(f"/letters/{number}/send").status_code == 303
    posted = post(desk.db, desk.app.state.settings, lambda: NOON, lambda: TODAY)
    assert posted.sent == len(numbers(desk))


def text_of(data: bytes) -> str:
    """The plain text of a letter."""
    part = BytesParser(policy=policy.SMTP).parsebytes(data).get_body(("plain",))
    assert part is not None
    text: str = part.get_content()
    return text


def sent_text(desk: Browser, number: int) -> str:
    """The plain text of a letter that was released."""
    return text_of(desk.get(f"/letters/{number}/letter.eml").content)


def answer_links(desk: Browser, number: int, kind: str) -> list[str]:
    """The paths of a letter's links."""
    return re.findall(rf"https?://[^/\s]+(/answer/{kind}\.\S+)", sent_text(desk, number))


def events(desk: Browser) -> list[Event]:
    """The irrigations that stand and were told by letter."""
    with desk.db.read() as session:
        told = select(Event).where(Event.who.endswith("by letter")).order_by(Event.id)
        found = list(session.scalars(told))
        session.expunge_all()
    gone = {event.supersedes for event in found}
    return [event for event in found if event.id not in gone and event.kind != "void"]


# The desk


def test_the_desk_shows_each_letter_and_releases_those_ticked(desk: Browser) -> None:
    page = desk.get("/letters").text
    assert "Semana del" in page
    assert "Week of" in page
    assert "No mail server is set" in page
    both = list(numbers(desk).values())
    assert len(both) == 2
    answer = desk.post("/letters/release", data={"letter": both})
    assert answer.headers["location"] == "/letters?done=release"
    assert {state(desk, number) for number in both} == {"released"}
    assert desk.post("/letters/release", data={"letter": both}).status_code == 422
    assert desk.post("/letters/release", data={}).status_code == 422


def test_a_preview_is_what_is_sent(desk: Browser, tmp_path: Path) -> None:
    number = numbers(desk)["Ben"]
    desk.post(f"/letters/{number}/note", data={"note": "Call me on Friday.\nD.", "whole_farm": "1"})
    before = desk.get(f"/letters/{number}/letter.eml").content
    send_all(desk)
    (file,) = [path for path in (tmp_path / "out").iterdir() if f".{number}." in path.name]
    without_date = re.compile(rb"^(Date|DTSTAMP):.*\r\n", re.M)
    assert without_date.sub(b"", file.read_bytes()) == without_date.sub(b"", before)
    assert "Call me on Friday." in sent_text(desk, number)
    assert "Call me on Friday." in sent_text(desk, numbers(desk)["Ana"])
    html = desk.get(f"/letters/{number}/html")
    assert "sandbox" in html.headers["content-security-policy"]
    assert "data:image/png;base64," in html.text
    page = desk.get(f"/letters/{number}").text
    assert "As it was handed over" in page


def test_hold_take_back_and_what_cannot_be_done(desk: Browser) -> None:
    number = numbers(desk)["Ana"]
    assert desk.post(f"/letters/{number}/hold", data={"why": "rain"}).status_code == 303
    assert state(desk, number) == "held"
    shown = desk.get("/letters").text
    assert "held back: rain" in shown
    assert f'value="{number}" checked' not in shown  # somebody held it: not released with the rest
    assert desk.post(f"/letters/{number}/again").status_code == 422
    assert desk.post(f"/letters/{number}/arrived").status_code == 422
    assert desk.post(f"/letters/{number}/release").status_code == 303
    refused = desk.post(f"/letters/{number}/note", data={"note": "late"})
    assert refused.status_code == 422
    assert "take it back" in refused.text
    assert desk.post(f"/letters/{number}/back").status_code == 303
    assert state(desk, number) == "draft"
    assert desk.post(f"/letters/{number}/eat").status_code == 404
    assert desk.post("/letters/999/release").status_code == 404
    assert desk.get("/letters/999").status_code == 404
    long = desk.post(f"/letters/{number}/note", data={"note": "x" * 3000})
    assert long.status_code == 422


def test_cover_signs_the_letters_while_it_lasts(desk: Browser) -> None:
    number = numbers(desk)["Ben"]
    assert "D. Arden" in sent_text(desk, number)
    cover = {"name": "E. Torvane", "first": str(TODAY), "last": str(TODAY + timedelta(days=7))}
    assert desk.post("/covers", data=cover).status_code == 303
    assert "E. Torvane, for D. Arden" in sent_text(desk, number)
    assert "E. Torvane covers" in desk.get("/letters").text
    assert desk.post("/covers/1/end").status_code == 303
    assert desk.post("/covers/1/end").status_code == 404
    assert "E. Torvane" not in sent_text(desk, number)
    backwards = cover | {"last": str(TODAY - timedelta(days=1))}
    assert desk.post("/covers", data=backwards).status_code == 422
    assert desk.post("/covers", data=cover | {"farm": "nobody"}).status_code == 404


def test_recipients_are_added_and_changed_and_kept_in_the_record(desk: Browser) -> None:
    new = {"farm": "reed", "name": "Cy Reed", "address": "cy@example.org", "language": "es"}
    assert desk.post("/recipients", data=new).status_code == 303
    with desk.db.read() as session:
        row = session.scalars(select(Recipient).where(Recipient.name == "Cy Reed")).one()
        assert (row.language, row.units, row.weekday, row.hour) == ("es", "metric", 6, 18)
    change = new | {"hour": "5", "units": "us", "paused": "true"}
    assert desk.post(f"/recipients/{row.id}", data=change).status_code == 303
    with desk.db.read() as session:
        changes = select(BookChange).where(BookChange.kind == "recipient")
        last = session.scalars(changes.order_by(BookChange.id.desc())).first()
        assert last is not None
        assert last.before is not None
        assert last.after is not None
        assert (last.before["hour"], last.after["hour"], last.who) == (18, 5, "admin")
    for wrong in ({"address": "cy"}, {"address": "ana@example.org"}, {"hour": "25"}, {"name": ""}):
        assert desk.post(f"/recipients/{row.id}", data=change | wrong).status_code == 422, wrong
    assert desk.post("/recipients/999", data=change).status_code == 404
    assert desk.post("/recipients", data=new | {"farm": "nobody"}).status_code == 404


def test_a_letter_released_to_an_old_address_does_not_go_there(desk: Browser) -> None:
    number = numbers(desk)["Ana"]
    desk.post(f"/letters/{number}/release")
    with desk.db.read() as session:
        ana = session.scalars(select(Recipient).where(Recipient.name == "Ana Reed")).one()
    data = {"name": "Ana Reed", "address": "new@example.org", "weekday": "2", "hour": "18"}
    assert desk.post(f"/recipients/{ana.id}", data=data).status_code == 303
    assert state(desk, number) == "draft"
    assert "new@example.org" in desk.get(f"/letters/{number}").text


# The links


def test_opening_a_link_changes_nothing_and_a_button_does(desk: Browser) -> None:
    send_all(desk)
    number = numbers(desk)["Ana"]
    link = answer_links(desk, number, "done")[0]
    page = desk.get(link)
    assert page.status_code == 200
    assert '<html lang="es">' in page.text
    assert "No se anota nada hasta que pulse un botón." in page.text
    assert events(desk) == []
    thanks = desk.post(link, data={"said": "done", "day": str(TODAY)})
    assert "Gracias" in thanks.text
    told = events(desk)
    assert len({event.amount for event in told}) == 1
    assert {event.unit for event in told} == {"hours"}
    assert {event.who for event in told} == {"Ana Reed, by letter"}
    assert "1 done" in desk.get("/letters").text
    assert "reemplaza la anterior" in desk.get(link).text


def test_a_second_answer_takes_the_place_of_the_first(desk: Browser) -> None:
    send_all(desk)
    number = numbers(desk)["Ben"]
    done, other = (answer_links(desk, number, kind)[0] for kind in ("done", "other"))
    desk.post(done, data={"said": "done", "day": str(TODAY)})
    blocks = len(events(desk))
    inches = {"said": "otherwise", "day": str(TODAY), "amount": "1,5", "unit": "depth"}
    assert desk.post(other, data=inches).status_code == 200
    assert [(event.unit, event.amount) for event in events(desk)] == [("gross_mm", 38.1)] * blocks
    assert desk.post(other, data={"said": "not"}).status_code == 200
    assert events(desk) == []
    with desk.db.read() as session:
        answers = session.scalars(select(LetterAnswer).order_by(LetterAnswer.id))
        assert [one.said for one in answers] == ["done", "otherwise", "not"]


@pytest.mark.parametrize(
    ("answer", "says"),
    [
        ({"amount": "many", "day": str(TODAY)}, "many no es un número"),
        ({"amount": "", "day": str(TODAY)}, "no es un número"),
        ({"amount": "5", "day": "2031-01-01"}, "no es una fecha"),
        ({"amount": "5", "day": "<b>"}, "&lt;b&gt; no es una fecha"),
        ({"amount": "5000", "day": str(TODAY)}, "5000 es demasiado"),
        ({"amount": "-5", "day": str(TODAY)}, "-5 es demasiado"),
    ],
)
def test_a_slip_is_told_in_the_readers_language(
    desk: Browser, answer: dict[str, str], says: str
) -> None:
    send_all(desk)
    link = answer_links(desk, numbers(desk)["Ana"], "other")[0]
    refused = desk.post(link, data={"said": "otherwise", **answer})
    assert refused.status_code == 422
    assert says in refused.text
    assert events(desk) == []


def test_forged_and_expired_links_do_nothing(desk: Browser) -> None:
    send_all(desk)
    number = numbers(desk)["Ben"]
    link = answer_links(desk, number, "done")[0]
    for forged in (
        link[:-1],
        link.replace(f".{number}.", f".{number + 1}."),
        "/answer/done",
        link + "x",
    ):
        assert desk.get(forged).status_code == 404, forged
        assert desk.post(forged, data={"said": "done", "day": str(TODAY)}).status_code == 404
    with desk.db.read() as session:
        key = store.signing_key(session)
    old = links.sign(key, "done", number, 1, until=TODAY - timedelta(days=1))
    expired = desk.get(f"/answer/{old}")
    assert expired.status_code == 410
    assert "This link has run out" in expired.text
    assert "Este enlace ha caducado" in expired.text
    lost = links.sign(key, "done", number, 99, until=TODAY)
    assert desk.get(f"/answer/{lost}").status_code == 404
    assert events(desk) == []


def test_one_click_unsubscribes_and_a_look_does_not(desk: Browser) -> None:
    """RFC 8058: the mail program posts List-Unsubscribe=One-Click, without cookies or origin."""
    send_all(desk)
    letter = desk.get(f"/letters/{numbers(desk)['Ana']}/letter.eml").content
    (stop,) = re.findall(rb"^List-Unsubscribe: <https?://[^/]+(/stop/\S+)>\r$", letter, re.M)
    path = stop.decode()
    assert "¿Dejar de recibir" in desk.get(path).text
    with desk.db.read() as session:
        assert session.scalars(select(Recipient.stopped_at)).all() == [None, None]
    one_click = desk.post(path, data={"List-Unsubscribe": "One-Click"})
    assert one_click.status_code == 200
    desk.post(path, data={"List-Unsubscribe": "One-Click"})
    with desk.db.read() as session:
        ana = session.scalars(select(Recipient).where(Recipient.name == "Ana Reed")).one()
        assert ana.stopped_at is not None
    assert "asked for no more letters" in desk.get("/recipients").text
    assert desk.post(path, data={"start": "true"}).status_code == 200
    with desk.db.read() as session:
        assert session.get_one(Recipient, ana.id).stopped_at is None
    assert desk.get(path[:-1]).status_code == 404


# The farm page


def test_the_farm_page_speaks_the_readers_language_and_units(desk: Browser) -> None:
    spanish = desk.get("/farm/reed").text  # of its first recipient
    assert '<html lang="es">' in spanish
    assert "¿Qué hizo?" in spanish
    assert "Estimaciones para apoyar una decisión." in spanish
    assert re.search(r"\d\u00a0mm", spanish)
    english = desk.get("/farm/reed?language=en&units=us").text
    assert "What did you do?" in english
    assert re.search(r"\d\u00a0in\b", english)
    assert not re.search(r"\d\u00a0mm", english)
    assert desk.get("/farm/reed?language=klingon&units=cubits").status_code == 200
    assert desk.get("/farm/nobody").status_code == 404


def test_water_and_rain_are_logged_from_the_farm_page(desk: Browser) -> None:
    entry = {"field": "long-piece", "day": str(TODAY), "amount": "4,5", "token": "abcd"}
    answer = desk.post("/farm/reed/log", data=entry | {"language": "en", "units": "us"})
    assert answer.headers["location"] == "/farm/reed?done=logged&language=en&units=us"
    desk.post("/farm/reed/log", data=entry)  # sent twice
    rain = entry | {"unit": "rain", "amount": "0.5", "units": "us", "token": "efgh"}
    assert desk.post("/farm/reed/log", data=rain).status_code == 303
    with desk.db.read() as session:
        found = session.scalars(select(Event).where(Event.day == TODAY).order_by(Event.id)).all()
        assert [(event.kind, event.amount, event.unit) for event in found] == [
            ("irrigation", 4.5, "hours"),
            ("rain", 12.7, "rain_mm"),
        ]
    wrong = desk.post("/farm/reed/log", data=entry | {"amount": "x", "token": "ijkl"})
    assert wrong.status_code == 422
    assert "x no es un número" in wrong.text
    foreign = desk.post("/farm/reed/log", data=entry | {"field": "nobody"})
    assert foreign.status_code == 404


def test_how_letters_reach_somebody_is_changed_on_the_farm_page(desk: Browser) -> None:
    with desk.db.read() as session:
        ana = session.scalars(select(Recipient).where(Recipient.name == "Ana Reed")).one()
    data = {"language": "en", "units": "us", "weekday": "6", "hour": "19"}
    assert desk.post(f"/farm/reed/recipients/{ana.id}", data=data).status_code == 303
    with desk.db.read() as session:
        row = session.get_one(Recipient, ana.id)
        assert (row.language, row.units, row.weekday, row.hour, row.paused) == (
            "en",
            "us",
            6,
            19,
            False,
        )
    bad = data | {"language": "xx"}
    assert desk.post(f"/farm/reed/recipients/{ana.id}", data=bad).status_code == 422
    assert desk.post("/farm/reed/recipients/999", data=data).status_code == 404


def test_past_letters_are_read_on_the_farm_page(desk: Browser) -> None:
    number = numbers(desk)["Ben"]
    assert desk.get(f"/farm/reed/letters/{number}").status_code == 404  # not sent yet
    send_all(desk)
    page = desk.get("/farm/reed?language=en").text
    assert f"/farm/reed/letters/{number}" in page
    assert "Water" in desk.get(f"/farm/reed/letters/{number}").text


def test_the_calendar_is_read_by_whoever_has_its_address(desk: Browser) -> None:
    path = re.findall(r"https?://[^/\s\"]+(/calendar/[^\"<]+)", desk.get("/farm/reed").text)[0]
    answer = desk.get(path)
    assert answer.headers["content-type"] == "text/calendar; charset=utf-8"
    before = Calendar.from_ical(answer.text)
    assert before.walk("VEVENT")
    assert all(str(event["summary"]).startswith("Regar ") for event in before.walk("VEVENT"))
    send_all(desk)
    after = Calendar.from_ical(desk.get(path).text)
    same = {str(event["uid"]) for event in before.walk("VEVENT")}
    assert same & {str(event["uid"]) for event in after.walk("VEVENT")}
    assert desk.get(path.replace(".reed.", ".weed.")).status_code == 404


def test_a_grower_sees_no_other_farm_and_no_desk(
    filled_db: Database, open_browser: Callable[..., Browser]
) -> None:
    demo = open_browser(filled_db, demo=True)
    assert demo.get("/enter/grower?farm=hollin").headers["location"] == "/farm"
    assert demo.get("/farm").headers["location"] == "/farm/hollin"
    assert demo.get("/farm/hollin").status_code == 200
    for path in ("/letters", "/letters/1", "/letters/1/letter.eml", "/recipients"):
        assert demo.get(path).status_code == 403, path
    for path in ("/farm/tern", "/farm/tern/letters/1"):
        assert demo.get(path).status_code == 404, path
    assert "Tern Creek" not in demo.get("/farm/hollin").text
    log = {"field": "field-1", "day": "2026-07-13", "amount": "5", "token": "abcd"}
    assert demo.post("/farm/tern/log", data=log).status_code == 404
    assert demo.post("/farm/hollin/log", data=log).status_code == 404
    data = {"language": "en", "units": "us", "weekday": "6", "hour": "19"}
    assert demo.post("/farm/tern/recipients/2", data=data).status_code == 404
    assert demo.post("/farm/hollin/recipients/2", data=data).status_code == 404
    for path in ("/covers", "/letters/release", "/letters/1/send"):
        assert demo.post(path).status_code == 403, path
