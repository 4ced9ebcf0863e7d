"""What three invented loggers made of the weather, dirt included, each in its own file layout."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from make_weather import PER_DAY, SIGMA, Array, Weather
from numpy.typing import NDArray

Times = NDArray[np.datetime64]


@dataclass(frozen=True)
class File:
    """One file as it reached the office."""

    station: str
    name: str
    data: bytes
    answers: dict[str, Any]  # to what the file leaves open


def between(end: Times, span: tuple[str, str] | list[str]) -> NDArray[np.bool_]:
    """The steps that end after the first and not after the second instant of `span`."""
    return (end > np.datetime64(span[0])) & (end <= np.datetime64(span[1]))


def tips(rain: Array, tip: float) -> Array:
    """Rain as a gauge that tips by `tip` reports it."""
    count = np.floor(np.cumsum(rain) / tip + 1e-9)
    return np.diff(count, prepend=0.0) * tip


def blocks(values: Array, width: int, how: Callable[..., Any]) -> Array:
    """`how` (np.mean, np.max, ...) over blocks of `width` steps."""
    return np.asarray(how(values[: len(values) // width * width].reshape(-1, width), axis=1))


def stamp(end: Times, layout: str) -> list[str]:
    """Local time stamps: 'iso', 'dmy 24' (midnight is 24:00 of the day it ends), 'mdy' (a date)."""
    out = []
    for moment in end:
        text = str(moment.astype("datetime64[m]"))
        if layout == "iso":
            out.append(text.replace("T", " "))
        elif layout == "dmy 24":
            hour = text[11:]
            if hour == "00:00":
                text, hour = str((moment - np.timedelta64(1, "D")).astype("datetime64[m]")), "24:00"
            out.append(f"{text[8:10]}.{text[5:7]}.{text[:4]};{hour}")
        else:
            out.append(f"{int(text[5:7])}/{int(text[8:10])}/{text[:4]}")
    return out


def column(values: Array, digits: int, missing: str = "NAN") -> list[str]:
    """Numbers as text; no minus before a zero."""
    rounded = np.round(values, digits) + 0.0
    return [missing if v != v else f"{v:.{digits}f}" for v in rounded]


def frosted_dawns(weather: Weather, wanted: int) -> list[np.datetime64]:
    """The days whose clear, damp, freezing night left frost on the domes, at most one in 9 days."""
    n = len(weather.end) // PER_DAY
    nights = {}
    for day in range(n):
        night = slice(day * PER_DAY + 2, day * PER_DAY + 16)
        after = slice(day * PER_DAY + 16, day * PER_DAY + 22)
        cold, damp = weather["t"][night].min(), weather["rh"][night].max()
        open_sky = max(weather["cloud"][night].mean(), weather["cloud"][after].mean())
        if cold < -1 and damp > 90 and open_sky < 0.12:
            nights[day] = cold
    chosen: list[int] = []
    for day in sorted(nights, key=lambda d: nights[d]):
        if all(abs(day - other) > 9 for other in chosen) and len(chosen) < wanted:
            chosen.append(day)
    return [weather.end[day * PER_DAY].astype("datetime64[D]") for day in sorted(chosen)]


def four_components(weather: Weather, knobs: dict[str, Any]) -> list[File]:
    """Station 1: four radiation components, half hours, ISO stamps, plain comma file in UTF-8."""
    rng = np.random.default_rng(knobs["seed"] + 1)
    end, n = weather.end, len(weather.end)
    t = weather["t"] + 0.04 * rng.standard_normal(n)
    dim = weather["lw_up"] - weather["lw_down"]
    offset = -np.clip(0.021 * dim + 0.25 * rng.standard_normal(n), 0, 3)
    night = weather["above"] <= 0
    noise = 1 + 0.006 * rng.standard_normal((2, n))
    sw_down = np.where(night, offset, weather["sw_down"] * noise[0] + 0.6 * offset)
    sw_up = np.where(night, 0.3 * offset, weather["sw_up"] * noise[1])
    lw_down = weather["lw_down"] + 0.8 * rng.standard_normal(n)
    lw_up = weather["lw_up"] + 0.8 * rng.standard_normal(n)
    rh = weather["rh"] * 1.035 + 0.7 * rng.standard_normal(n)
    rh = np.minimum(rh, 102.6 + 0.3 * rng.standard_normal(n))
    wind = np.where(weather["wind"] < 0.3, 0.0, weather["wind"] + 0.05 * rng.standard_normal(n))
    wind = np.maximum(wind, 0.0)
    rain = tips(weather["rain"], 0.2)
    pressure = 10 * weather["pressure"] + 0.1 * rng.standard_normal(n)
    clock = ((end - end.astype("datetime64[D]")) / np.timedelta64(1, "h")).astype(float)
    battery = 12.6 + 0.5 * (clock > 8) * (clock < 18) + 0.05 * rng.standard_normal(n)

    body = SIGMA * (t + 273.15) ** 4
    for day in frosted_dawns(weather, knobs["frosted_dawns"]):
        white = between(end, (f"{day}T01:30", f"{day}T08:30"))
        lw_down[white] = (body - 1.5 - 1.2 * rng.random(n))[white]
        sw_down[white & ~night] *= 0.86
    for span in knobs["bare_signal"]:  # a pyrgeometer whose body term the logger lost
        bad = between(end, span)
        lw_down[bad] = (lw_down - body)[bad]
    for span in knobs["no_longwave"]:
        lw_down[between(end, span)] = np.nan
    for span in knobs["stuck_wind"]["tarrow-north"]:
        wind[between(end, span)] = 0.0
    for span in knobs["cow"]:
        here = between(end, span)
        sw_up[here] = sw_down[here] * 0.52
        sw_down[here] *= 0.45
    series = {
        "sw_down": sw_down,
        "sw_up": sw_up,
        "lw_down": lw_down,
        "lw_up": lw_up,
        "t": t,
        "rh": rh,
        "wind": wind,
        "rain": rain,
        "pressure": pressure,
    }
    for name, when, value in knobs["spikes"]["tarrow-north"]:
        series[name][end == np.datetime64(when)] = value
    digits = {
        "sw_down": 1,
        "sw_up": 1,
        "lw_down": 1,
        "lw_up": 1,
        "t": 1,
        "rh": 1,
        "wind": 1,
        "rain": 1,
        "pressure": 1,
    }
    columns = [stamp(end, "iso")] + [column(series[k], digits[k]) for k in digits]
    columns.append(column(battery, 1))
    lines = [",".join(row) for row in zip(*columns, strict=True)]
    head = [
        "time,shortwave down,shortwave up,longwave down,longwave up,air temperature,"
        "relative humidity,wind speed,rain,pressure,battery",
        ",W/m2,W/m2,W/m2,W/m2,degC,%,m/s,mm,hPa,V",
    ]
    preamble = ["Tarrow North mast; mown grass, watered; local standard time, end of the half hour"]

    off = np.zeros(n, dtype=bool)
    for span in knobs["off"]["tarrow-north"]:
        off |= between(end, span)
    late = between(end, knobs["late_file"])
    out = []
    for name, first, last in knobs["files"]["tarrow-north"]:
        rows = list(preamble) + list(head)
        previous = -1
        for i in np.flatnonzero(between(end, (first, last)) & ~off & ~late):
            if previous >= 0 and i - previous > 2:
                rows += head  # restarted: the logger writes its header again
            rows.append(lines[i])
            if str(end[i])[:16] in knobs["twice"]:
                rows += lines[i - 3 : i + 1]
            previous = int(i)
        text = "\n".join(rows) + "\n"
        if name == knobs["cut_off"]:
            text = text[:-38]
        out.append(File("tarrow-north", name, text.encode("utf-8"), {}))
    wide = (
        str(np.datetime64(knobs["late_file"][0]) - np.timedelta64(6, "h")),
        knobs["late_file"][1],
    )
    order = np.flatnonzero(between(end, wide) & ~off)
    days = [order[k : k + 48] for k in range(0, len(order), 48)][::-1]  # newest page first
    rows = list(preamble) + list(head) + [lines[i] for page in days for i in page]
    out.append(File("tarrow-north", knobs["late_name"], ("\n".join(rows) + "\n").encode(), {}))
    return out


def pyranometer(weather: Weather, knobs: dict[str, Any]) -> list[File]:
    """Station 2: hourly, solar energy an hour, decimal comma, day.month.year, km/h at 10 m."""
    rng = np.random.default_rng(knobs["seed"] + 2)
    width = PER_DAY // 24
    end = weather.end[width - 1 :: width][: len(weather.end) // width]
    n = len(end)
    night = blocks(weather["above"], width, np.max) <= 0
    sun = (
        blocks(weather["sw_down"], width, np.mean)
        * 0.0036
        * (knobs["bench_sun_gain"] + 0.008 * rng.standard_normal(n))
    )
    sun = np.where(night, -0.0036 * rng.uniform(0.2, 2.2, n), sun)
    t = blocks(weather["t"], width, np.mean) + 0.05 * rng.standard_normal(n)
    top = np.maximum(blocks(weather["t"], width, np.max) + 0.25 * rng.random(n), t)
    low = np.minimum(blocks(weather["t"], width, np.min) - 0.25 * rng.random(n), t)
    rh = np.minimum(blocks(weather["rh"], width, np.mean) * 1.01 + rng.standard_normal(n), 100.0)
    wind = blocks(weather["wind"], width, np.mean) * np.log(67.8 * 10 - 5.42) / 4.87 * 3.6
    wind = np.maximum(wind + 0.2 * rng.standard_normal(n), 0.0)
    rain = blocks(tips(weather["rain"], 0.1), width, np.sum)
    supply = 13.1 + 0.1 * rng.standard_normal(n)
    for span in knobs["stuck_wind"]["ferrin-bench"]:
        wind[between(end, span)] = 0.0
    for span in knobs["bench_humidity_lost"]:
        rh[between(end, span)] = np.nan
    series = {"sun": sun, "t": t, "top": top, "low": low, "rh": rh, "wind": wind, "rain": rain}
    for name, when, value in knobs["spikes"]["ferrin-bench"]:
        series[name][end == np.datetime64(when)] = value
    digits = {"sun": 3, "t": 1, "top": 1, "low": 1, "rh": 0, "wind": 1, "rain": 1}
    columns = [stamp(end, "dmy 24")]
    columns += [
        [v.replace(".", ",") for v in column(series[k], d, "-9999")] for k, d in digits.items()
    ]
    columns.append([v.replace(".", ",") for v in column(supply, 1)])
    lines = [";".join(row) for row in zip(*columns, strict=True)]
    head = (
        "Date;Time;Solar energy (MJ/m²);Air temperature (°C);Air temperature max (°C);"
        "Air temperature min (°C);Relative humidity (%);Wind speed 10 m (km/h);Rain (mm);"
        "Supply (V)"
    )
    off = np.zeros(n, dtype=bool)
    for span in knobs["off"]["ferrin-bench"]:
        off |= between(end, span)
    out = []
    for name, first, last, encoding in knobs["files"]["ferrin-bench"]:
        rows = ["Ferrin Bench;hourly;standard time", head]
        rows += [lines[i] for i in np.flatnonzero(between(end, (first, last)) & ~off)]
        out.append(File("ferrin-bench", name, ("\r\n".join(rows) + "\r\n").encode(encoding), {}))
    return out


def thermometer(weather: Weather, knobs: dict[str, Any]) -> list[File]:
    """Station 3: each day's highest and lowest temperature and rain, US units, month/day/year."""
    rng = np.random.default_rng(knobs["seed"] + 3)
    n = len(weather.end) // PER_DAY
    midnight: Times = weather.end[PER_DAY - 1 :: PER_DAY][:n]
    day = np.asarray(midnight - np.timedelta64(1, "D"), dtype="datetime64[m]")
    high = blocks(weather["t"], PER_DAY, np.max) * 1.8 + 32 + 0.3 * rng.standard_normal(n)
    low = blocks(weather["t"], PER_DAY, np.min) * 1.8 + 32 + 0.3 * rng.standard_normal(n)
    rain = np.round(blocks(weather["rain"], PER_DAY, np.sum) / 25.4, 2)
    dates = stamp(day, "mdy")
    out = []
    for name, first, last, missing in knobs["files"]["sand-lane"]:
        rows = [
            "Sand Lane",
            "Daily sheet, midnight to midnight",
            "Read by: R. Ossel",
            "",
            "Date,Max temp (F),Min temp (F),Rain (in)",
        ]
        for i in range(n):
            if not np.datetime64(first) <= day[i] <= np.datetime64(last):
                continue
            text = str(day[i].astype("datetime64[D]"))
            if text in knobs["off"]["sand-lane"]:
                continue
            cells = [f"{high[i]:.0f}", f"{low[i]:.0f}", f"{rain[i]:.2f}"]
            for k in knobs["unread"].get(text, ()):
                cells[k] = missing
            rows.append(",".join([dates[i], *cells]))
        out.append(File("sand-lane", name, ("\n".join(rows) + "\n").encode("ascii"), {}))
    return out
