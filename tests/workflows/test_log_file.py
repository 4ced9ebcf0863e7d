"""A file of events: whole or not at all, twice as once, and it moves what a rebuild gives."""

from datetime import date

from sqlalchemy import func, select

from app.storage.database import Database
from app.storage.tables import Block, Event
from app.workflows.log_event import correct_event, log_irrigation
from app.workflows.log_file import FileLogged, log_file
from tests.workflows import basin
from tests.workflows.test_seen import ledger, rebuilt, taken

WATER = b"""field,day,what,amount,unit,block,last,height m,note
long-piece,2026-06-20,irrigation,5,hours,,,,
Long Piece,2026-06-22,rain,9,mm,,,,
two-halves,2026-06-21,irrigation,4000,m3,,,,
Two Halves,2026-06-23,irrigation,20,gross mm,Upper,,,
long-piece,2026-06-24,cover,70,%,,,0.9,
long-piece,2026-07-02,keep off,,,,2026-07-04,,sprayed
long-piece,2026-06-24,note,,,,,,aphids
"""
READINGS = b"""field,day,hour,method,depth cm,value,trust
long-piece,2026-06-20,6,volumetric,15,0.20,full
long-piece,2026-06-20,6,volumetric,45,0.20,full
long-piece,2026-06-20,6,volumetric,75,0.20,full
"""


def put(db: Database, data: bytes, **more: object) -> FileLogged:
    return log_file(db, data, "advisor", basin.TODAY, **more)  # type: ignore[arg-type]


def count(db: Database) -> int:
    with db.read() as session:
        return session.scalar(select(func.count(Event.id))) or 0


def test_a_file_lands_whole_moves_the_ledgers_and_twice_is_once(db: Database) -> None:
    basin.fill(db)
    before, events = basin.derived(db), count(db)
    look = put(db, WATER, keep=False)
    assert (look.new, look.already, look.fields) == (7, 0, 2)
    assert (count(db), basin.derived(db)) == (events, before)
    told = put(db, WATER)
    assert told == look
    assert count(db) == events + 8  # the volume stands on both blocks
    state = basin.derived(db)
    assert state != before
    assert ledger(db)[date(2026, 6, 20)].irrigation_gross_mm == 5 * 6
    assert ledger(db)[date(2026, 6, 22)].rain_mm == 9
    assert ledger(db, "upper")[date(2026, 6, 21)].irrigation_gross_mm == 20  # 4000 m3 on 20 ha
    again = put(db, WATER)
    assert (again.new, again.already) == (0, 7)
    longer = WATER + b"long-piece,2026-06-28,irrigation,3,hours,,,,\n"
    assert (put(db, longer).new, count(db)) == (1, events + 9)
    state = basin.derived(db)
    assert rebuilt(db) == state


def test_one_wrong_line_and_nothing_is_logged(db: Database) -> None:
    basin.fill(db)
    before, events = basin.derived(db), count(db)
    text = (
        WATER + b"nowhere,2026-06-20,irrigation,5,hours,,,,\n"
        b"long-piece,2031-06-20,irrigation,5,hours,,,,\n"
        b"long-piece,2026-01-05,cutting,,,,,,\n"
        b"two-halves,2026-06-20,irrigation,5,hours,attic,,,\n"
        b"long-piece,2026-06-20,irrigation,5000,hours,,,,\n"
    )
    told = put(db, text)
    assert [(one.line, one.column, one.value) for one in told.problems] == [
        (9, "field", "nowhere"), (10, "day", "2031-06-20"), (11, "day", "2026-01-05"),
        (12, "block", "attic"), (13, "amount", "5000 hours"),
    ]  # fmt: skip
    assert all(one.remedy for one in told.problems)
    assert not told.in_doubt
    assert (count(db), basin.derived(db)) == (events, before)


def test_anothers_field_is_no_field(db: Database) -> None:
    basin.fill(db)
    told = put(db, WATER, farms=frozenset({"elsewhere"}))
    assert {one.why for one in told.problems} == {"there is no such field"}
    assert len(told.problems) == 7


def test_readings_correct_the_ledger_as_logged_by_hand(db: Database) -> None:
    basin.fill(db)
    assert put(db, READINGS).new == 1
    (one,) = taken(db)
    assert one.why == "full"
    state = basin.derived(db)
    assert rebuilt(db) == state
    assert put(db, READINGS).already == 1
    bad = READINGS.replace(b"45,0.20", b"15,0.20")
    (problem,) = put(db, bad).problems
    assert "each depth stands once" in problem.why


def test_water_logged_by_hand_is_not_logged_again_unasked(db: Database) -> None:
    basin.fill(db)
    log_irrigation(
        db, "long-piece", None, date(2026, 6, 20), 5, "hours", "grower", "phone", basin.TODAY
    )
    told = put(db, WATER)
    assert told.in_doubt
    assert [one.line for one in told.problems] == [2]
    assert put(db, WATER, beside=True).new == 7
    assert ledger(db)[date(2026, 6, 20)].irrigation_gross_mm == 2 * 5 * 6


def test_what_was_corrected_since_stays_when_the_file_comes_again(db: Database) -> None:
    basin.fill(db)
    put(db, WATER)
    with db.read() as session:
        number = session.scalar(
            select(Event.id)
            .join(Block, Block.id == Event.block_id)
            .where(
                Event.day == date(2026, 6, 20), Event.kind == "irrigation", Event.unit == "hours"
            )
        )
    assert number is not None
    correct_event(
        db, number, date(2026, 6, 20), 4, "hours", "advisor", "c", basin.TODAY,
        purpose="frost", confirmation="metered",
    )  # fmt: skip
    assert put(db, WATER).already == 7
    row = ledger(db)[date(2026, 6, 20)]
    assert (row.irrigation_gross_mm, row.irrigation_net_mm) == (24, 0)


def test_a_part_of_the_area_waters_that_part(db: Database) -> None:
    """Depth over the block is that of the part times its share; a volume is all of the water."""
    basin.fill(db)
    head = b"field,day,what,amount,unit,area share %\n"
    put(db, head + b"long-piece,2026-06-20,irrigation,5,hours,50\n")
    assert ledger(db)[date(2026, 6, 20)].irrigation_gross_mm == 15
    put(db, head + b"long-piece,2026-06-24,irrigation,3000,m3,50\n")
    assert ledger(db)[date(2026, 6, 24)].irrigation_gross_mm == 30
    state = basin.derived(db)
    assert rebuilt(db) == state
