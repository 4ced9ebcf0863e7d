"""Water meters: what is metered is shared by hours x flow, and the ledgers follow."""

from dataclasses import replace
from datetime import date

import pytest
from sqlalchemy import select

from app.storage import meters as store
from app.storage.database import Database
from app.storage.tables import Event
from app.workflows import meters
from app.workflows.log_event import log_irrigation
from app.workflows.once import EntryError
from tests.workflows import basin
from tests.workflows.test_seen import ledger, rebuilt

GIVEN = meters.MeterGiven(
    name="Head Gate 4", farm="reed", fields=("long-piece", "two-halves"), rolls_over_at=1e6
)


def put_up(db: Database, given: meters.MeterGiven = GIVEN, key: str | None = None) -> str:
    return meters.put_meter(db, given, "advisor", None, key)


def read(db: Database, day: int, register: float, token: str = "", **more: object) -> int:
    return meters.read_meter(
        db, "head-gate-4", date(2026, 6, day), register, "grower", token or f"r{day}", basin.TODAY,
        **more,  # type: ignore[arg-type]
    )  # fmt: skip


def told(db: Database) -> list[meters.Interval]:
    with db.read() as session:
        meter = store.meter_of(session, "head-gate-4", None)
        assert meter is not None
        return meters.intervals(session, meter)


def water(db: Database, field: str, day: int, hours: float) -> int:
    return log_irrigation(
        db, field, None, date(2026, 6, day), hours, "hours", "grower", f"{field}.{day}", basin.TODAY
    )


def test_what_is_metered_is_shared_by_hours_times_flow(db: Database) -> None:
    """By hand: 6 mm/h on 10 ha is 600 m3/h, on 20 ha 1200; 5 h and 10 h are 3000 and 12000 m3
    logged, a fifth and four fifths of what was metered, over a roll-over."""
    basin.fill(db)
    before = basin.derived(db)
    put_up(db)
    read(db, 18, 995_000)
    water(db, "long-piece", 20, 5)
    water(db, "two-halves", 21, 10)
    logged = basin.derived(db)
    number = read(db, 24, 7_000)  # 12 000 m3
    last = told(db)[-1]
    assert last.metered_m3 == pytest.approx(12_000)
    assert last.logged_m3 == pytest.approx(15_000)
    assert last.irrigations == 3  # one, and one on each block
    assert last.open
    assert not last.beyond
    assert basin.derived(db) == logged  # a reading alone moves nothing
    count = meters.share_out(db, "head-gate-4", number, "advisor", "share", basin.TODAY)
    assert count == meters.share_out(db, "head-gate-4", number, "advisor", "share", basin.TODAY)
    assert ledger(db)[date(2026, 6, 20)].irrigation_gross_mm == pytest.approx(2400 / 100)
    for block in ("upper", "lower"):
        assert ledger(db, block)[date(2026, 6, 21)].irrigation_gross_mm == pytest.approx(48)
    state = basin.derived(db)
    assert state not in (before, logged)
    assert rebuilt(db) == state
    (last,) = told(db)[1:]
    assert last.shared
    assert not last.open
    assert last.logged_m3 == pytest.approx(15_000)  # what was said stays known
    with db.read() as session:
        kept = session.scalars(select(Event).where(Event.confirmation == "metered")).all()
        assert len(kept) == 3
        assert sum(event.amount for event in kept) == pytest.approx(12_000, abs=1e-6)
        assert all(event.supersedes for event in kept)


