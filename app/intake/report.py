"""Collects what was not taken: runs of lines merged, the list bounded, everything counted."""

from collections.abc import Sequence
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from app.intake.model import Counts, Ints, Problem, Rows

MOST_LISTED = 1000
MOST_MISSING = 20
Severity = Literal["refused", "warning", "asked"]


class Report:
    """Problems and counts of one reading."""

    def __init__(self) -> None:
        self.counts = Counts()
        self._problems: list[Problem] = []

    def add(
        self, line: int, column: str, value: str, why: str, remedy: str, severity: Severity
    ) -> None:
        """One line's problem."""
        lines = np.array([line], np.int32)
        self.add_lines(lines, column, [value], why, remedy, severity)

    def add_lines(
        self,
        lines: Ints,
        column: str,
        values: Sequence[str] | NDArray[np.str_],
        why: str,
        remedy: str,
        severity: Severity,
    ) -> None:
        """The same problem on several lines; lines next to each other become one entry."""
        if lines.size == 0:
            return
        starts = np.flatnonzero(np.r_[True, np.diff(lines) != 1])
        ends = np.r_[starts[1:], lines.size] - 1
        room = max(MOST_LISTED - len(self._problems), 0)
        self.counts.problems_not_listed += max(int(starts.size) - room, 0)
        for start, end in zip(starts[:room].tolist(), ends[:room].tolist(), strict=True):
            first, last = int(lines[start]), int(lines[end])
            self._problems.append(
                Problem(
                    first,
                    column,
                    str(values[start])[:80],
                    why,
                    remedy,
                    severity,
                    end - start + 1,
                    last if last != first else None,
                )
            )

    def add_missing(self, rows: Rows, names: dict[str, str]) -> None:
        """The longest runs of two or more rows without a value, by the file's column name."""
        runs: list[tuple[int, int, int, str]] = []
        for quantity, column in rows.values.items():
            absent = np.flatnonzero(np.isnan(column))
            if absent.size == 0 or absent.size == len(rows):
                continue
            starts = np.flatnonzero(np.r_[True, np.diff(absent) != 1])
            ends = np.r_[starts[1:], absent.size] - 1
            starts, ends = starts[ends > starts], ends[ends > starts]
            longest = np.argsort(starts - ends, kind="stable")[:MOST_MISSING]
            runs += [
                (int(absent[ends[i]] - absent[starts[i]] + 1), int(absent[starts[i]]),
                 int(absent[ends[i]]), names[quantity])
                for i in longest
            ]  # fmt: skip
        for count, first, last, name in sorted(runs, reverse=True)[:MOST_MISSING]:
            lines = sorted((int(rows.line[first]), int(rows.line[last])))
            self._problems.append(
                Problem(
                    lines[0],
                    name,
                    "",
                    "no value",
                    "Nothing to do: up to 2 h are bridged, beyond that the day says what it lacks.",
                    "warning",
                    count,
                    lines[1],
                )
            )

    def problems(self) -> tuple[Problem, ...]:
        """All listed problems, by line."""
        return tuple(sorted(self._problems, key=lambda p: (p.line, p.column)))
