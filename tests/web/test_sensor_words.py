"""What the Station page says of sensors over months."""

from datetime import date, timedelta

import numpy as np
import pytest

from app.science.energy.drift import Drift, drift
from app.storage.database import Database
from app.web.sensor_words import verdicts
from app.workflows.sensor_health import Apart, Dryness, Health, Lean, sensor_health
from tests.workflows import basin
from tests.workflows.test_hourly_step import stations
from tests.workflows.test_station_days import RECORD, TODAY, take

GOOD = Lean(5, 20, 0.2, 0.1, 1.0, 1.0, 1.0)


def said(health: Health) -> dict[str, tuple[str, bool]]:
    return {verdict.name: (verdict.says, verdict.fault) for verdict in verdicts(health)}


def test_all_well_is_said_once_each() -> None:
    steady = drift(
        np.datetime64("2026-01-01") + np.arange(100), np.full(100, 1.0), np.ones(100, np.bool_)
    )
    told = said(Health(steady, GOOD, (), 2, None))
    assert told == {
        "drift": ("none seen; clear days changed by 0.0 % over 99 days", False),
        "lean": ("none seen, within 1.0°", False),
        "clear-day level": ("0.0 % against the clear days before", False),
        "clock": ("right within 5 minutes", False),
        "neighbours": ("agrees with its 2 neighbours in the last 30 days", False),
    }


def test_faults_carry_their_figures_and_what_to_do() -> None:
    falling = Drift(-0.007, 0.001, -0.04, 171, 60, "", True)
    lean = Lean(4, 20, 3.1, 0.1, 0.93, 1.0, -14.6)
    apart = Apart("shortwave_down", 3, date(2026, 7, 12), -8.2, -0.21)
    told = said(Health(falling, lean, (apart,), 2, None))
    assert told["drift"][0].startswith("clear days have changed by −4.0 % over 171 days, −0.70 %")
    assert told["lean"] == ("3.0° to the east, further than before: level it", True)
    assert told["clear-day level"][0].startswith("−7.0 % against the clear days before: clean")
    assert told["clock"] == ("15 minutes behind the sun: set it", True)
    assert "departed from theirs on 3 days of the last 30, last on 12 July" in told["neighbours"][0]
    assert "−21 % of clear sky" in told["neighbours"][0]


def test_a_cloudy_month_is_too_short_to_tell_of_drift(db: Database) -> None:
    """BSRN station Payerne, June 2016: the honest answer is that there are too few clear days."""
    stations(db, {"key": "mast", "reference_surface": True})
    take(db, "mast", RECORD.read_text())
    with db.read() as session:
        told = said(sensor_health(session, 1, TODAY))
    assert told["drift"][0].startswith("cannot be told:")
    assert "8 over 60 are needed" in told["drift"][0]
    assert told["neighbours"] == ("none within reach", False)


def test_a_dimmed_sensor_departs_from_its_neighbour(db: Database) -> None:
    basin.fill(db)
    first = basin.TODAY - timedelta(days=6)
    dim = [
        ",".join([*cells[:6], f"{0.6 * float(cells[6]):.2f}", cells[7]])
        if (cells := line.split(","))[0] >= str(first)
        else line
        for line in basin.daily_csv().decode().splitlines()[1:]
    ]
    head = basin.daily_csv().decode().splitlines()[0]
    basin.take(db, "bench", ("\n".join([head, *dim]) + "\n").encode())
    with db.read() as session:
        health = sensor_health(session, 1, basin.TODAY)
    (apart,) = [one for one in health.apart if one.quantity == "shortwave_down"]
    assert apart.days == 6
    assert apart.difference == pytest.approx(-0.35, abs=0.1)


def test_air_too_dry_for_watered_ground_is_told_with_its_figures() -> None:
    """ASCE-EWRI Appendix D and FAO-56 Annex 5: RHmax near saturation at dawn over watered ground,
    Tmin within a few degrees of the dew point (from memory)."""
    moist = said(Health(None, None, (), 0, None, Dryness(30, 92.0, 1.2)))["air"]
    assert moist == (
        "that of watered ground: RHmax 92 %, Tmin 1.2 °C above the dew point, medians of 30 days",
        False,
    )
    for dry in (Dryness(30, 71.0, 1.0), Dryness(30, 90.0, 5.4)):
        text, fault = said(Health(None, None, (), 0, None, dry))["air"]
        assert fault
        assert text.startswith("drier than over watered ground")


def test_the_air_of_a_real_month_is_judged(db: Database) -> None:
    """BSRN station Payerne, June 2016: over mown grass in a wet month."""
    stations(db, {"key": "mast", "reference_surface": True})
    take(db, "mast", RECORD.read_text())
    with db.read() as session:
        assert not said(sensor_health(session, 1, TODAY))["air"][1]