def test_water_logged_late_is_shared_in_again_by_what_was_first_said(db: Database) -> None:
    basin.fill(db)
    put_up(db)
    read(db, 18, 1000)
    water(db, "long-piece", 20, 5)
    number = read(db, 24, 7000)
    meters.share_out(db, "head-gate-4", number, "advisor", "one", basin.TODAY)
    water(db, "long-piece", 22, 10)
    assert told(db)[-1].open
    meters.share_out(db, "head-gate-4", number, "advisor", "two", basin.TODAY)
    assert ledger(db)[date(2026, 6, 20)].irrigation_gross_mm == pytest.approx(20)
    assert ledger(db)[date(2026, 6, 22)].irrigation_gross_mm == pytest.approx(40)
    # a corrected reading opens it again
    corrected = read(db, 24, 4000, "again")
    assert len(told(db)) == 2
    assert told(db)[-1].open
    meters.share_out(db, "head-gate-4", corrected, "advisor", "three", basin.TODAY)
    assert ledger(db)[date(2026, 6, 20)].irrigation_gross_mm == pytest.approx(10)
    state = basin.derived(db)
    assert rebuilt(db) == state


def test_unit_multiplier_and_a_meter_set_anew(db: Database) -> None:
    """An acre-foot is 1233.48 m3 (NIST SP 811, appendix B.8)."""
    basin.fill(db)
    key = put_up(db, replace(GIVEN, rolls_over_at=None))
    put_up(db, replace(GIVEN, unit="acre_ft", multiplier=0.1, rolls_over_at=None), key)
    read(db, 18, 50)
    read(db, 19, 60)
    with pytest.raises(EntryError, match="on 2026-06-19 it showed 60"):
        read(db, 20, 8)
    read(db, 20, 8, restarts=True, note="new meter")
    read(db, 21, 9)
    volumes = [one.metered_m3 for one in told(db)]
    assert volumes == pytest.approx(
        [float("nan"), 1233.48, float("nan"), 123.348], rel=1e-5, nan_ok=True
    )
    assert told(db)[-1].irrigations == 0
    assert not told(db)[-1].open
    with pytest.raises(EntryError, match="log them first"):
        meters.share_out(db, key, told(db)[-1].reading, "a", "s", basin.TODAY)
    meters.void_reading(db, key, told(db)[1].reading, "a", "v")
    assert len(told(db)) == 3


@pytest.mark.parametrize(
    ("given", "says"),
    [
        ({"unit": "bucket"}, "unit is 'bucket'"), ({"multiplier": 0.0}, "multiplier is 0"),
        ({"name": " "}, "name is empty"), ({"fields": ()}, "fields is empty"),
        ({"rolls_over_at": 1.0}, "rolls_over_at is 1"),
    ],
)  # fmt: skip
def test_a_meter_that_cannot_be_is_refused(given: dict[str, object], says: str) -> None:
    with pytest.raises(EntryError, match=says):
        replace(GIVEN, **given)  # type: ignore[arg-type]


def test_a_field_has_one_meter_and_another_farm_none_of_it(db: Database) -> None:
    basin.fill(db)
    put_up(db)
    with pytest.raises(EntryError, match="fed by the meter 'Head Gate 4' already"):
        put_up(db, replace(GIVEN, name="Other"))
    with pytest.raises(EntryError, match="there is no farm"):
        meters.put_meter(db, GIVEN, "a", frozenset({"elsewhere"}))
    with pytest.raises(EntryError, match="there is no meter"):
        meters.read_meter(
            db, "head-gate-4", date(2026, 6, 1), 1, "a", "t", basin.TODAY, frozenset({"elsewhere"})
        )
    for register in (-1.0, float("nan"), 1e6):
        with pytest.raises(EntryError, match="register is"):
            read(db, 18, register)
    with pytest.raises(EntryError, match="give a day from"):
        meters.read_meter(db, "head-gate-4", date(2026, 7, 2), 1, "a", "t", basin.TODAY)


def test_more_than_the_fields_can_draw_is_told(db: Database) -> None:
    """600 + 1200 m3/h for a day is 43 200 m3."""
    basin.fill(db)
    put_up(db)
    read(db, 18, 0)
    read(db, 19, 60_000)
    assert told(db)[-1].most_m3 == pytest.approx(43_200)
    assert told(db)[-1].beyond
