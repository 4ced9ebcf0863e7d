"""Letters through a real SMTP server: what it says decides, and never two."""

import threading
import time
from collections.abc import Callable
from dataclasses import replace
from datetime import timedelta
from email import policy
from email.parser import BytesParser
from pathlib import Path

import pytest
from icalendar import Calendar

from app.jobs.posting import posting
from app.settings import Mail, Settings
from app.storage.database import Database
from app.storage.tables_letters import Recipient
from app.workflows import post_letters, release_letters
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.log_event import log_rain
from app.workflows.once import EntryError
from tests.letters.server import Post, free_port, serving
from tests.workflows import letter_basin as world
from tests.workflows.letter_basin import EVENING, HOUR, TODAY, rows, run, states


@pytest.fixture(scope="module")
def filled(tmp_path_factory: pytest.TempPathFactory) -> str:
    """A SQLite file of the small basin with two recipients."""
    url = f"sqlite:///{tmp_path_factory.mktemp('filled') / 'basin.sqlite'}"
    db = Database(url)
    db.migrate()
    world.fill(db)
    db.close()
    return url


@pytest.fixture
def basin(db: Database, filled: str) -> Database:
    """The small basin with two recipients, on each database."""
    world.copy_rows(filled, db.url)
    return db


def test_letters_go_once_however_often_they_are_posted(basin: Database) -> None:
    post = Post()
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        assert run(basin, with_).sent == 0  # nothing leaves without a release
        assert states(basin) == {"Ana": "draft", "Ben": "draft"}
        assert len(world.release_all(basin, with_)) == 2
        assert run(basin, with_).sent == 2
        assert run(basin, with_).sent == 0
        assert run(basin, with_, EVENING + 48 * HOUR).sent == 0
    assert len(post.ids) == len(set(post.ids)) == 2
    sent = [row.letter for row in rows(basin) if row.letter.state == "sent"]
    assert [letter.data for letter in sent] == [
        envelope.content for envelope in sorted(post.taken, key=lambda one: one.rcpt_tos)
    ]
    assert {letter.words[:3] for letter in sent} == {"250"}


def test_not_before_it_is_due_and_at_once_when_told(basin: Database) -> None:
    early = EVENING - 5 * HOUR
    post = Post()
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        numbers = world.release_all(basin, with_, early)
        assert run(basin, with_, early).sent == 0
        with basin.write() as session:
            release_letters.take_back(session, numbers[0])
            release_letters.release(
                session, numbers[:1], "advisor", with_, early, TODAY, at_once=True
            )
        assert run(basin, with_, early).sent == 1
        assert run(basin, with_, EVENING).sent == 1


def test_two_workers_at_once_send_each_letter_once(basin: Database) -> None:
    post = Post(wait_s=0.1)
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        world.release_all(basin, with_)
        workers = [threading.Thread(target=run, args=(basin, with_)) for _ in range(4)]
        for worker in workers:
            worker.start()
        for worker in workers:
            worker.join()
    assert sorted(states(basin).values()) == ["sent", "sent"]
    assert len(post.ids) == len(set(post.ids)) == 2


def test_put_off_with_growing_pauses_then_sent(basin: Database) -> None:
    post = Post(at_rcpt="450 Mailbox busy")
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        world.release_all(basin, with_)
        now, pauses = EVENING, []
        for _ in range(9):
            assert run(basin, with_, now).put_off == 2
            letter = rows(basin)[0].letter
            assert letter.next_try is not None
            assert letter.words == "450 Mailbox busy"
            assert run(basin, with_, now).put_off == 0  # not before the pause is over
            pauses.append((letter.next_try - now) / timedelta(minutes=1))
            now = letter.next_try
        assert pauses == [5, 10, 20, 40, 80, 160, 240, 240, 240]
        post.at_rcpt = "250 OK"
        assert run(basin, with_, now).sent == 2
    assert len(post.ids) == 2


