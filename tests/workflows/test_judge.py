"""What people say of sensors counts at once, is never an edit, and can be taken back exactly."""

import io
from datetime import date, time

import pytest
from sqlalchemy import select

from app.storage import judgement
from app.storage.database import Database
from app.storage.tables import LedgerDay, SensorEntry, SpanMark, StationDay
from app.workflows import take_in
from app.workflows.judge import (
    log_sensor,
    mark_span,
    take_back_entry,
    take_back_mark,
)
from app.workflows.once import EntryError
from tests.workflows import basin

DAY = date(2026, 6, 15)


def station_day(db: Database, day: date = DAY) -> StationDay:
    with db.read() as session:
        row = session.scalars(
            select(StationDay).where(StationDay.day == day, StationDay.station_id == 1)
        ).one()
        session.expunge_all()
    return row


def mark(db: Database, verdict: str = "bad", token: str = "form-1", **more: object) -> int:
    words: dict[str, object] = {"first": DAY, "last": DAY, "why": "bird on the dome", **more}
    return mark_span(
        db, "bench", "shortwave_down", words.pop("first"), words.pop("last"), verdict,
        words.pop("why"), "advisor", token, basin.TODAY, **words,
    )  # type: ignore[arg-type]  # fmt: skip


def test_a_span_marked_bad_is_set_aside_and_taken_back_exactly(db: Database) -> None:
    basin.fill(db)
    before, measured = basin.derived(db), station_day(db)
    assert measured.rung == 5
    number = mark(db)
    row = station_day(db)
    assert row.shortwave_down is None
    assert row.rung == 6  # its neighbour measured
    assert "shortwave_down:set_aside:1:marked_bad" in row.notes
    assert station_day(db, date(2026, 6, 14)).rung == 5
    with db.read() as session:
        ledger = session.scalars(select(LedgerDay.rung).where(LedgerDay.day == DAY)).all()
    assert ledger == [6, 6, 6]
    assert mark(db) == number  # the same form again
    take_back_mark(db, number, "advisor", "form-2", basin.TODAY)
    take_back_mark(db, number, "advisor", "form-2", basin.TODAY)
    assert basin.derived(db) == before
    with db.read() as session:
        assert judgement.marks(session, 1) == []
        assert len(session.scalars(select(SpanMark)).all()) == 2


def test_good_over_bad_and_the_other_way_the_last_word_counts(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    mark(db, "bad", "form-1")
    mark(db, "good", "form-2")
    assert basin.derived(db) == before
    mark(db, "bad", "form-3")
    assert station_day(db).rung == 6


def test_a_value_that_a_check_sets_aside_is_used_when_a_person_vouches_for_it(
    db: Database,
) -> None:
    """The wind of a whole day never moves: a stuck anemometer, or so it seems."""
    basin.fill(db)
    lines = ["time,air (degC),wind (m/s)"]
    lines += [f"2026-06-15 {hour:02}:00,{10 + hour / 2},1.3" for hour in range(1, 24)]
    lines += ["2026-06-16 00:00,22,1.3"]
    number = take_in.receive(db, "meadow", "calm.csv", io.BytesIO("\n".join(lines).encode()), "a")
    take_in.apply(db, number, "admin", basin.TODAY)

    def windy() -> StationDay:
        with db.read() as session:
            row = session.scalars(
                select(StationDay).where(StationDay.day == DAY, StationDay.station_id == 2)
            ).one()
            session.expunge_all()
        return row

    assert "wind_speed:set_aside" in windy().notes
    mark_span(
        db, "meadow", "wind_speed", DAY, DAY, "good", "stood beside it", "advisor", "f",
        basin.TODAY,
    )  # fmt: skip
    assert "wind_speed:set_aside" not in windy().notes


def test_part_of_a_day_by_the_clock(db: Database) -> None:
    """A daily row ends at midnight: a span to noon does not hold it, one to the day's end does."""
    basin.fill(db)
    mark(db, token="noon", from_time=time(6), to_time=time(12))
    assert station_day(db).rung == 5
    mark(db, token="end", from_time=time(6))
    assert station_day(db).rung == 6


def test_a_calibration_counts_from_its_day_until_the_next(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    plain = {n: station_day(db, date(2026, 6, n)).shortwave_down or 0.0 for n in (9, 10, 14, 15)}
    first = log_sensor(
        db, "bench", "calibration", date(2026, 6, 10), "certificate 14", "admin", "f1",
        basin.TODAY, "shortwave_down", 1.02,
    )  # fmt: skip
    second = log_sensor(
        db, "bench", "calibration", date(2026, 6, 15), "certificate 15", "admin", "f2",
        basin.TODAY, "shortwave_down", 0.99,
    )  # fmt: skip
    now = {n: station_day(db, date(2026, 6, n)).shortwave_down or 0.0 for n in plain}
    assert now[9] == plain[9]
    assert now[10] == pytest.approx(1.02 * plain[10])
    assert now[14] == pytest.approx(1.02 * plain[14])
    assert now[15] == pytest.approx(0.99 * plain[15])
    take_back_entry(db, second, "admin", "f3", basin.TODAY)
    assert station_day(db).shortwave_down == pytest.approx(1.02 * plain[15])
    take_back_entry(db, first, "admin", "f4", basin.TODAY)
    assert basin.derived(db) == before


def test_the_log_keeps_what_was_done_at_the_mast(db: Database) -> None:
    basin.fill(db)
    before = basin.derived(db)
    log_sensor(db, "bench", "cleaning", DAY, "windows wiped, level set", "admin", "f", basin.TODAY)
    with db.read() as session:
        assert [entry.note for entry in judgement.sensor_log(session, 1)] == [
            "windows wiped, level set"
        ]
        assert len(session.scalars(select(SensorEntry)).all()) == 1
    assert basin.derived(db) == before


@pytest.mark.parametrize(
    ("more", "says"),
    [
        ({"why": "  "}, "why is empty"),
        ({"last": date(2026, 6, 10)}, "not after its start"),
        ({"why": "x" * 500}, "longer than 400"),
        ({"verdict": "maybe"}, "choose bad or good"),
    ],
)
def test_a_mark_that_makes_no_sense_is_refused(db: Database, more: dict, says: str) -> None:
    basin.fill(db)
    with pytest.raises(EntryError, match=says):
        mark(db, **more)


@pytest.mark.parametrize(
    ("kind", "quantity", "factor", "says"),
    [
        ("calibration", "shortwave_down", 12.0, "between 0.5 and 2"),
        ("calibration", "shortwave_down", float("nan"), "between 0.5 and 2"),
        ("calibration", None, 1.1, "needs the quantity"),
        ("cleaning", None, 1.1, "only a calibration"),
        ("polishing", None, None, "choose one of"),
        ("note", "sunspots", None, "no quantity"),
    ],
)
def test_an_entry_that_makes_no_sense_is_refused(
    db: Database, kind: str, quantity: str | None, factor: float | None, says: str
) -> None:
    basin.fill(db)
    with pytest.raises(EntryError, match=says):
        log_sensor(db, "bench", kind, DAY, "said", "admin", "f", basin.TODAY, quantity, factor)
