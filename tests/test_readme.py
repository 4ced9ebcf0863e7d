"""README says what is so: its two lines, its commands, its pages."""

import re
from pathlib import Path

from typer.main import get_command

from app.cli import app

CLONE = Path(__file__).parents[1]
README = (CLONE / "README.md").read_text(encoding="utf-8")


def test_readme_gives_exactly_two_lines_to_copy() -> None:
    block = re.search(r"```\n(.*?)```", README, re.DOTALL)
    assert block is not None
    lines = block.group(1).splitlines()
    assert len(lines) == 2
    assert lines[0].startswith("python3 -m venv .venv")
    assert lines[0].endswith("rillbook demo")
    assert "pytest" in lines[1]


def test_ci_runs_the_test_line_of_the_readme() -> None:
    script = (CLONE / ".ci" / "run").read_text(encoding="utf-8")
    assert "grep -E '^python3 -m venv .*pytest' README.md" in script
    assert len(re.findall(r"^python3 -m venv .*pytest", README, re.MULTILINE)) == 1


def test_every_command_is_in_the_readme_and_no_other() -> None:
    command = get_command(app)
    names = set()
    for name, sub in command.commands.items():  # type: ignore[attr-defined]
        inner = getattr(sub, "commands", None)
        names |= {f"{name} {leaf}" for leaf in inner} if inner else {name}
    told = set(re.findall(r"^\| `rillbook ((?:export |user )?[a-z-]+)", README, re.MULTILINE))
    assert told == names


def test_every_file_named_in_the_documents_is_there() -> None:
    text = README + (CLONE / "DEVELOPERS.md").read_text(encoding="utf-8")
    named = set(
        re.findall(r"`((?:app|tests|templates|static|migrations|demo_data)/[\w./-]+\w)", text)
    )
    missing = sorted(name for name in named if not (CLONE / name.split(":")[0]).exists())
    assert missing == []
