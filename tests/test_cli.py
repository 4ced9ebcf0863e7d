"""The commands as a person types them: a real process, a real database, clear words."""

import csv
import io
import json
import os
import signal
import socket
import subprocess
import sys
import tempfile
from copy import deepcopy
from datetime import timedelta
from pathlib import Path
from typing import Any

import pytest

import app.demo
from app import handbook
from app.wording import CAUTION
from tests.workflows import basin


class Shell:
    """Runs `rillbook` in a folder of its own, on the day of the basin."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    def run(self, *words: str, code: int = 0, typed: str = "") -> subprocess.CompletedProcess[str]:
        """Run a command; its exit code must be `code`."""
        environment = {
            **os.environ,
            "RILLBOOK_DATABASE": f"sqlite:///{self.folder / 'book.sqlite'}",
            "RILLBOOK_TODAY": str(basin.TODAY),
            "RILLBOOK_MAIL_FOLDER": str(self.folder / "mail"),
            "PYTHONWARNINGS": "error",
        }
        done = subprocess.run(
            [sys.executable, "-m", "app.cli", *words],
            capture_output=True,
            text=True,
            env=environment,
            timeout=60,
            input=typed,
        )
        assert done.returncode == code, done.stdout + done.stderr
        assert "Traceback" not in done.stderr
        return done

    def json(self, *words: str) -> Any:
        """What a command prints with --json."""
        return json.loads(self.run(*words, "--json").stdout)


@pytest.fixture
def shell(tmp_path: Path) -> Shell:
    (tmp_path / "book.json").write_text(json.dumps(basin.BOOK))
    (tmp_path / "bench.csv").write_bytes(basin.daily_csv())
    (tmp_path / "meadow.csv").write_bytes(basin.daily_csv())
    return Shell(tmp_path)


def test_the_main_job_by_command(shell: Shell) -> None:
    folder = shell.folder
    assert shell.json("load", str(folder / "book.json"))["added"]["fields"] == 2
    assert shell.json("load", str(folder / "book.json"))["added"] == {}
    preview = shell.json("intake", "bench", str(folder / "bench.csv"), "--preview")
    assert preview["rows_accepted"] == 122
    applied = shell.json("intake", "bench", str(folder / "bench.csv"))
    assert applied["rows"] == 122
    assert applied["blocks"] == 3
    shell.run("intake", "meadow", str(folder / "meadow.csv"))
    assert "nothing changed" in shell.run("intake", "bench", str(folder / "bench.csv")).stdout
    advised = shell.json("advise")
    assert advised["on"] == str(basin.TODAY)
    assert sum(advised["standing"].values()) == 3

    ledger = rows(shell.run("export", "ledger", "--field", "long-piece").stdout)
    assert ledger[0]["date"] == "2026-04-20"
    assert ledger[-1]["date"] == str(basin.TODAY - timedelta(days=1))
    days = rows(shell.run("export", "station-days", "--station", "bench").stdout)
    assert len(days) == 122
    assert float(days[0]["tmax"]) == pytest.approx(9.0, abs=6)
    advice = rows(shell.run("export", "advice", "--on", str(basin.TODAY)).stdout)
    assert [(row["field"], row["block"]) for row in advice] == [
        ("Long Piece", ""),
        ("Two Halves", "Upper"),
        ("Two Halves", "Lower"),
    ]
    assert "block" not in ledger[0]


def test_letters_are_looked_at_and_sent_to_a_folder(shell: Shell) -> None:
    reader = {"name": "Ana Reed", "address": "ana@example.org", "language": "es"}
    reader |= {"weekday": "wednesday", "hour": 6}
    book = deepcopy(basin.BOOK)
    book["farms"][0]["recipients"] = [reader]
    (shell.folder / "book.json").write_text(json.dumps(book))
    shell.run("load", str(shell.folder / "book.json"))
    for station in ("bench", "meadow"):
        shell.run("intake", station, str(shell.folder / f"{station}.csv"))
    shell.run("advise")
    on = ("letters", "--on", str(basin.TODAY))
    seen = shell.run(*on, "--preview").stdout
    assert "Reed Farm, to Ana Reed <ana@example.org>: draft" in seen
    assert "Semana del 1 de julio" in seen
    assert "\ufffd" not in seen
    waits = shell.run(*on, "--send").stdout
    assert "0 sent" in waits
    assert "1 draft; see the Letters page, or --release" in waits
    assert shell.json(*on, "--send", "--release")["sent"] == 1
    assert shell.json(*on, "--send", "--release")["sent"] == 0
    (file,) = (shell.folder / "mail").iterdir()
    assert b"Content-Language: es" in file.read_bytes()
    assert "say either" in shell.run(*on, code=1).stderr
    assert "No letter is due" in shell.run(*on, "--preview").stdout


def rows(text: str) -> list[dict[str, str]]:
    """The rows of an export, whose header carries the caution."""
    head, caution, *lines = text.splitlines(keepends=True)
    assert head.startswith("# ")
    assert caution == f"# {CAUTION}\n"
    return list(csv.DictReader(io.StringIO("".join(lines))))


def test_an_export_to_a_file_is_whole(shell: Shell) -> None:
    shell.run("load", str(shell.folder / "book.json"))
    shell.run("intake", "bench", str(shell.folder / "bench.csv"))
    out = shell.folder / "out.csv"
    shell.run("export", "station-days", "--station", "bench", "--out", str(out))
    assert len(out.read_text().splitlines()) == 125
    assert sorted(path.name for path in shell.folder.glob("*out*")) == ["out.csv"]
    for place in (shell.folder, shell.folder / "none" / "out.csv"):
        words = ("export", "station-days", "--station", "bench", "--out", str(place))
        assert "folder" in shell.run(*words, code=1).stderr


def test_the_schema_is_a_json_schema_of_a_book(shell: Shell) -> None:
    schema = json.loads(shell.run("schema").stdout)
    assert schema["type"] == "object"
    assert {"stations", "fields", "seasons"} <= set(schema["properties"])


def test_the_schema_names_what_the_handbook_has(shell: Shell) -> None:
    parts = json.loads(shell.run("schema").stdout)["$defs"]
    for part, name, known in (
        ("SeasonPart", "crop", handbook.crops()),
        ("LayerPart", "texture", handbook.soil_textures()),
        ("SystemPart", "wetting", handbook.wettings()),
    ):
        choices = parts[part]["properties"][name]["oneOf"]
        assert {choice["const"] for choice in choices if "const" in choice} == set(known)
    assert {"type": "null"} in parts["LayerPart"]["properties"]["texture"]["oneOf"]


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (["load", "none.json"], "cannot be read"),
        (["export", "ledger", "--field", "none"], "no field 'none'"),
        (["advise", "--on", "14.7.2026"], "write a date as 2026-07-14"),
        (["export", "station-days", "--station", "none"], "no station 'none'"),
        (["intake", "bench", "none.csv"], "none.csv: No such file or directory"),
    ],
)
def test_bad_input_is_one_line_and_exit_1(shell: Shell, words: list[str], says: str) -> None:
    done = shell.run(*words, code=1)
    assert says in done.stderr
    said = [line for line in done.stderr.splitlines() if "A new, empty database" not in line]
    assert len(said) == 1


def test_a_station_that_is_not_there_names_those_that_are(shell: Shell) -> None:
    shell.run("load", str(shell.folder / "book.json"))
    done = shell.run("intake", "bemch", str(shell.folder / "bench.csv"), code=1)
    assert "bench, meadow" in done.stderr
    for words, says in (
        (("station-days", "--station", "bemch"), "no station 'bemch'; near: bench"),
        (("ledger", "--field", "piece"), "no field 'piece'; near: long-piece"),
        (("ledger", "--field", "two-halves", "--block", "x"), "its blocks are: upper, lower"),
    ):
        assert says in shell.run("export", *words, code=1).stderr


def test_what_a_file_leaves_open_is_asked_and_answered_by_a_mapping(shell: Shell) -> None:
    folder = shell.folder
    shell.run("load", str(folder / "book.json"))
    lines = ["date,tmax (degC),tmin (degC),wind"]
    lines += [f"2026-05-{day:02},20,5,{2 + day % 3}" for day in range(1, 11)]
    path = folder / "open.csv"
    path.write_text("\n".join(lines) + "\n")
    refused = shell.run("intake", "bench", str(path), code=1).stderr
    assert "needs an answer" in refused
    assert "m/s" in refused
    preview = shell.run("intake", "bench", str(path), "--preview").stdout
    assert "date: says when" in preview
    assert "No row can be read" in preview
    seen = shell.json("intake", "bench", str(path), "--preview")
    wind = next(column for column in seen["mapping"]["columns"] if column["name"] == "wind")
    wind["unit"] = "m/s"
    for whole in (seen, seen["mapping"]):
        (folder / "mapping.json").write_text(json.dumps(whole))
        words = ("intake", "bench", str(path), "--mapping", str(folder / "mapping.json"))
        assert shell.json(*words, "--preview")["rows_accepted"] == 10
    applied = shell.json(*words)
    assert applied["rows"] == 10
    assert applied["first_day"] == "2026-05-01"


def test_rows_dated_after_now_are_taken_only_if_said_so(shell: Shell) -> None:
    shell.run("load", str(shell.folder / "book.json"))
    path = shell.folder / "ahead.csv"
    path.write_text("date,tmax (degC),tmin (degC)\n2125-05-01,20,5\n2125-05-02,21,9\n")
    refused = shell.run("intake", "bench", str(path), code=1).stderr
    assert "ahead.csv: 2 rows are dated after now" in refused
    assert "(line 2)" in refused
    assert "--ahead" in refused
    assert shell.json("intake", "bench", str(path), "--ahead")["rows"] == 2


def test_what_a_file_leaves_open_is_answered_by_a_word(shell: Shell) -> None:
    folder = shell.folder
    shell.run("load", str(folder / "book.json"))
    path = folder / "open.csv"
    path.write_text("date,tmax (degC),tmin (degC)\n1/5/2026,20,5\n2/5/2026,21,99\n3/5/2026,22,6\n")
    said = ("intake", "bench", str(path), "--answer")
    for wrong, says in (("dmy", "FIELD=VALUE"), ("time.order=x", "'dmy' or 'mdy'")):
        assert says in shell.run(*said, wrong, code=1).stderr
    taken = shell.run(*said, "time.order=dmy").stdout
    assert "3 rows" in taken
    assert "from 2026-05-01" in taken
    assert "line 3, tmin (degC), '99': impossible" in taken


def test_a_port_that_is_taken_is_told_before_anything_is_filled(shell: Shell) -> None:
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = taken.getsockname()[1]
        assert f"port {port}" in shell.run("demo", "--port", str(port), code=1).stderr
        assert f"port {port}" in shell.run("serve", "--port", str(port), code=1).stderr


def test_wrong_settings_say_how_to_mend_them(tmp_path: Path) -> None:
    for name, value in (
        ("RILLBOOK_TODAY", "14.7.2026"),
        ("RILLBOOK_TODAY", "0001-01-01"),
        ("RILLBOOK_DATABASE", "mysql://x"),
    ):
        done = subprocess.run(
            [sys.executable, "-m", "app.cli", "advise"],
            capture_output=True,
            text=True,
            env={**os.environ, name: value},
            cwd=Path(__file__).parent.parent,
        )
        assert done.returncode == 1
        assert name in done.stderr


def test_a_database_is_said_to_be_new_and_one_that_is_none_is_refused(shell: Shell) -> None:
    assert "A new, empty database" in shell.run("advise").stderr
    assert shell.run("advise").stderr == ""
    (shell.folder / "book.sqlite").write_bytes(b"no database at all" * 100)
    assert "cannot be opened: file is not a database" in shell.run("advise", code=1).stderr


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGHUP])
def test_a_demo_that_is_stopped_leaves_nothing(
    number: signal.Signals, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    monkeypatch.setattr(app.demo, "fill", lambda _db: signal.raise_signal(number))
    before = [signal.getsignal(stop) for stop in (signal.SIGTERM, signal.SIGHUP)]
    try:
        with pytest.raises(SystemExit):
            app.demo.run_demo(8000, serve=False)
    finally:
        signal.signal(signal.SIGTERM, before[0])
        signal.signal(signal.SIGHUP, before[1])
    assert list(tmp_path.iterdir()) == []


def test_a_files_names_do_not_steer_the_terminal(shell: Shell, tmp_path: Path) -> None:
    path = tmp_path / "odd.csv"
    lines = [f"2026-06-01 {hour:02}:00,20,50" for hour in range(10)]
    path.write_text("\n".join(["time,\033[31mAir temperature (degC)\033]0;x\007,RH (%)", *lines]))
    shell.run("load", str(shell.folder / "book.json"))
    seen = shell.run("intake", "bench", str(path), "--preview")
    assert "Air temperature" in seen.stdout
    assert not {"\033", "\007"} & set(seen.stdout + seen.stderr)


def test_the_first_admin_is_made_here_and_only_then_others_may_come(shell: Shell) -> None:
    refused = shell.run("serve", "--host", "0.0.0.0", "--port", "0", code=1).stderr
    assert "rillbook user add" in refused
    words = ("user", "add", "ada@example.org", "--name", "Ada Reed")
    assert "12 to 200" in shell.run(*words, code=1, typed="short\n").stderr
    assert "no farm" in shell.run(*words, "--farm", "nowhere", code=1, typed="x\n").stderr
    said = shell.run(*words, typed="seven brown herons\n").stdout
    assert "can sign in as admin" in said
    assert "already" in shell.run(*words, code=1, typed="seven brown herons\n").stderr
    (account,) = shell.json("user", "list")["accounts"]
    assert account["role"] == "admin"
    assert account["state"] == "open"
    assert "/link/" in shell.run("user", "link", "ada@example.org").stdout
    assert "only admin" in shell.run("user", "stop", "ada@example.org", code=1).stderr
    refused = shell.run("serve", "--host", "0.0.0.0", "--port", "0", code=1).stderr
    assert "RILLBOOK_URL" in refused
