"""Files of the demo basin in pieces and in any order: what is derived is what a rebuild gives."""

import io
import json
import random
from datetime import date
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import select, update

from app.book import read_book
from app.demo import TODAY
from app.intake import answer
from app.resources import resource
from app.storage.database import Database
from app.storage.tables import LedgerDay, Station, StationDay
from app.workflows import take_in
from app.workflows.bring_up_to_date import bring_up_to_date
from app.workflows.load_book import load_book

WHO = "admin"


def pieces(path: Path, lots: random.Random) -> list[bytes]:
    """A file's rows cut in three anywhere, each piece under the file's own head."""
    raw = path.read_bytes()
    encoding = "utf-16" if raw[:2] in (b"\xff\xfe", b"\xfe\xff") else "latin-1"
    lines = raw.decode(encoding).splitlines(keepends=True)
    head = next(n for n, line in enumerate(lines) if line.lstrip('"')[:1].isdigit())
    first, second = sorted(lots.sample(range(head + 1, len(lines)), 2))
    parts = (lines[head:first], lines[first:second], lines[second:])
    return ["".join([*lines[:head], *part]).encode(encoding) for part in parts]


def take(db: Database, station: str, data: bytes) -> int:
    """Take a piece in; a day and month left open by so few rows are day first, as in the whole."""
    number = take_in.receive(db, station, "piece.csv", io.BytesIO(data), WHO)
    seen = take_in.preview_of(db, number)
    open_questions = {q["field"]: "dmy" for q in seen.questions if q["field"].endswith("order")}
    if open_questions:
        assert seen.mapping is not None
        take_in.remap(db, number, answer(seen.mapping, open_questions), WHO)
    take_in.apply(db, number, WHO, None)
    return number


def derived(db: Database) -> list[tuple[Any, ...]]:
    """Every derived row, exactly."""
    bring_up_to_date(db, TODAY)
    with db.read() as session:
        days = session.execute(
            select(*StationDay.__table__.columns).order_by(StationDay.station_id, StationDay.day)
        ).all()
        ledger = session.execute(
            select(*LedgerDay.__table__.columns).order_by(LedgerDay.block_id, LedgerDay.day)
        ).all()
    return [tuple(row) for row in (*days, *ledger)]


def rebuilt(db: Database) -> list[tuple[Any, ...]]:
    """Every derived row, computed again from the first reading on."""
    with db.write() as session:
        session.execute(update(Station).values(dirty_from=date(2020, 1, 1)))
    return derived(db)


@pytest.mark.parametrize("seed", [1, 2])
def test_pieces_in_any_order_give_what_a_rebuild_gives(tmp_path: Path, seed: int) -> None:
    """Also after a gap that is filled later, and after an undo."""
    lots = random.Random(seed)
    basin = resource("demo_data")
    db = Database(f"sqlite:///{tmp_path / 'basin.sqlite'}")
    db.migrate()
    with db.write() as session:
        load_book(session, read_book(basin / "book.json"), WHO)
    files = json.loads((basin / "intakes.json").read_text(encoding="utf-8"))
    todo = [
        (entry["station"], piece)
        for entry in files
        if "2026" in entry["file"]
        for piece in pieces(basin / entry["file"], lots)
    ]
    lots.shuffle(todo)
    for count, (station, data) in enumerate(todo[:-1]):
        take(db, station, data)
        if count % 3 == 0:
            bring_up_to_date(db, TODAY)
    before = derived(db)
    assert before == rebuilt(db)
    last = take(db, *todo[-1])
    after = derived(db)
    assert after != before
    assert after == rebuilt(db)
    take_in.undo(db, last, WHO, None)
    assert derived(db) == before
    db.close()
