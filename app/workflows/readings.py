"""Readings of soil water correct the ledgers they fall into, each in its turn.

A reading is weighed against the ledger as it stands with the readings before it; its shift is that
day's correction. Blocks without readings are not computed twice.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date
from typing import Any

import numpy as np

from app.science.ledger import block_ledgers, ensemble_depletions
from app.science.soil.correction import (
    Correction,
    correct,
    corrected_close,
    depletion_at,
    spread_of_range,
)
from app.science.soil.profile import Profile
from app.science.soil.readings import (
    UNCALIBRATED,
    DepthReading,
    by_content,
    by_count_ratio,
    by_tension,
    gravimetric,
    measured_depletion,
)
from app.workflows.assemble import Subject

MEMBERS = 200


@dataclass(frozen=True)
class Taken:
    """What a reading did: the event it is, the day whose close it corrects, and how it was
    weighed."""

    event_id: int
    close: date
    correction: Correction


def corrected(
    subjects: Sequence[Subject], seeds: Sequence[int]
) -> tuple[list[Subject], dict[int, list[Taken]]]:
    """Subjects with the corrections of their readings, and by place what each reading did."""
    found = list(subjects)
    taken: dict[int, list[Taken]] = {}
    turn = 0
    while places := [n for n, one in enumerate(found) if len(one.readings) > turn]:
        plans = [found[n].plan for n in places]
        weather = [found[n].weather for n in places]
        ledgers = block_ledgers(plans, weather)
        ranges = ensemble_depletions(
            plans,
            weather,
            [seeds[n] for n in places],
            MEMBERS,
            initial_unknown=[found[n].opening_unknown for n in places],
            initial_width_mm=[found[n].opening_width_mm for n in places],
        )
        for n, ledger, (low, high) in zip(places, ledgers, ranges, strict=True):
            subject = found[n]
            reading = subject.readings[turn]
            day = int((np.datetime64(reading.day, "D") - ledger.date[0]).astype(np.int64))
            close = corrected_close(np.datetime64(reading.day, "D"), reading.details["hour"])
            at = int((close - ledger.date[0]).astype(np.int64))
            if not 0 <= at < ledger.date.size or day >= ledger.date.size:
                continue
            before = ledger.depletion_mm[day - 1] if day else ledger.opening_depletion_mm
            measured = measured_depletion(
                depths_of(reading.details, subject.plan.profile),
                subject.plan.profile,
                float(ledger.root_depth_m[at]),
                root_wetted_fraction=subject.plan.root_wetted_fraction,
            )
            told = correct(
                depletion_at(
                    reading.details["hour"], float(before), float(ledger.depletion_mm[day])
                ),
                spread_of_range(float(low[at]), float(high[at])),
                measured,
                trust=reading.details["trust"],
            )
            correction = np.zeros(subject.plan.days)
            if subject.plan.correction is not None:
                correction += subject.plan.correction
            correction[at] += told.correction_mm
            found[n] = replace(subject, plan=replace(subject.plan, correction=correction))
            taken.setdefault(n, []).append(
                Taken(reading.event_id, date.fromisoformat(str(close)), told)
            )
        turn += 1
    return found, taken


def depths_of(details: dict[str, Any], profile: Profile) -> list[DepthReading]:
    """The depths of a reading as water contents, by its method."""
    found = []
    for part in details["depths"]:
        depth, value = part["depth_m"], part["value"]
        error = part["error"] or UNCALIBRATED
        if details["method"] == "tension":
            found.append(by_tension(depth, value, profile, curve_error=error))
            continue
        if details["method"] == "gravimetric":
            value = float(gravimetric(value, details["bulk_density"]))
        elif details["method"] == "neutron":
            value = float(by_count_ratio(value, details["slope"], details["intercept"]))
        found.append(by_content(depth, min(max(value, 0.0), 1.0), error=error))
    return found
