"""A wheel built from the project runs the demo in an empty folder outside the clone."""

import subprocess
import sys
import sysconfig
import zipfile
from pathlib import Path

import pytest

CLONE = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The project's wheel, built without asking any registry."""
    folder = tmp_path_factory.mktemp("wheel")
    built = subprocess.run(
        [sys.executable, "-m", "hatchling", "build", "-t", "wheel", "-d", str(folder)],
        cwd=CLONE,
        capture_output=True,
        text=True,
    )
    assert built.returncode == 0, built.stderr
    return next(folder.glob("rillbook-*.whl"))


def test_what_the_program_needs_travels_in_the_wheel(wheel: Path) -> None:
    names = set(zipfile.ZipFile(wheel).namelist())
    for name in (
        "app/_packaged/templates/base.html",
        "app/_packaged/migrations/env.py",
        "app/_packaged/demo_data/book.json",
        "app/handbook/crops.csv",
    ):
        assert name in names
    assert any(name.startswith("app/_packaged/static/") for name in names)
    assert not any(name.startswith("tests/") for name in names)


def test_the_demo_runs_from_the_wheel_alone(wheel: Path, tmp_path: Path) -> None:
    """The general libraries come from this environment; `app` only from the wheel."""
    made = subprocess.run(
        [sys.executable, "-m", "venv", "--without-pip", str(tmp_path / "venv")],
        capture_output=True,
    )
    assert made.returncode == 0
    site = next((tmp_path / "venv").glob("lib/python*/site-packages"))
    zipfile.ZipFile(wheel).extractall(site)
    (site / "libraries.pth").write_text(sysconfig.get_path("purelib") + "\n")
    python = tmp_path / "venv" / "bin" / "python"
    script = "import app, sys; print(app.__file__); from app.cli import main; main()"
    done = subprocess.run(
        [str(python), "-I", "-c", script, "demo", "--no-serve"],
        cwd=tmp_path,
        capture_output=True,
        text=True,
        timeout=120,
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith(str(site))
    assert "The demo basin fills" in done.stdout
