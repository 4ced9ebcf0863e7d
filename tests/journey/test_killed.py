"""Processes killed at random points, several at once, on both databases: nothing lost, nothing
twice, and the ledger is what a clean rebuild gives.

`RILLBOOK_KILL_ROUNDS` asks for more rounds than the few of an ordinary run.
"""

import os
import random
import signal
import subprocess
import sys
import textwrap
import time
from datetime import date

from sqlalchemy import func, select, update

from app.storage.database import Database
from app.storage.tables import Advice, Contribution, Event, Intake, Station
from app.workflows.bring_up_to_date import bring_up_to_date
from tests.workflows import basin

ROUNDS = int(os.environ.get("RILLBOOK_KILL_ROUNDS", "3"))
AT_ONCE = 2
WORK = textwrap.dedent(
    """
    import io, random, sys
    from datetime import timedelta
    from app.storage.database import Database
    from app.workflows import take_in
    from app.workflows.log_event import log_irrigation
    from tests.workflows import basin

    db, lots, name = Database(sys.argv[1]), random.Random(int(sys.argv[2])), sys.argv[2]
    print("ready", flush=True)
    for turn in range(1000):
        day = basin.TODAY - timedelta(days=lots.randint(2, 40))
        if lots.random() < 0.5:
            log_irrigation(db, "long-piece", None, day, 1.0, "hours", "advisor",
                           f"kill-{name}-{turn}", basin.TODAY)
        else:
            data = basin.daily_csv(day, day + timedelta(days=1), warmer=lots.uniform(0, 3))
            number = take_in.receive(db, "bench", "late.csv", io.BytesIO(data), "admin")
            take_in.apply(db, number, "admin", basin.TODAY)
            if lots.random() < 0.3:
                take_in.undo(db, number, "admin", basin.TODAY)
        print(turn, flush=True)
    """
)


def rebuilt(db: Database) -> list[tuple[object, ...]]:
    """Everything derived, computed again from the first reading on."""
    with db.write() as session:
        session.execute(update(Station).values(dirty_from=date(2020, 1, 1)))
    bring_up_to_date(db, basin.TODAY)
    return basin.derived(db)


def check(db: Database) -> None:
    """What must hold however a process ended."""
    with db.read() as session:
        applied = set(session.scalars(select(Intake.id).where(Intake.state == "applied")))
        undone = set(session.scalars(select(Intake.id).where(Intake.state == "undone")))
        kept = set(session.scalars(select(Contribution.intake_id)))
        assert kept == applied | undone, "a file half applied"
        orders = list(session.scalars(select(Intake.applied_order).where(Intake.id.in_(applied))))
        assert len(set(orders)) == len(orders)
        origins = list(session.scalars(select(Event.origin)))
        assert len(set(origins)) == len(origins), "an event twice"
        assert list(session.scalars(select(Station.dirty_from))) == [None, None]
        standing = session.execute(
            select(Advice.block_id, func.count())
            .where(Advice.stands.is_(True), Advice.issued_on == basin.TODAY)
            .group_by(Advice.block_id)
        ).all()
        assert {count for _, count in standing} == {1}, "two advices stand"
    before = basin.derived(db)
    assert before == rebuilt(db), "the ledger is not what a rebuild gives"


def test_killed_at_any_point_nothing_is_lost_or_doubled(db: Database) -> None:
    basin.fill(db)
    url = db.engine.url.render_as_string(hide_password=False)
    lots = random.Random(11)
    logged = 0
    for turn in range(ROUNDS):
        workers = [
            subprocess.Popen(
                [sys.executable, "-c", WORK, url, str(turn * AT_ONCE + n)],
                stdout=subprocess.PIPE,
                text=True,
            )
            for n in range(AT_ONCE)
        ]
        for worker in workers:
            assert worker.stdout is not None
            assert worker.stdout.readline() == "ready\n"
        time.sleep(lots.uniform(0.05, 0.8))
        for worker in workers:
            worker.send_signal(signal.SIGKILL)
        said = [worker.communicate()[0].split() for worker in workers]
        logged += sum(map(len, said))
        check(db)
    assert logged > 0
