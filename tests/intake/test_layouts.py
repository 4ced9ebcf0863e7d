"""The same two days of an invented station in many layouts: each must give the same readings.

Regression: the files in tests/data/intake were written from truth.csv and daily_truth.csv, by hand
rules of our own; the unit factors used to write them are those of NIST Special Publication 811.
"""

import numpy as np
import pytest

from tests.intake.helpers import DATA, instants, look, take, truth

# file -> tolerance by quantity where the layout itself rounds (default 0.051: one decimal)
HOURLY = {
    "iso_comma.csv": {},
    "semicolon_spanish_latin1.txt": {},
    "tab_utf16le_us_units.txt": {"shortwave_down": 0.01},
    "utf16be_no_mark.csv": {},
    "bar_three_header_lines.txt": {},
    "blanks_year_doy_hhmm.dat": {},
    "aligned_columns.txt": {},
    "parts_with_minute.csv": {},
    "spreadsheet_serials.csv": {"shortwave_down": 0.02},
    "epoch_seconds.csv": {},
    "iso_with_offset.csv": {},
    "repeated_headers.csv": {},
    "quoted_decimal_commas.csv": {},
    "bare_returns.csv": {},
    "newest_first.csv": {},
    "interval_starts.csv": {},
    "utc_column.csv": {},
    "trailing_commas.csv": {},
}
QUANTITIES = ("air_temperature", "relative_humidity", "wind_speed", "shortwave_down", "rain")


@pytest.mark.parametrize("name", HOURLY)
def test_hourly_layout_gives_the_same_readings(name: str) -> None:
    data = (DATA / name).read_bytes()
    assert [q.field for q in look(data).questions if q.blocking] == []
    reading = take(data)
    wanted = truth()
    assert set(reading.rows.values) == set(QUANTITIES)
    np.testing.assert_array_equal(reading.rows.instant, instants(*wanted["end"]) - 7200)
    np.testing.assert_array_equal(reading.rows.interval_s, np.full(48, 3600))
    for quantity in QUANTITIES:
        expected = np.array(wanted[quantity], float)
        tolerance = HOURLY[name].get(quantity, 0.006)
        np.testing.assert_allclose(
            reading.rows.values[quantity], expected, atol=tolerance, rtol=0, err_msg=quantity
        )
    assert [p for p in reading.problems if p.severity == "refused"] == []
    assert reading.counts.rows == 48


@pytest.mark.parametrize("name", ["daily_us.csv", "daily_metric_doy.txt"])
def test_daily_layout_gives_the_same_readings(name: str) -> None:
    reading = take((DATA / name).read_bytes())
    wanted = truth("daily_truth.csv")
    end_of_day = instants(*wanted["day"]) + 86400 - 7200
    np.testing.assert_array_equal(reading.rows.instant, end_of_day)
    assert set(reading.rows.interval_s) == {86400}
    rows = reading.rows.values
    shortwave = np.array(wanted["shortwave_mj"], float) / 0.0864
    np.testing.assert_allclose(rows["shortwave_down"], shortwave, atol=0.06)
    for quantity in ("air_temperature_max", "air_temperature_min", "wind_speed", "rain"):
        np.testing.assert_allclose(rows[quantity], np.array(wanted[quantity], float), atol=0.013)
    for quantity in ("relative_humidity_max", "relative_humidity_min"):
        np.testing.assert_array_equal(rows[quantity], np.array(wanted[quantity], float))


def test_line_numbers_are_those_of_the_file() -> None:
    rows = take((DATA / "semicolon_spanish_latin1.txt").read_bytes()).rows
    np.testing.assert_array_equal(rows.line, np.arange(4, 52))
    newest_first = take((DATA / "newest_first.csv").read_bytes())
    np.testing.assert_array_equal(newest_first.rows.line, np.arange(49, 1, -1))
    assert newest_first.problems[0].why == "the file runs from new to old"


def test_repeated_headers_are_counted_and_no_problem() -> None:
    reading = take((DATA / "repeated_headers.csv").read_bytes())
    assert reading.counts.repeated_headers == 3
    assert reading.problems == ()


def test_what_was_found_is_said_in_plain_words() -> None:
    found = look((DATA / "iso_comma.csv").read_bytes())
    battery = next(i for i, c in enumerate(found.mapping.columns) if c.name == "Battery (V)")
    assert found.mapping.columns[battery].quantity is None
    assert "logger" in found.why[battery]
    wind = next(c for c in found.mapping.columns if c.quantity == "wind_speed")
    assert wind.height_m == 2.0
    assert found.examples[0][0] == "2025-05-12 01:00:00"
    height = next(q for q in found.questions if q.field == f"columns.{wind.position}.height_m")
    assert not height.blocking


def test_a_mapping_survives_json_and_is_used_again() -> None:
    data = (DATA / "iso_comma.csv").read_bytes()
    found = look(data)
    mapping = found.mapping
    changed = [c.model_copy(update={"quantity": None}) if c.quantity == "rain" else c
               for c in mapping.columns]  # fmt: skip
    kept = type(mapping).model_validate_json(
        mapping.model_copy(update={"columns": changed}).model_dump_json()
    )
    again = look(data, kept)
    assert again.remembered
    assert all(c.quantity != "rain" for c in again.mapping.columns)
    other = look((DATA / "epoch_seconds.csv").read_bytes(), kept)
    assert not other.remembered


def test_the_same_header_with_another_step_keeps_the_meaning_and_takes_the_step() -> None:
    head = b"date,temp (degC)\n"
    hourly = head + b"".join(
        b"2025-05-%02d %02d:00,%d.5\n" % (d, h, h) for d in (1, 2) for h in range(24)
    )
    quarter = head + b"".join(
        b"2025-05-03 %02d:%02d,%d.5\n" % (h, m, h) for h in range(24) for m in (0, 15, 30, 45)
    )
    first = look(hourly)
    again = look(quarter, first.mapping)
    assert (first.mapping.interval_s, again.mapping.interval_s) == (3600, 900)
    assert again.remembered
