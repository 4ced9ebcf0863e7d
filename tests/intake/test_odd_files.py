"""Files as spreadsheets and loggers really leave them, one oddity each (regression)."""

import numpy as np
import pytest

from tests.intake.helpers import instants, look, take

HOURS = range(24)


def meanings(data: bytes) -> dict[str, str | None]:
    return {c.quantity: c.unit for c in look(data).mapping.columns if c.quantity}


def test_a_separator_line_units_after_commas_and_decimal_commas() -> None:
    data = 'sep=;\r\n"Date";"Temp, °C";"RH, %";"Wind Speed, m/s"\r\n'.encode() + b"".join(
        b"13/05/2025 %02d:00;%d,5;80;2,0\r\n" % (h, h) for h in HOURS
    )
    assert meanings(data) == {"air_temperature": "degC", "relative_humidity": "%",
                              "wind_speed": "m/s"}  # fmt: skip
    np.testing.assert_array_equal(take(data).rows.values["air_temperature"], np.arange(24) + 0.5)


def test_clock_times_as_numbers() -> None:
    hhmm = b"Date,Time,Temp (C)\n" + b"".join(b"2025-05-13,%02d00,%d.5\n" % (h, h) for h in HOURS)
    hour = b"Date,Hour,Temp (C)\n" + b"".join(b"2025-05-13,%d,%d.5\n" % (h + 1, h) for h in HOURS)
    assert take(hhmm).rows.instant[0] == instants("2025-05-12T22:00")[0]
    assert take(hour).rows.instant[-1] == instants("2025-05-13T22:00")[0]


def test_day_of_year_with_a_fraction_is_a_clock_time() -> None:
    data = b"year,doy,temp (degC)\n" + b"".join(
        f"2025,{133 + h / 24:.4f},{h}.5\n".encode() for h in HOURS
    )
    found = look(data).mapping
    assert (found.interval_s, found.row_time) == (3600, "end")
    np.testing.assert_array_equal(np.diff(take(data).rows.instant), np.full(23, 3600))


def test_kinds_of_figure_above_the_names() -> None:
    data = b"TS,Avg,Max,Min,Tot\ndate,temp,temp,temp,rain\n,degC,degC,degC,mm\n" + b"".join(
        b"2025-05-13 %02d:00,%d.5,%d.9,%d.1,0\n" % (h, h, h, h) for h in HOURS
    )
    assert set(meanings(data)) == {"air_temperature", "air_temperature_max",
                                   "air_temperature_min", "rain"}  # fmt: skip


def test_a_header_behind_a_hash_and_blanks_between_fields() -> None:
    data = b"# station of the test\n# date temp_C rh_pct\n" + b"".join(
        b"2025-05-13T%02d:00 %d.5 80\n" % (h, h) for h in HOURS
    )
    assert meanings(data) == {"air_temperature": "degC", "relative_humidity": "%"}


def test_a_clock_that_shakes_by_seconds_still_has_its_step() -> None:
    rng = np.random.default_rng(3)
    data = b"date,temp (degC)\n" + b"".join(
        b"2025-05-13 %02d:%02d:%02d,%d.5\n" % (h, m, rng.integers(0, 10), h)
        for h in HOURS
        for m in (0, 15, 30, 45)
    )
    assert look(data).mapping.interval_s == 900


def test_a_repeated_code_far_below_all_else_is_taken_as_missing_and_said() -> None:
    data = b"date,Rn (W/m2),wind (m/s)\n" + b"".join(
        b"2025-05-13 %02d:00,%d,%s\n" % (h, 10 * h - 40, b"-99.9" if 3 <= h < 6 else b"2.5")
        for h in HOURS
    )
    assert any(note.startswith("-99.9 is taken as missing") for note in look(data).notes)
    reading = take(data)
    assert reading.counts.cells_refused == 0
    assert reading.counts.missing["wind (m/s)"] == 3


def test_bad_first_rows_are_reported_not_passed_over_as_preamble() -> None:
    data = b"date,temp (degC),RH (%)\n2025-05-13 00:00,1.5\n2025-05-13 01:00,x1,90\n" + b"".join(
        b"2025-05-13 %02d:00,%d.5,80\n" % (h, h) for h in range(2, 24)
    )
    reading = take(data)
    assert [problem.line for problem in reading.problems] == [2, 3]
    assert len(reading.rows) == 23


def test_one_row_is_enough_when_it_is_a_day() -> None:
    assert len(take(b"date,tmax (degC)\n2025-05-13,23.5\n").rows) == 1
    hourly = look(b"date,temp (degC)\n2025-05-13 01:00,23.5\n")
    assert [q.field for q in hourly.questions] == ["interval_s"]


@pytest.mark.parametrize(
    ("cell", "value"), [("1.500,5", 1500.5), ("12.345.678,0", None), ("1.500", None)]
)
def test_thousands_in_a_file_of_decimal_commas(cell: str, value: float | None) -> None:
    rows = b"".join(b"%02d.05.2025;9%d9,5\n" % (d, d % 10) for d in range(1, 25))
    data = b"date;Rs (kJ/m2)\n" + rows + f"25.05.2025;{cell}\n".encode()
    reading = take(data)
    if value is None:  # impossible, or not to be told from a decimal point
        assert np.isnan(reading.rows.values["shortwave_down"][-1])
        assert reading.problems[0].value in (cell, "12345678")
    else:
        assert reading.rows.values["shortwave_down"][-1] == pytest.approx(value * 1000 / 86400)


def test_month_names_with_short_years_are_day_first() -> None:
    data = "Día,T. media ºC\n".encode() + b"".join(
        b"%d-may-25,22.%d\n" % (d, d % 10) for d in range(1, 25)
    )
    assert take(data).rows.instant[0] == instants("2025-05-01T22:00")[0]


def test_the_epoch_in_thousandths_and_the_station_clock() -> None:
    start = int(instants("2025-05-13T00:00")[0])
    data = b"timestamp,temp (degC)\n" + b"".join(
        b"%d,%d.5\n" % ((start + 3600 * h) * 1000, h) for h in HOURS
    )
    assert take(data).rows.instant[0] == start