def test_given_up_after_three_days_with_the_servers_words(basin: Database) -> None:
    post = Post(at_data="451 Try later")
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        world.release_all(basin, with_)
        assert run(basin, with_, EVENING + 73 * HOUR).refused == 2
    assert {row.letter.words for row in rows(basin)} == {"451 Try later"}


def test_refused_is_shown_and_sent_again_by_hand(basin: Database) -> None:
    post = Post(at_rcpt="550 No such mailbox")
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        numbers = world.release_all(basin, with_)
        assert run(basin, with_).refused == 2
        assert {row.letter.words for row in rows(basin)} == {"550 No such mailbox"}
        assert run(basin, with_, EVENING + 24 * HOUR).sent == 0
        post.at_rcpt = "250 OK"
        with basin.write() as session:
            release_letters.send_again(session, numbers[0], "advisor", with_, EVENING, TODAY)
        assert run(basin, with_).sent == 1
        with basin.write() as session, pytest.raises(EntryError, match="is sent"):
            release_letters.send_again(session, numbers[0], "advisor", with_, EVENING, TODAY)
    assert len(post.ids) == 1


@pytest.mark.parametrize("kept", ["drop", "keep-drop"])
def test_a_broken_answer_leaves_doubt_that_a_person_settles(basin: Database, kept: str) -> None:
    post = Post(at_data=kept)
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        numbers = world.release_all(basin, with_)
        assert run(basin, with_).unsure == 2
        assert run(basin, with_, EVENING + 24 * HOUR).sent == 0
        assert set(states(basin).values()) == {"unsure"}
        first = rows(basin)[0].letter.data
        post.at_data = "250 OK"
        with basin.write() as session:
            release_letters.it_arrived(session, numbers[1])
            release_letters.send_again(session, numbers[0], "advisor", with_, EVENING, TODAY)
        assert run(basin, with_).sent == 1
        assert rows(basin)[0].letter.data == first
    assert len(set(post.ids)) == (1 if kept == "drop" else 2)


def test_nobody_there_stops_the_round_after_one_try(basin: Database) -> None:
    with_ = world.settings(basin, Mail(host="127.0.0.1", port=free_port(), tls="none"))
    world.release_all(basin, with_)
    assert run(basin, with_).put_off == 1
    assert sorted(states(basin).values()) == ["released", "released"]


def test_without_a_server_files_are_written_once(basin: Database, tmp_path: Path) -> None:
    with_ = world.settings(basin, Mail(folder=tmp_path / "out"))
    world.release_all(basin, with_)
    assert run(basin, with_).sent == 2
    files = sorted((tmp_path / "out").iterdir())
    assert len(files) == 2
    for file, row in zip(
        files, sorted(rows(basin), key=lambda r: r.letter.message_id), strict=True
    ):
        letter = BytesParser(policy=policy.SMTP).parsebytes(file.read_bytes())
        assert letter["Message-ID"] == f"<{row.letter.message_id}>"


def test_automatic_farms_release_themselves_and_say_what_is_unsure_first(db: Database) -> None:
    world.fill(db, letters="automatic")
    post = Post()
    stale = TODAY + timedelta(days=7)  # the stations are silent for a week, and no new advice
    with serving(post) as mail:
        with_ = world.settings(db, mail)
        assert run(db, with_, EVENING + 7 * 24 * HOUR, stale).sent == 2
    for envelope in post.taken:
        letter = BytesParser(policy=policy.SMTP).parsebytes(envelope.content)
        body = letter.get_body(("plain",))
        assert body is not None
        lines = [line for line in body.get_content().splitlines() if line]
        spanish = letter["Content-Language"] == "es"
        first = "Antes que nada: Estas cifras son del" if spanish else "First: These figures are of"
        assert lines[2].startswith(first)


