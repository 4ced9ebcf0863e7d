"""`rillbook demo`: the demo basin in a throw-away database, loaded as a user would load it."""

import json
import shutil
import signal
import sys
import tempfile
from datetime import date
from pathlib import Path

import uvicorn
from rich.console import Console
from rich.progress import BarColumn, Progress, TextColumn

from app.book import read_book
from app.intake import Mapping, answer
from app.jobs.posting import one_round, posting
from app.main import create_app
from app.resources import resource
from app.settings import Mail, Settings
from app.storage.database import Database
from app.storage.letters import letters
from app.workflows import take_in
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.day_it_is import moment_it_is
from app.workflows.draft_letters import see_to_drafts
from app.workflows.load_book import load_book
from app.workflows.release_letters import hold, set_note

WHO = "demo"
NOTE = (
    "Long Piece comes first: start the pivot tonight and keep it going. I will look in on Friday."
)
TODAY = date(2026, 7, 14)
"""The morning the demo basin is shown on."""


def run_demo(port: int, serve: bool) -> None:
    """Fill the database, print the ways in, serve until stopped, and clean up."""
    # else the folder would outlive a closed terminal
    signal.signal(signal.SIGTERM, lambda number, _: sys.exit(128 + number))
    signal.signal(signal.SIGHUP, lambda *_: signal.raise_signal(signal.SIGTERM))
    folder = Path(tempfile.mkdtemp(prefix="rillbook-demo-"))
    try:
        db = Database(f"sqlite:///{folder / 'demo.sqlite'}")
        base = f"http://127.0.0.1:{port}"
        mail = Mail(folder=folder / "letters", base_url=base)
        settings = Settings(database=db.url, today=TODAY, demo=True, mail=mail)
        fill(db)
        letters_of_the_week(db, settings)
        if serve:
            print(f"Rillbook answers on {base} with the demo basin, as of {TODAY}. Ways in:")
            for role in ("advisor", "grower", "admin"):
                print(f"  as {role:8} {base}/enter/{role}")
            print("Stop with Ctrl-C; nothing is kept.", flush=True)
            with posting(db, settings):
                app = create_app(settings, db)
                uvicorn.run(app, host="127.0.0.1", port=port, log_level="warning")
        else:
            print(f"The demo basin fills, as of {TODAY}; nothing is kept.")
        db.close()
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def fill(db: Database, today: date = TODAY) -> None:
    """Migrate, load the book, take every station file in, compute the morning's advice."""
    basin = resource("demo_data")
    files = json.loads((basin / "intakes.json").read_text(encoding="utf-8"))
    console = Console(stderr=True)
    columns = (
        TextColumn("{task.description:34}"),
        BarColumn(),
        TextColumn("{task.percentage:3.0f} %"),
    )
    with Progress(*columns, console=console) as bar:
        task = bar.add_task("Book: farms, fields, seasons", total=len(files) + 2)
        db.migrate()
        with db.write() as session:
            load_book(session, read_book(basin / "book.json"), WHO)
        bar.advance(task)
        for entry in files:
            bar.update(task, description=f"Intake: {entry['file']}")
            take_file(db, basin, entry)
            bar.advance(task)
        bar.update(task, description="Ledgers and the morning's advice")
        bring_up_to_date(db, today)
        bar.advance(task)


def letters_of_the_week(db: Database, settings: Settings) -> None:
    """A note in one farm's letters, one letter held, and those sent that leave by themselves; the
    rest wait for the advisor."""
    see_to_drafts(db, settings.mail, moment_it_is(db, settings))
    with db.write() as session:
        for row in letters(session):
            if row.farm.key == "hollin" and row.recipient.language == "en":
                set_note(session, row.letter.id, NOTE, whole_farm=False)
            if row.farm.key == "orchard-road" and row.letter.due < moment_it_is(db, settings):
                hold(session, row.letter.id, "the grower is away until Friday")
    one_round(db, settings)


def take_file(db: Database, basin: Path, entry: dict[str, object]) -> None:
    """Take one station file in, with the answers the list gives to what the file leaves open."""
    name = str(entry["file"])
    with (basin / name).open("rb") as source:
        number = take_in.receive(db, str(entry["station"]), name, source, WHO)
    answers = entry.get("answers")
    if isinstance(answers, dict) and answers:
        seen = take_in.preview_of(db, number)
        assert isinstance(seen.mapping, Mapping)
        take_in.remap(db, number, answer(seen.mapping, answers), WHO)
    take_in.apply(db, number, WHO, None, ahead=True)
