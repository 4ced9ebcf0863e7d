"""What months say of a station's sensors, in sentences."""

from dataclasses import dataclass

from app import wording
from app.science.energy.drift import LEAST_CLEAR, LEAST_SPAN, Drift
from app.science.energy.tilt import CLOCK_MINUTES, LEAST_DAYS, LEVEL_SHARE, TILT_DEGREES
from app.workflows.sensor_health import RECENT_DAYS, Apart, Dryness, Health, Lean

LEAST_RH_MAX, MOST_ABOVE_DEW_POINT = 80.0, 3.0
"""At a reference site RHmax stays above the one [%], Tmin no more than the other above the dew
point [K] (ASCE-EWRI Appendix D, FAO-56 Annex 5, from memory; taken for medians, working value)."""


@dataclass(frozen=True)
class Verdict:
    """One question, its answer, and whether it calls for somebody to go there."""

    name: str
    says: str
    fault: bool = False


def verdicts(health: Health) -> list[Verdict]:
    """Drift, lean, clear-day level, clock and neighbours; what cannot be told is said so."""
    told = []
    if health.drift is not None:
        told.append(_drift(health.drift))
    if health.lean is not None:
        told += _lean(health.lean)
    if health.dryness is not None:
        told.append(_dryness(health.dryness))
    return [*told, *_neighbours(health)]


def _dryness(dryness: Dryness) -> Verdict:
    above = wording.number(dryness.above_dew_point, 1)
    figures = (
        f"RHmax {wording.number(dryness.rh_max)} %, Tmin {above} °C above the dew point, medians "
        f"of {wording.days(dryness.days)}"
    )
    dry = dryness.rh_max < LEAST_RH_MAX or dryness.above_dew_point > MOST_ABOVE_DEW_POINT
    if not dry:
        return Verdict("air", f"that of watered ground: {figures}")
    return Verdict(
        "air",
        f"drier than over watered ground: {figures}. Reference ET is then on the high side; see "
        "what lies around the station, and hold the humidity sensor against another",
        True,
    )


def _drift(drift: Drift) -> Verdict:
    if drift.reason:
        return Verdict(
            "drift",
            f"cannot be told: {wording.counted(drift.clear_days, 'clear day', 'clear days')} over "
            f"{wording.days(drift.span)}; {LEAST_CLEAR} over {LEAST_SPAN} are needed",
        )
    change = f"{wording.signed(100 * drift.change, 1)} % over {wording.days(drift.span)}"
    if not drift.drifting:
        return Verdict("drift", f"none seen; clear days changed by {change}")
    return Verdict(
        "drift",
        f"clear days have changed by {change}, {wording.signed(100 * drift.rate, 2)} % a month "
        f"(standard error {wording.number(100 * drift.error, 2)}): clean it, level it, or have it "
        "calibrated",
        True,
    )


def _lean(lean: Lean) -> list[Verdict]:
    few = wording.counted(lean.days, "clear day", "clear days")
    if lean.days < LEAST_DAYS:
        return [Verdict("lean", f"cannot be told: {few} in the last {RECENT_DAYS} days")]
    known = lean.before >= LEAST_DAYS
    off = lean.tilt - lean.usual_tilt if known else lean.tilt
    side = "east" if off > 0 else "west"
    than = "further than before" if known else "off level"
    fault = abs(off) >= TILT_DEGREES[known]
    told = [
        Verdict(
            "lean",
            f"{wording.number(abs(off), 1)}° to the {side}, {than}: level it"
            if fault
            else f"none seen, within {wording.number(TILT_DEGREES[known], 1)}°",
            fault,
        )
    ]
    if known:
        share = lean.level / lean.usual_level - 1.0
        fault = abs(share) >= LEVEL_SHARE[1]
        told.append(
            Verdict(
                "clear-day level",
                f"{wording.signed(100 * share, 1)} % against the clear days before"
                + (": clean the dome, see its level and factor" if fault else ""),
                fault,
            )
        )
    if lean.clock == lean.clock:
        fault = abs(lean.clock) >= CLOCK_MINUTES
        way = "ahead of" if lean.clock > 0 else "behind"
        told.append(
            Verdict(
                "clock",
                f"{wording.number(abs(lean.clock), 0)} minutes {way} the sun: set it"
                if fault
                else f"right within {wording.number(CLOCK_MINUTES, 0)} minutes",
                fault,
            )
        )
    return told


def _neighbours(health: Health) -> list[Verdict]:
    if not health.neighbours:
        return [Verdict("neighbours", "none within reach")]
    if not health.apart:
        count = wording.counted(health.neighbours, "neighbour", "neighbours")
        return [Verdict("neighbours", f"agrees with its {count} in the last {RECENT_DAYS} days")]
    return [Verdict("neighbours", _apart(one), True) for one in health.apart]


def _apart(apart: Apart) -> str:
    named = wording.word(wording.QUANTITIES, apart.quantity)
    figure = (
        f"{wording.signed(apart.difference, 1)} °C"
        if apart.quantity.startswith("air_temperature")
        else f"{wording.signed(100 * apart.difference, 0)} % of clear sky"
    )
    return (
        f"{named} departed from theirs on {wording.days(apart.days)} of the last {RECENT_DAYS}, "
        f"last on {wording.plain_day(apart.last)}: {figure} from the usual difference "
        f"({wording.number(abs(apart.spreads), 0)} spreads)"
    )
