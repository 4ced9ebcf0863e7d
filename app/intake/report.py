"""Collects what was not taken: runs of lines merged, the list bounded, everything counted."""

from collections.abc import Sequence
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from app.intake.model import Counts, Ints, Problem

MOST_LISTED = 1000
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

    def problems(self) -> tuple[Problem, ...]:
        """All listed problems, by line."""
        return tuple(sorted(self._problems, key=lambda p: (p.line, p.column)))
