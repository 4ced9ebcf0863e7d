"""Real public records, read without help where the file itself says enough.

Sources: tests/data/radiation (Baseline Surface Radiation Network, station Payerne, June 2016; NOAA
SURFRAD, San Luis Valley, 1 January 2016); NREL TMY3 723170 in the pvlib package; the NOAA daily
record of Seattle 2012-2015 in the vega_datasets package.
"""

import csv
import io
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
import pytest
import vega_datasets

from app.intake import Clock, aggregate, answer, fold, pack, read, sniff, unpack
from app.science.energy.station_day import Site

RADIATION = Path(__file__).parent.parent / "data" / "radiation"


def test_payerne_quarter_hours() -> None:
    data = (RADIATION / "payerne_2016-06_15min.csv").read_bytes()
    clock = Clock(1.0)
    found = sniff(io.BytesIO(data), clock)
    assert found.questions == ()
    assert found.mapping.interval_s == 900
    meanings = {c.name: (c.quantity, c.unit) for c in found.mapping.columns}
    assert meanings == {
        "end": (None, None),
        "sw_in": ("shortwave_down", "W/m2"),
        "sw_out": ("shortwave_up", "W/m2"),
        "lw_in": ("longwave_down", "W/m2"),
        "lw_out": ("longwave_up", "W/m2"),
        "t": ("air_temperature", "degC"),
        "rh": ("relative_humidity", "%"),
        "p_hpa": ("pressure", "hPa"),
        "rn4": ("net_radiation", "W/m2"),
    }
    reading = read(io.BytesIO(data), answer(found.mapping, {"time_zone": "UTC"}), clock)
    assert (reading.counts.rows, reading.problems) == (2880, ())
    frame = pd.read_csv(io.BytesIO(data), parse_dates=["end"])
    np.testing.assert_array_equal(
        reading.rows.instant, frame["end"].to_numpy().astype("datetime64[s]").astype(np.int64)
    )
    np.testing.assert_array_equal(reading.rows.values["longwave_down"], frame["lw_in"])
    np.testing.assert_allclose(reading.rows.values["pressure"], frame["p_hpa"] / 10)

    site = Site(46.815, 6.944, 491.0, 1.0, reference_surface=True)
    days = np.arange("2016-06-02", "2016-06-30", dtype="datetime64[D]")
    weather, _ = aggregate(reading.rows, site, days)
    local = frame.set_index(frame["end"] + pd.Timedelta("1h") - pd.Timedelta("450s"))
    daily = local[["sw_in", "lw_in", "lw_out", "t"]].clip(lower=0).resample("D").mean().loc[days]
    np.testing.assert_allclose(weather.shortwave_down, daily["sw_in"] * 0.0864, rtol=1e-3)
    np.testing.assert_allclose(weather.longwave_down, daily["lw_in"] * 0.0864, rtol=1e-9)
    np.testing.assert_allclose(weather.tmean, daily["t"], rtol=1e-9)
    # the whole way through the packed days changes nothing
    packed = fold([unpack(day.blob) for day in pack(reading.rows, clock)])
    again, _ = aggregate(packed, site, days)
    np.testing.assert_array_equal(again.net_radiation, weather.net_radiation)


def test_surfrad_minutes_without_a_header_by_a_mapping_made_by_hand() -> None:
    data = (RADIATION / "surfrad-slv16001.dat").read_bytes()
    clock = Clock(-7.0)
    found = sniff(io.BytesIO(data), clock)
    roles = [column.role for column in found.mapping.time.columns]
    assert roles == ["year", "day_of_year", "month", "day", "hour", "minute"]
    assert (found.mapping.delimiter, found.mapping.interval_s) == ("blanks", 60)
    assert found.mapping.first_data_line == 3
    named = {8: ("shortwave_down", "W/m2"), 16: ("longwave_down", "W/m2"),
             38: ("air_temperature", "degC"), 46: ("pressure", "mbar")}  # fmt: skip
    answers = {"time_zone": "UTC"}
    for position, (quantity, unit) in named.items():
        answers[f"columns.{position}.quantity"] = quantity
        answers[f"columns.{position}.unit"] = unit
    reading = read(io.BytesIO(data), answer(found.mapping, answers), clock)
    lines = [line.split() for line in data.decode().splitlines()[2:]]
    assert reading.counts.rows == len(lines)
    for position, (quantity, _) in named.items():
        raw = np.array([float(line[position]) for line in lines])
        scale = 10 if quantity == "pressure" else 1
        np.testing.assert_allclose(reading.rows.values[quantity] * scale, raw)
    assert reading.rows.instant[0] == np.datetime64("2016-01-01T00:00", "s").astype(np.int64)


