"""Rows in file order to rows by instant: sorted, and each instant once."""

import numpy as np

from app.intake.fold import last_given
from app.intake.model import Floats, Instants, Ints, Rows
from app.intake.report import Report


def tidy(
    instant: Instants, line: Ints, values: dict[str, Floats], interval_s: int, report: Report
) -> Rows:
    """Sorted, unique rows; the same instant twice is counted, and warned of where values differ."""
    steps = np.diff(instant)
    falling = int(np.count_nonzero(steps < 0))
    if falling:
        report.counts.out_of_order = falling
        _warn_order(steps, line, falling, report)
    if np.any(steps <= 0):
        order = np.argsort(instant, kind="stable")
        instant, line = instant[order], line[order]
        for name in values:
            values[name] = values[name][order]
        instant, line, values = _once(instant, line, values, report)
    _warn_step(instant, line, interval_s, report)
    report.counts.rows = int(instant.size)
    return Rows(instant, line, np.full(instant.size, interval_s, np.int32), values)


def _warn_order(steps: Instants, line: Ints, falling: int, report: Report) -> None:
    at = int(np.flatnonzero(steps < 0)[0]) + 1
    whole = falling > 0.5 * steps.size
    why = "the file runs from new to old" if whole else "earlier than the line before it"
    report.add(int(line[at]), "(line)", "", why, "Nothing to do: the rows were sorted.", "warning")


def _once(
    instant: Instants, line: Ints, values: dict[str, Floats], report: Report
) -> tuple[Instants, Ints, dict[str, Floats]]:
    starts = np.flatnonzero(np.r_[True, np.diff(instant) != 0])
    if starts.size == instant.size:
        return instant, line, values
    group = np.cumsum(np.r_[False, np.diff(instant) != 0])
    last = np.r_[starts[1:], instant.size] - 1
    differs = np.zeros(instant.size, bool)
    for name, column in values.items():
        winner = last_given(column, starts)
        differs |= ~np.isnan(column) & (column != winner[group])
        values[name] = winner
    extra = np.ones(instant.size, bool)
    extra[last] = False
    report.counts.duplicates_differing = int(np.count_nonzero(differs & extra))
    report.counts.duplicates_same = int(np.count_nonzero(extra)) - int(
        report.counts.duplicates_differing
    )
    lost = np.sort(line[differs & extra])
    report.add_lines(
        lost,
        "(line)",
        [""] * lost.size,
        "the same instant stands further down with other values",
        "The later line was taken. If both are right, check the logger's clock.",
        "warning",
    )
    return instant[starts], line[last], values


def _warn_step(instant: Instants, line: Ints, interval_s: int, report: Report) -> None:
    steps = np.diff(instant)
    if steps.size == 0:
        return
    found, count = np.unique(steps, return_counts=True)
    usual = int(found[np.argmax(count)])
    if usual == interval_s or count.max() < 0.5 * steps.size:
        return
    at = int(np.flatnonzero(steps == usual)[0]) + 1
    report.add(
        int(line[at]),
        "(step)",
        f"{usual} s",
        f"most rows are {usual} s apart, the mapping says {interval_s} s",
        "Correct the step in the mapping if sums (rain, energy) look wrong.",
        "warning",
    )
