"""Make the demo basin: an invented, semi-arid, irrigated valley with its weather and its farms.

Run `python demo_data/make_demo.py` to write every file of this folder anew, byte for byte the
same; `--out FOLDER` writes elsewhere. Places, people and numbers are invented. KNOBS has the knobs.
"""

import argparse
import json
from pathlib import Path
from typing import Any

from make_book import make_book
from make_loggers import File, four_components, pyranometer, thermometer
from make_weather import Place, make

KNOBS: dict[str, Any] = {
    "today": "2026-07-14",
    "book": {
        "today": "2026-07-14",
        # the limit is passed by the close of which day, today being 1: from, to, best
        "aims": {
            "late": (0, 0, 0),
            "due": (1, 2, 2),
            "soon": (4, 5, 5),
            "easy": (7, 14, 9),
            "wet": (99, 99, 99),
        },
        "other_irrigations": [
            {"field": "peach-corner", "day": "2026-04-19", "hours": 6, "purpose": "frost"},
            {"field": "north-rows", "day": "2025-04-17", "hours": 5, "purpose": "frost"},
            {"field": "mill-bottom", "day": "2026-04-06", "gross_mm": 12, "purpose": "germination"},
            {"field": "lane-end", "day": "2026-04-07", "gross_mm": 10, "purpose": "germination"},
            {"field": "back-forty", "day": "2026-04-24", "gross_mm": 60, "purpose": "leaching"},
        ],
        "gauges": [
            {
                "field": "low-meadow",
                "day": "2026-07-12",
                "rain_mm": 31,
                "note": "gauge at the dairy",
            },
            {
                "field": "calf-pasture",
                "day": "2026-07-12",
                "rain_mm": 28,
                "note": "gauge at the dairy",
            },
            {"field": "vine-terrace", "day": "2026-05-12", "rain_mm": 9.5},
        ],
    },
    "weather": {
        "seed": 174,
        "first": "2025-02-22T00:00",
        "last": "2026-07-14T06:00",
        "utc_offset_h": -7.0,
        "mean_t": 10.1,
        "season_t": 11.7,
        "mean_dew": 2.4,
        "season_dew": 7.2,
        "wind": 1.75,
        "front_rain_mm": 5.2,
        # start, hours, mm at Tarrow North, Ferrin Bench, Sand Lane
        "storms": [("2026-07-12T20:30", 1.5, (3.0, 9.0, 2.0))],
        "no_other_storms": [("2026-06-28", "2026-07-14")],
    },
    "loggers": {
        "seed": 20260714,
        "frosted_dawns": 12,
        "bench_sun_gain": 0.985,
        "bare_signal": [("2025-08-14T09:00", "2025-08-22T14:30")],
        "no_longwave": [("2026-07-05T21:00", "2026-07-08T10:30")],
        "bench_humidity_lost": [("2025-09-20T06:00", "2025-09-24T15:00")],
        "stuck_wind": {
            "tarrow-north": [("2025-06-10T02:00", "2025-06-17T11:00")],
            "ferrin-bench": [("2026-06-15T18:00", "2026-06-22T10:00")],
        },
        "cow": [("2026-05-21T11:00", "2026-05-21T13:30"), ("2025-07-02T09:00", "2025-07-02T10:30")],
        "off": {
            "tarrow-north": [
                ("2025-05-17T14:00", "2025-05-19T09:30"),
                ("2025-10-30T00:00", "2025-10-31T12:00"),
                ("2026-02-10T03:00", "2026-02-10T04:30"),
                ("2026-04-20T10:00", "2026-04-20T11:30"),
            ],
            "ferrin-bench": [
                ("2025-07-28T17:00", "2025-07-29T16:00"),
                ("2026-01-14T00:00", "2026-01-16T12:00"),
                ("2026-05-30T08:00", "2026-05-30T10:00"),
            ],
            "sand-lane": ["2025-08-30", "2025-08-31", "2025-09-01", "2026-02-14"],
        },
        # station 3: date -> which of high, low, rain were not read
        "unread": {
            "2025-04-12": (2,),
            "2025-07-04": (0, 1, 2),
            "2025-11-27": (0, 1),
            "2025-12-25": (0, 1, 2),
            "2026-05-09": (1,),
            "2026-06-14": (0, 1, 2),
            "2026-07-04": (2,),
        },
        "spikes": {
            "tarrow-north": [
                ("t", "2025-04-22T13:30", 85.0),
                ("sw_down", "2025-06-24T11:00", 2480.0),
                ("wind", "2025-09-03T16:00", 99.9),
                ("rh", "2026-03-18T07:00", 131.0),
                ("t", "2026-06-11T04:00", -99.9),
                ("pressure", "2026-05-02T10:00", 0.0),
            ],
            "ferrin-bench": [("t", "2025-05-28T15:00", 71.5), ("wind", "2026-03-08T05:00", 402.0)],
        },
        "twice": ["2025-07-19T12:00", "2025-12-02T08:00", "2026-05-15T16:30"],
        "files": {
            "tarrow-north": [
                ("tarrow-north-2025.csv", "2025-03-01T00:00", "2026-01-01T00:00"),
                ("tarrow-north-2026-spring.csv", "2026-01-01T00:00", "2026-06-20T08:00"),
                ("tarrow-north-2026-summer.csv", "2026-06-18T12:00", "2026-07-14T05:00"),
            ],
            "ferrin-bench": [
                ("ferrin-bench-2025.csv", "2025-03-01T00:00", "2026-01-01T00:00", "latin-1"),
                ("ferrin-bench-2026.csv", "2026-01-01T00:00", "2026-07-14T00:00", "utf-16"),
            ],
            "sand-lane": [
                ("sand-lane-2025.csv", "2025-03-01", "2025-12-31", "M"),
                ("sand-lane-2026.csv", "2026-01-01", "2026-06-30", "-9999"),
                ("sand-lane-july.csv", "2026-07-01", "2026-07-11", ""),
            ],
        },
        "cut_off": "tarrow-north-2026-summer.csv",
        "late_file": ("2026-06-03T06:00", "2026-06-08T18:00"),
        "late_name": "tarrow-north-june-found.csv",
    },
    "arrival": [
        "tarrow-north-2025.csv",
        "ferrin-bench-2025.csv",
        "sand-lane-2025.csv",
        "tarrow-north-2026-spring.csv",
        "sand-lane-2026.csv",
        "sand-lane-july.csv",
        "ferrin-bench-2026.csv",
        "tarrow-north-2026-summer.csv",
        "tarrow-north-june-found.csv",
    ],
}