def test_a_farm_without_advice_gets_no_letter_but_a_held_one(db: Database) -> None:
    with db.write() as session:
        from app.workflows.load_book import load_book

        load_book(session, world.book(letters="automatic"), "admin")
    post = Post()
    with serving(post) as mail:
        assert run(db, world.settings(db, mail)).sent == 0
    assert {(row.letter.state, row.letter.why) for row in rows(db)} == {("held", "no_advice")}
    assert post.taken == []


def test_whoever_stopped_or_paused_gets_none(basin: Database) -> None:
    post = Post()
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        world.release_all(basin, with_)
        with basin.write() as session:
            ana, ben = session.query(Recipient).order_by(Recipient.name)
            ana.stopped_at, ben.paused = EVENING, True
        assert run(basin, with_).sent == 0
        assert run(basin, with_, EVENING + 7 * 24 * HOUR).drafted == 0
    assert post.taken == []


def test_a_worker_thought_gone_cannot_send_what_another_has(
    basin: Database, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The first worker dawdles before the dot until its claim has run out and a second one has
    sent the letter; then it must not."""
    post = Post()
    with serving(post) as mail:
        with_ = world.settings(basin, mail)
        world.release_all(basin, with_)
        honest = post_letters.deliver.send_bytes
        dawdled: list[bytes] = []

        def dawdling(data: bytes, to: list[str], how: Settings, about: Callable[[], None]) -> str:
            def slow() -> None:
                if not dawdled:
                    dawdled.append(data)
                    assert run(basin, with_, EVENING + HOUR).sent == 2
                about()

            return honest(data, to, how, slow)

        monkeypatch.setattr(post_letters.deliver, "send_bytes", dawdling)
        assert run(basin, with_).sent == 0
    assert dawdled
    assert len(post.ids) == len(set(post.ids)) == 2
    assert set(states(basin).values()) == {"sent"}


def test_one_numbered_correction_when_the_advice_moves(db: Database) -> None:
    """A heavy rain of the farm's own gauge the day after the letter puts the week's water off."""
    world.fill(db, letters="automatic", recipients=[world.BEN])
    post = Post()
    tomorrow, later = TODAY + timedelta(days=1), EVENING + 24 * HOUR
    with serving(post) as mail:
        with_ = world.settings(db, mail)
        assert run(db, with_).sent == 1
        assert run(db, with_, EVENING + HOUR).corrections == 0
        for field in ("long-piece", "two-halves"):
            log_rain(db, field, TODAY, 60.0, "advisor", f"rain-{field}", TODAY)
        bring_up_to_date(db, tomorrow)
        done = run(db, with_, later, tomorrow)
        assert (done.corrections, done.sent) == (1, 1)
        bring_up_to_date(db, tomorrow + timedelta(days=1))
        for day in (1, 2, 3):
            again = run(db, with_, later + day * 24 * HOUR, tomorrow + timedelta(days=day))
            assert again.corrections == 0  # at most one a week
    first, second = (BytesParser(policy=policy.SMTP).parsebytes(e.content) for e in post.taken[:2])
    assert second["Subject"].startswith("Correction 1, week of 2 July")
    assert first["Message-ID"] != second["Message-ID"]
    body = second.get_body(("plain",))
    assert body is not None
    assert "This is correction 1" in body.get_content()
    days = [
        {
            str(event["uid"]): event
            for event in Calendar.from_ical(part.get_content()).walk("VEVENT")
        }
        for letter in (first, second)
        for part in letter.walk()
        if part.get_content_type() == "text/calendar"
    ]
    same = set(days[0]) & set(days[1])
    assert same
    assert {days[1][uid]["sequence"] for uid in same} == {1}


def test_letters_leave_by_themselves_while_the_server_runs(basin: Database) -> None:
    post = Post()
    with serving(post) as mail:
        with_ = replace(world.settings(basin, mail), today=TODAY + timedelta(days=1))
        world.release_all(basin, with_)
        with posting(basin, with_, every_s=0.05):
            for _ in range(200):
                if len(post.ids) == 2:
                    break
                time.sleep(0.05)
    assert len(post.ids) == len(set(post.ids)) == 2
