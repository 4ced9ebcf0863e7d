"""A file of 100 MB goes in, whole, within 500 MB of memory."""

import json
import os
import subprocess
import sys
from datetime import datetime, timedelta
from pathlib import Path

MEGABYTE = 1024 * 1024
HEADER = (
    "time,air temp (degC),rh (%),wind (m/s),shortwave down (W/m2),shortwave up (W/m2),"
    "longwave down (W/m2),longwave up (W/m2),rain (mm),pressure (kPa),dew point (degC),"
    "battery (V),panel (degC)\n"
)
STATION = {
    "key": "ridge", "name": "Ridge", "latitude_deg": 40, "longitude_deg": -100,
    "elevation_m": 800, "utc_offset_h": -7,
}  # fmt: skip
# The process's own peak: getrusage would count the memory of the process it was started from.
MEASURE = """
import resource, sys
from pathlib import Path
from app.cli import main
try:
    main()
finally:
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    status = Path("/proc/self/status")
    if status.exists():
        lines = status.read_text().splitlines()
        peak = next(int(line.split()[1]) for line in lines if line.startswith("VmHWM"))
    print("peak", peak, file=sys.stderr)
"""


def minutes(day: datetime) -> list[str]:
    """What a day's rows hold after the time: figures that differ from minute to minute."""
    rows = []
    for n in range(1440):
        sun = max(0.0, 900 - 2.6 * abs(n - 720))
        air = 14 + 9 * sun / 900 + day.day % 7 * 0.3
        rows.append(
            f",{air:.2f},{62 - sun / 30:.1f},{2.1 + n % 7 / 10:.2f},{sun:.2f},{0.23 * sun:.2f},"
            f"{310 + air:.2f},{390 + 4 * air:.2f},0.0,92.50,{6 + n % 5 / 10:.2f},12.61,{air:.2f}\n"
        )
    return rows


def write_100_mb(path: Path) -> int:
    """Minute rows until 100 MB are full; returns how many."""
    day, written, rows = datetime(2024, 1, 1), 0, 0
    with path.open("w") as file:
        written += file.write(HEADER)
        while written < 100 * MEGABYTE:
            for n, rest in enumerate(minutes(day), 1):
                written += file.write(f"{day + timedelta(minutes=n):%Y-%m-%d %H:%M:%S}{rest}")
                rows += 1
            day += timedelta(days=1)
    return rows


def test_100_mb_go_in_within_500_mb(tmp_path: Path) -> None:
    rows = write_100_mb(tmp_path / "ridge.csv")
    (tmp_path / "book.json").write_text(json.dumps({"stations": [STATION]}))
    environment = {
        **os.environ,
        "RILLBOOK_DATABASE": f"sqlite:///{tmp_path / 'book.sqlite'}",
        "RILLBOOK_TODAY": "2027-01-01",
    }

    def run(*words: str) -> tuple[dict[str, object], float]:
        done = subprocess.run(
            [sys.executable, "-c", MEASURE, *words, "--json"],
            capture_output=True,
            text=True,
            env=environment,
            cwd=Path(__file__).parents[2],
        )
        assert done.returncode == 0, done.stderr
        unit = 1 if sys.platform == "darwin" else 1024
        return json.loads(done.stdout), float(done.stderr.split()[-1]) * unit / MEGABYTE

    run("load", str(tmp_path / "book.json"))
    applied, peak = run("intake", "ridge", str(tmp_path / "ridge.csv"))
    assert applied["rows"] == rows
    assert applied["days_changed"] == rows // 1440
    assert peak < 500
    again, peak = run("intake", "ridge", str(tmp_path / "ridge.csv"))
    assert again["already_here"]
    assert peak < 500