def test_a_typical_year_as_a_logger_file() -> None:
    """Month before day, 24:00 at the end of each day, two preamble-like lines, 71 columns."""
    path = Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"
    data = path.read_bytes()
    clock = Clock(-5.0)
    found = sniff(io.BytesIO(data), clock)
    assert found.questions == ()
    assert found.mapping.time.order == "mdy"
    meanings = {c.quantity: c.name for c in found.mapping.columns if c.quantity}
    assert meanings == {
        "shortwave_down": "GHI (W/m^2)",
        "air_temperature": "Dry-bulb (C)",
        "dew_point": "Dew-point (C)",
        "relative_humidity": "RHum (%)",
        "pressure": "Pressure (mbar)",
        "wind_speed": "Wspd (m/s)",
        "rain": "Lprecip depth (mm)",
    }
    reading = read(io.BytesIO(data), found.mapping, clock)
    assert reading.counts.rows == 8760
    assert not any(problem.severity == "refused" for problem in reading.problems)
    with path.open() as file:
        table = list(csv.DictReader(file.readlines()[1:]))
    by_instant = {}
    for line, row in enumerate(table, start=3):
        month, day, year = map(int, row["Date (MM/DD/YYYY)"].split("/"))
        start = np.datetime64(f"{year}-{month:02}-{day:02}", "s").astype(np.int64)
        by_instant[start + int(row["Time (HH:MM)"][:2]) * 3600 + 5 * 3600] = (line, row)
    assert sorted(by_instant) == reading.rows.instant.tolist()
    for i in range(0, 8760, 97):
        line, row = by_instant[int(reading.rows.instant[i])]
        assert reading.rows.line[i] == line
        assert reading.rows.values["shortwave_down"][i] == float(row["GHI (W/m^2)"])
        assert reading.rows.values["air_temperature"][i] == float(row["Dry-bulb (C)"])


def test_seattle_days() -> None:
    path = Path(vega_datasets.__file__).parent / "_data" / "seattle-weather.csv"
    data = path.read_bytes()
    clock = Clock(-8.0)
    found = sniff(io.BytesIO(data), clock)
    (question,) = found.questions  # a wind without a unit is asked, all else is told by the values
    assert (question.field, question.suggested) == ("columns.4.unit", "m/s")
    mapping = answer(found.mapping, {"columns.4.unit": "m/s"})
    reading = read(io.BytesIO(data), mapping, clock)
    frame = pd.read_csv(path, parse_dates=["date"])
    days = frame["date"].to_numpy().astype("datetime64[D]")
    weather, notes = aggregate(reading.rows, Site(47.45, -122.31, 130.0, -8.0), days)
    np.testing.assert_array_equal(weather.tmax, frame["temp_max"])
    np.testing.assert_array_equal(weather.tmin, frame["temp_min"])
    np.testing.assert_array_equal(weather.rain, frame["precipitation"])
    np.testing.assert_array_equal(weather.wind, frame["wind"])
    assert notes == []


@pytest.mark.parametrize("style", ["semicolons and commas", "fahrenheit and inches"])
def test_a_real_year_written_out_as_other_loggers_would(style: str) -> None:
    path = Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"
    data = path.read_bytes()
    clock = Clock(-5.0)
    reference = read(io.BytesIO(data), sniff(io.BytesIO(data), clock).mapping, clock).rows
    local = (reference.instant - 5 * 3600).astype("datetime64[s]")
    stamp = pd.DatetimeIndex(local)
    v = reference.values
    if style == "semicolons and commas":
        frame = pd.DataFrame({
            "Fecha": stamp.strftime("%d/%m/%Y %H:%M"),
            "Temperatura (°C)": v["air_temperature"],
            "Viento (km/h)": v["wind_speed"] * 3.6,
            "Lluvia (mm)": v["rain"],
        })  # fmt: skip
        text = frame.to_csv(index=False, sep=";", decimal=",").encode("utf-16")
    else:
        frame = pd.DataFrame({
            "Date": stamp.strftime("%m/%d/%Y"),
            "Time": stamp.strftime("%I:%M %p"),
            "Temp (F)": v["air_temperature"] * 1.8 + 32,
            "Wind (mph)": v["wind_speed"] / 0.44704,
            "Rain (in)": v["rain"] / 25.4,
        })  # fmt: skip
        text = frame.to_csv(index=False, sep="\t").encode("utf-8-sig")
    found = sniff(io.BytesIO(text), clock)
    assert [q for q in found.questions if q.blocking] == []
    reading = read(io.BytesIO(text), found.mapping, clock)
    np.testing.assert_array_equal(reading.rows.instant, reference.instant)
    for name in ("air_temperature", "wind_speed", "rain"):
        np.testing.assert_allclose(reading.rows.values[name], v[name], atol=1e-9)
