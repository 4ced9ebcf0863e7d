"""Short ways to sniff and read a file in a test."""

import csv
import io
from pathlib import Path

import numpy as np

from app.intake import Clock, Mapping, Reading, Sniffed, answer, read, sniff

DATA = Path(__file__).parent.parent / "data" / "intake"
CLOCK = Clock(2.0, "Europe/Madrid")


def look(data: bytes, remembered: Mapping | None = None, clock: Clock = CLOCK) -> Sniffed:
    """First look at the bytes of a file."""
    return sniff(io.BytesIO(data), clock, remembered)


def take(data: bytes, answers: dict[str, str] | None = None, clock: Clock = CLOCK) -> Reading:
    """Sniff and read the bytes of a file, with answers to its questions."""
    mapping = answer(look(data, clock=clock).mapping, answers or {})
    return read(io.BytesIO(data), mapping, clock)


def instants(*texts: str) -> np.ndarray:
    """UTC seconds of ISO texts."""
    return np.array([np.datetime64(text, "s").astype(np.int64) for text in texts])


def truth(name: str = "truth.csv") -> dict[str, list[str]]:
    """Columns of a CSV of the values the layout files were written from."""
    with (DATA / name).open(encoding="utf-8") as file:
        rows = list(csv.reader(file))
    return {name: list(column) for name, *column in zip(*rows, strict=True)}
