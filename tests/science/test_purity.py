"""The science rooms compute and do nothing else: no files, no printing, no clock, no hidden chance.

Source: our own rule (regression). Read from the syntax tree, so nothing has to run.
"""

import ast
from pathlib import Path

import pytest

import app.science

ROOM = Path(app.science.__file__).parent
MODULES = sorted(ROOM.rglob("*.py"))

CALLS = {"open", "print", "input", "exec", "eval", "breakpoint", "__import__"}
# Modules that reach outside, tell the time, or draw lots. numpy.random is judged by its calls.
IMPORTS = {
    *("asyncio", "ctypes", "datetime", "http", "io", "json", "logging"),
    *("multiprocessing", "os", "pandas", "pathlib", "pickle", "pint", "random", "requests"),
    *("secrets", "shutil", "socket", "sqlalchemy", "sqlite3", "subprocess", "sys", "tempfile"),
    *("threading", "time", "urllib", "uuid", "zoneinfo"),
}
ATTRIBUTES = {"now", "today", "utcnow", "loadtxt", "genfromtxt", "fromfile", "tofile", "savetxt"}
# makers of a generator, each only with a seed or a generator's state passed in
SEEDED = {"default_rng", "Generator", "SeedSequence", "PCG64", "PCG64DXSM", "Philox"}


def offences(source: str) -> list[str]:
    """What a module's source does that science may not, as `line: what`."""
    found = []
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
            found += [f"{node.lineno}: import {n}" for n in names if n.split(".")[0] in IMPORTS]
        elif isinstance(node, ast.ImportFrom) and node.module:
            if node.module.split(".")[0] in IMPORTS:
                found.append(f"{node.lineno}: from {node.module}")
        elif isinstance(node, ast.Call):
            found += _calls(node)
        elif isinstance(node, ast.Attribute) and node.attr in ATTRIBUTES:
            found.append(f"{node.lineno}: .{node.attr}")
    return found


def _calls(node: ast.Call) -> list[str]:
    name = ast.unparse(node.func)
    if name in CALLS:
        return [f"{node.lineno}: {name}()"]
    if name.startswith(("np.random.", "numpy.random.")):
        seeded = name.rsplit(".", 1)[-1] in SEEDED and (node.args or node.keywords)
        return [] if seeded else [f"{node.lineno}: {name}() without a seed"]
    first = node.args[0] if node.args else None
    clock = isinstance(first, ast.Constant) and first.value in {"now", "today"}
    return [f"{node.lineno}: {name}({first.value!r})"] if clock else []


@pytest.mark.parametrize("path", MODULES, ids=lambda p: str(p.relative_to(ROOM)))
def test_module_is_pure(path: Path) -> None:
    assert offences(path.read_text(encoding="utf-8")) == []


def test_rooms_are_found() -> None:
    """The list above is not empty by accident."""
    assert {"quantities.py", "constants.py"} <= {path.name for path in MODULES}
    assert len(MODULES) > 15


@pytest.mark.parametrize(
    "line",
    [
        "open('x')",
        "print(1)",
        "import time",
        "import os.path",
        "from datetime import date",
        "from pathlib import Path",
        "import pandas as pd",
        "np.random.default_rng()",
        "np.random.PCG64()",
        "np.random.normal(0.0, 1.0)",
        "np.random.seed(1)",
        "np.datetime64('now')",
        "np.datetime64('today')",
        "np.loadtxt('x')",
        "clock.now()",
    ],
)
def test_offence_is_seen(line: str) -> None:
    assert offences(line)


@pytest.mark.parametrize(
    "line",
    [
        "rng = np.random.default_rng(seed)",
        "def draw(rng: np.random.Generator): return rng.normal(size=3)",
        "day = np.datetime64('2024-03-01')",
        "from dataclasses import dataclass",
    ],
)
def test_honest_line_passes(line: str) -> None:
    assert offences(line) == []
