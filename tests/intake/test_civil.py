"""Clocks put forward and back, against the standard library's time zone data (IANA)."""

from datetime import UTC, datetime
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from app.intake import Clock, IntakeError
from app.intake.civil import civil_to_utc
from tests.intake.helpers import instants, take


def _face(utc: np.ndarray, zone: str) -> np.ndarray:
    """What a clock in `zone` shows at UTC seconds, by the standard library."""
    faces = [datetime.fromtimestamp(int(s), UTC).astimezone(ZoneInfo(zone)) for s in utc]
    return np.array([int(face.replace(tzinfo=UTC).timestamp()) for face in faces])


@pytest.mark.parametrize("zone", ["Europe/Madrid", "America/Los_Angeles", "Australia/Lord_Howe",
                                  "America/Santiago", "Asia/Kolkata", "UTC"])  # fmt: skip
@pytest.mark.parametrize("step", [600, 3600])
def test_a_year_of_rows_comes_back_to_the_second(zone: str, step: int) -> None:
    utc = np.arange(instants("2019-12-25")[0], instants("2021-01-05")[0], step)
    found = civil_to_utc(_face(utc, zone), zone)
    np.testing.assert_array_equal(found.utc, utc)
    assert not found.no_such_hour.any()
    newest_first = civil_to_utc(_face(utc[::-1], zone), zone)
    np.testing.assert_array_equal(newest_first.utc, utc[::-1])


def test_the_missing_hour_is_refused_but_for_its_first_clock_face() -> None:
    local = instants("2016-03-27T01:45", "2016-03-27T02:00", "2016-03-27T02:30", "2016-03-27T03:15")
    found = civil_to_utc(local, "Europe/Madrid")
    np.testing.assert_array_equal(found.no_such_hour, [False, False, True, False])
    expected = instants("2016-03-27T00:45", "2016-03-27T01:00", "2016-03-27T01:15")
    np.testing.assert_array_equal(found.utc[[0, 1, 3]], expected)


def _file(local: np.ndarray) -> bytes:
    texts = local.astype("datetime64[s]").astype("datetime64[m]").astype(str)
    return b"date,temp (degC)\n" + b"".join(
        f"{text.replace('T', ' ')},{10 + i % 7}.5\n".encode() for i, text in enumerate(texts)
    )


@pytest.mark.parametrize("around", ["2024-03-31", "2024-10-27"])
def test_a_file_on_civil_time_is_read_to_utc(around: str) -> None:
    utc = np.arange(-86400, 86400, 1800) + instants(around)[0]
    reading = take(_file(_face(utc, "Europe/Madrid")), {"time_zone": "Europe/Madrid"})
    np.testing.assert_array_equal(reading.rows.instant, utc)
    assert reading.counts.duplicates_same == reading.counts.duplicates_differing == 0
    assert reading.problems == ()


def test_rows_in_the_hour_that_did_not_exist_are_listed() -> None:
    local = np.arange(0, 6 * 3600, 1800) + instants("2024-03-31")[0]
    reading = take(_file(local), {"time_zone": "Europe/Madrid"})
    assert reading.counts.rows_refused == 1  # 02:30; 02:00 is the change itself
    problem = next(p for p in reading.problems if p.severity == "refused")
    assert problem.value == "2024-03-31 02:30:00"
    assert "did not exist in Europe/Madrid" in problem.why


def test_station_and_utc_clocks() -> None:
    local = np.arange(0, 6 * 3600, 3600) + instants("2024-03-31")[0]
    on_station = take(_file(local), {"time_zone": "station"}, Clock(-3.5))
    np.testing.assert_array_equal(on_station.rows.instant, local + 12600)
    on_utc = take(_file(local), {"time_zone": "UTC"}, Clock(-3.5))
    np.testing.assert_array_equal(on_utc.rows.instant, local)


def test_an_unknown_zone() -> None:
    with pytest.raises(IntakeError, match="no time zone"):
        civil_to_utc(instants("2024-01-01"), "Nowhere/Town")
