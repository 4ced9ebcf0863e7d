"""A file goes in whole or not at all, twice changes nothing, and undo is exact."""

import io
import subprocess
import sys
import textwrap
import threading
from datetime import UTC, date, datetime, timedelta

import pytest
from sqlalchemy import func, select

from app.intake import Mapping
from app.storage import pages_station
from app.storage.database import Database
from app.storage.tables import Contribution, Intake, StationDay
from app.workflows import take_in
from app.workflows.push_readings import PushedRow, push_readings
from tests.workflows import basin


def counted(db: Database) -> tuple[int, int]:
    with db.read() as session:
        return (
            session.scalar(select(func.count()).select_from(Contribution)) or 0,
            session.scalar(select(func.count()).select_from(StationDay)) or 0,
        )


def test_a_preview_changes_nothing_and_says_what_would(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    data = basin.daily_csv(basin.TODAY - timedelta(days=10), warmer=1.5)
    number = take_in.receive(db, "bench", "late.csv", io.BytesIO(data), "admin", today=basin.TODAY)
    seen = take_in.preview_of(db, number)
    assert seen.rows_accepted == 10
    assert seen.rows_differing == 10
    assert seen.days_changed == [basin.TODAY - timedelta(days=n) for n in range(10, 0, -1)]
    assert seen.fields_touched == 2
    assert basin.derived(db) == before


def test_the_same_file_again_changes_nothing(db: Database) -> None:
    basin.fill(db)
    before, rows = basin.derived(db), counted(db)
    _, again = basin.take(db, "bench", basin.daily_csv())
    assert again.already_here
    assert basin.derived(db) == before
    assert counted(db) == rows


def test_a_later_file_wins_and_undo_restores_exactly(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    first = date(2026, 6, 1)
    number, applied = basin.take(db, "bench", basin.daily_csv(first, warmer=3))
    assert applied.days_changed == 30
    after = basin.derived(db)
    assert after != before
    take_in.undo(db, number, "admin", basin.TODAY)
    assert basin.derived(db) == before
    # and in again, from the same bytes
    _, applied = basin.take(db, "bench", basin.daily_csv(first, warmer=3))
    assert basin.derived(db) == after


def test_undo_out_of_order_leaves_what_later_files_said(db: Database) -> None:
    basin.fill(db)
    first, _ = basin.take(db, "bench", basin.daily_csv(date(2026, 6, 1), warmer=3))
    basin.take(db, "bench", basin.daily_csv(date(2026, 6, 15), warmer=5))
    take_in.undo(db, first, "admin", basin.TODAY)
    with db.read() as session:
        bench = select(StationDay.day, StationDay.tmax).where(StationDay.station_id == 1)
        tmax = {day: value for day, value in session.execute(bench)}
    plain = {
        line.split(",")[0]: float(line.split(",")[1])
        for line in basin.daily_csv().decode().splitlines()[1:]
    }
    assert tmax[date(2026, 6, 10)] == plain["2026-06-10"]
    assert tmax[date(2026, 6, 20)] == pytest.approx(plain["2026-06-20"] + 5)


def test_a_remembered_mapping_is_used_again(db: Database) -> None:
    basin.fill(db)
    number = take_in.receive(
        db, "bench", "a.csv", io.BytesIO(basin.daily_csv()), "admin", today=basin.TODAY
    )
    assert take_in.preview_of(db, number).remembered


def test_a_corrected_mapping_is_previewed_anew(db: Database) -> None:
    basin.fill(db)
    number = take_in.receive(
        db, "bench", "a.csv", io.BytesIO(basin.daily_csv()), "admin", today=basin.TODAY
    )
    mapping = take_in.preview_of(db, number).mapping
    assert mapping is not None
    columns = [
        column.model_copy(update={"factor": 2.0}) if column.quantity == "rain" else column
        for column in mapping.columns
    ]
    changed = Mapping.model_validate(mapping.model_copy(update={"columns": columns}).model_dump())
    take_in.remap(db, number, changed, "admin")
    seen = take_in.preview_of(db, number)
    assert seen.rows_differing == 11  # only the days with rain differ
    assert take_in.apply(db, number, "admin", basin.TODAY).days_changed == 11


@pytest.mark.parametrize(
    "data",
    [b"", b"\x89PNG\r\n\x1a\n" + bytes(200), b"PK\x03\x04" + bytes(100), b"x" * 300_000],
    ids=["empty", "image", "zip", "one endless line"],
)
def test_what_is_no_table_is_kept_with_its_message_and_cannot_be_applied(
    db: Database, data: bytes
) -> None:
    basin.fill(db)
    before = basin.derived(db)
    number = take_in.receive(db, "bench", "x.csv", io.BytesIO(data), "admin", today=basin.TODAY)
    assert take_in.preview_of(db, number).message
    with pytest.raises(take_in.TakeInError):
        take_in.apply(db, number, "admin", basin.TODAY)
    assert basin.derived(db) == before


def test_an_unknown_station_names_those_there_are(db: Database) -> None:
    basin.fill(db)
    with pytest.raises(take_in.TakeInError, match="bench, meadow"):
        take_in.receive(db, "bemch", "x.csv", io.BytesIO(b"a"), "admin", today=basin.TODAY)


def test_applied_twice_at_once_lands_once(db: Database) -> None:
    basin.fill(db)
    data = basin.daily_csv(date(2026, 6, 1), warmer=3)
    number = take_in.receive(db, "bench", "x.csv", io.BytesIO(data), "admin", today=basin.TODAY)
    outcomes: list[str] = []

    def work() -> None:
        try:
            take_in.apply(db, number, "admin", basin.TODAY)
            outcomes.append("applied")
        except take_in.TakeInError:
            outcomes.append("refused")

    threads = [threading.Thread(target=work) for _ in range(2)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sorted(outcomes) == ["applied", "refused"]
    with db.read() as session:
        applied = session.scalar(
            select(func.count()).select_from(Intake).where(Intake.state == "applied")
        )
    assert applied == 3


def test_a_killed_process_leaves_the_database_as_it_was(db: Database, database_url: str) -> None:
    basin.fill(db)
    before, rows = basin.derived(db), counted(db)
    data = basin.daily_csv(date(2026, 6, 1), warmer=3)
    number = take_in.receive(db, "bench", "x.csv", io.BytesIO(data), "admin", today=basin.TODAY)
    script = f"""
        import os, signal
        from datetime import date
        from app.storage.database import Database
        from app.workflows import recompute, take_in

        real = recompute.replace_ledger_days

        def half_way(*args):
            real(*args)
            os.kill(os.getpid(), signal.SIGKILL)

        recompute.replace_ledger_days = half_way
        today = date.fromisoformat("{basin.TODAY}")
        take_in.apply(Database({database_url!r}), {number}, "admin", today)
    """
    died = subprocess.run([sys.executable, "-c", textwrap.dedent(script)], capture_output=True)
    assert died.returncode == -9, died.stderr.decode()
    assert basin.derived(db) == before
    assert counted(db) == rows
    assert take_in.preview_of(db, number).state == "previewed"
    assert take_in.apply(db, number, "admin", basin.TODAY).days_changed == 30


def test_what_a_person_said_of_the_step_is_kept(db: Database) -> None:
    """A corrected mapping is read as it stands, not guessed again."""
    basin.fill(db)
    number = take_in.receive(
        db, "bench", "a.csv", io.BytesIO(basin.daily_csv()), "admin", today=basin.TODAY
    )
    mapping = take_in.preview_of(db, number).mapping
    assert mapping is not None
    assert mapping.interval_s == 86400
    before = take_in.preview_of(db, number)
    take_in.remap(db, number, mapping.model_copy(update={"interval_s": 43200}), "admin")
    seen = take_in.preview_of(db, number)
    assert seen.mapping is not None
    assert seen.mapping.interval_s == 43200
    assert seen.columns == before.columns


def test_a_given_mapping_of_another_header_is_not_passed_over(db: Database) -> None:
    basin.fill(db)
    number = take_in.receive(
        db, "bench", "a.csv", io.BytesIO(basin.daily_csv()), "admin", today=basin.TODAY
    )
    mapping = take_in.preview_of(db, number).mapping
    other = b"when,temperature (degC)\n2026-06-01,12\n2026-06-02,13\n2026-06-03,14\n"
    number = take_in.receive(db, "bench", "b.csv", io.BytesIO(other), "admin", mapping)
    assert "another header" in take_in.preview_of(db, number).message


def test_rows_dated_after_now_are_taken_only_if_said_so(db: Database) -> None:
    basin.fill(db)
    wrong_year = basin.daily_csv(date(2026, 6, 1)).replace(b"\n2026-", b"\n2126-")
    number = take_in.receive(db, "bench", "a.csv", io.BytesIO(wrong_year), "admin")
    seen = take_in.preview_of(db, number)
    (warning,) = [item for item in seen.problems if "after now" in item.why]
    assert (warning.line, warning.last_line, warning.count) == (2, 31, 30)
    assert warning.value.startswith("2126-06-0")
    assert seen.problems_total == len(seen.problems)
    assert seen.rows_ahead == 30
    with pytest.raises(take_in.TakeInError, match="30 of its rows are dated after now"):
        take_in.apply(db, number, "admin", basin.TODAY)
    assert take_in.preview_of(db, number).state == "previewed"
    assert take_in.apply(db, number, "admin", basin.TODAY, ahead=True).days_changed == 30


def test_rows_of_the_stations_own_day_are_not_ahead(db: Database) -> None:
    """Where the day it is was stated, it holds, even if this machine's clock lags behind it."""
    basin.fill(db)
    day = date(2126, 6, 30)
    data = b"date,tmax (degC),tmin (degC)\n2126-06-29,30,11\n2126-06-30,31,12\n"
    number = take_in.receive(db, "bench", "a.csv", io.BytesIO(data), "admin", today=day)
    assert take_in.preview_of(db, number).rows_ahead == 0


def test_a_file_without_a_known_column_says_so(db: Database) -> None:
    basin.fill(db)
    data = b"2026-06-01,30,11\n2026-06-02,31,12\n2026-06-03,32,13\n"
    number = take_in.receive(db, "bench", "bare.csv", io.BytesIO(data), "admin", today=basin.TODAY)
    seen = take_in.preview_of(db, number)
    assert "No column is taken for a weather quantity" in seen.message
    with pytest.raises(take_in.TakeInError, match="No column"):
        take_in.apply(db, number, "admin", basin.TODAY)
    assert seen.mapping is not None
    columns = [
        column.model_copy(update={"quantity": "air_temperature_max", "unit": "degC"})
        if column.position == 1
        else column
        for column in seen.mapping.columns
    ]
    take_in.remap(db, number, seen.mapping.model_copy(update={"columns": columns}), "admin")
    assert take_in.preview_of(db, number).rows_accepted == 3


def test_pushes_of_a_day_are_one_line_and_the_list_goes_on(db: Database) -> None:
    basin.fill(db)
    start = datetime(2026, 6, 29, 8, tzinfo=UTC)
    for hour in range(5):
        row = PushedRow(start + timedelta(hours=hour), {"wind_speed": 1.0 + hour})
        push_readings(db, "bench", [row], {"wind_speed": "m/s"}, 3600, "logger", basin.TODAY)
    with db.read() as session:
        pushes, *files = pages_station.received(session, 50)
        assert (pushes.files, pushes.rows, pushes.first_day) == (5, 5, date(2026, 6, 29))
        assert [line.files for line in files] == [1, 1]
        assert pages_station.received(session, 50, before=pushes.id) == files
        assert pages_station.received(session, 50, station="meadow") == [files[0]]