# place: wind factor, degC on clear nights, degC on the dew point, rain factor
PLACES = [
    Place("tarrow-north", "Tarrow North", 43.712, -108.412, 742.0, 1.0, 0.0, 0.6, 1.0),
    Place("ferrin-bench", "Ferrin Bench", 43.668, -108.551, 868.0, 1.25, 2.0, -0.6, 1.08),
    Place("sand-lane", "Sand Lane", 43.781, -108.298, 701.0, 0.9, -0.8, 0.2, 0.92),
]


def as_json(value: Any) -> bytes:
    """Readable JSON: a line for each part of a list."""
    if isinstance(value, dict):
        parts = []
        for key, items in value.items():
            rows = ",\n".join("    " + json.dumps(item, ensure_ascii=False) for item in items)
            parts.append(f"  {json.dumps(key)}: [\n{rows}\n  ]")
        return ("{\n" + ",\n".join(parts) + "\n}\n").encode()
    rows = ",\n".join("  " + json.dumps(item, ensure_ascii=False) for item in value)
    return f"[\n{rows}\n]\n".encode()


def make_all() -> tuple[dict[str, bytes], list[str]]:
    """Every file of the demo basin by name, and where each field stands on the demo's morning."""
    weather = make(PLACES, KNOBS["weather"])
    loggers = KNOBS["loggers"]
    files: dict[str, File] = {}
    for write, record in zip((four_components, pyranometer, thermometer), weather, strict=True):
        files |= {file.name: file for file in write(record, loggers)}
    out = {name: files[name].data for name in KNOBS["arrival"]}
    out["intakes.json"] = as_json(
        [
            {"station": files[n].station, "file": n, "answers": files[n].answers}
            for n in KNOBS["arrival"]
        ]
    )
    book, report = make_book(weather, KNOBS["book"], loggers["stuck_wind"])
    out["book.json"] = as_json(book)
    return out, report


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--out", type=Path, default=Path(__file__).parent)
    folder = parser.parse_args().out
    folder.mkdir(parents=True, exist_ok=True)
    files, report = make_all()
    for name, data in files.items():
        (folder / name).write_bytes(data)
        print(f"{name}  {len(data):,} bytes")
    print("\n".join(report))


if __name__ == "__main__":
    main()
