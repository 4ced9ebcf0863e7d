"""Sensors watched: every planted fault is found, and the clean public records raise next to nothing
(hard at most 0.5 % of rows, soft at most 2 % of rows, days at most 1 in 30)."""

import numpy as np
import pytest

from app.science.energy.day_checks import Finding
from app.science.energy.sensor_faults import ALBEDO, SENSOR_FAULTS, sensor_faults
from app.science.energy.soft_checks import soft_row_checks
from app.science.energy.watch import ROW_FINDINGS, finding_words, watch_rows
from tests.science.energy.detection import (
    FAULTS,
    Fault,
    clean_alarms,
    drifts,
    found,
    frost,
    june,
    winter,
)
from tests.science.energy.planted import payerne_grid
from tests.science.energy.records import ALAMOSA, PAYERNE
from tests.science.energy.test_day_checks import SURFRAD_WARNING

pytestmark = pytest.mark.filterwarnings(SURFRAD_WARNING)
COUNTED = {"night_offset", "window_undecidable"}  # told, and no fault


@pytest.mark.parametrize("fault", FAULTS, ids=lambda f: f"{f.name}-{f.record.__name__}")
def test_planted_fault_is_found_on_every_day(fault: Fault) -> None:
    days, hits = found(fault)
    assert days > 0
    assert hits == days


@pytest.mark.parametrize("name", ["june", "winter"])
def test_clean_records_raise_next_to_nothing(name: str) -> None:
    told = clean_alarms(name)
    assert told["hard_rows"] <= 0.005
    assert told["soft_rows"] <= 0.02
    assert told["days_flagged"] == 0
    raised = {n: v for n, v in told.items() if n in ROW_FINDINGS and n not in COUNTED}
    assert raised == {}
    if name == "winter":
        assert told["night_offset"] == 1.0
    else:
        assert told["window_undecidable"] == 3.0


def test_verdicts_on_drift() -> None:
    """4 % over six months is found both ways; nothing clean is called drifting; a month with one
    clear day is too short to tell."""
    told = [told.reason or ("drifting" if told.drifting else "none") for told in drifts().values()]
    assert told == ["drifting", "drifting", "none", "none", "none", "few_clear_days"]


def by_name(findings: tuple[Finding, ...]) -> dict[str, Finding]:
    return {f.check: f for f in findings}


def test_what_a_hard_finding_sets_aside() -> None:
    site, rows, grid = june()
    swapped = grid | {
        "shortwave_down": grid["shortwave_up"],
        "shortwave_up": grid["shortwave_down"],
    }
    told = by_name(watch_rows(site, rows, swapped).findings)
    assert told["shortwave_swapped"].quantities == ("shortwave_down", "shortwave_up")
    albedo = grid["shortwave_up"].sum(axis=1) / grid["shortwave_down"].sum(axis=1)
    np.testing.assert_allclose(told["shortwave_swapped"].figure, 1.0 / albedo, rtol=0.05)
    net = told["net_rows_against_components"]
    assert net.quantities == ()  # a warning
    assert (net.figure > 0.0).all()


def test_albedo_against_the_declared_surface() -> None:
    _, rows, grid = june()
    assert sensor_faults(rows, grid, "reference grass") == []
    assert [f.check for f in sensor_faults(rows, grid, "water")] == ["albedo_against_surface"]
    snowed = grid | {"shortwave_up": 0.7 * grid["shortwave_down"]}
    told = by_name(tuple(sensor_faults(rows, snowed, "reference grass")))
    assert told["albedo_against_surface"].where.all()
    np.testing.assert_allclose(told["albedo_against_surface"].figure, 0.7)
    with pytest.raises(ValueError, match="surface is 'lawn'; it must be one of"):
        sensor_faults(rows, grid, "lawn")
    assert all(low < high for low, high in ALBEDO.values())


def test_net_sensor_that_went_wrong() -> None:
    _, rows, grid = june()
    off = grid | {"net_radiation": grid["net_radiation"] * 1.2 + 5.0}
    told = by_name(tuple(sensor_faults(rows, off)))
    assert told["net_rows_against_components"].where.all()


def test_frost_hours_widen_the_day() -> None:
    site, rows, grid = june()
    told = watch_rows(site, rows, frost(site, rows, grid))
    assert told.replaced is not None
    covered = told.rn_widening(29) > 0.0
    np.testing.assert_array_equal(covered, by_name(told.findings)["window_hours"].where)
    assert told.rn_widening(29).max() < 0.5
    clean = watch_rows(site, rows, {"shortwave_down": grid["shortwave_down"]})
    assert clean.rn_widening(29).tolist() == [0.0] * 29


def test_few_rows_say_nothing() -> None:
    site, rows, grid = june()
    gone = {name: np.where(np.arange(96) < 70, np.nan, v) for name, v in grid.items()}
    assert {f.check for f in watch_rows(site, rows, gone).findings} <= {"window_undecidable"}
    nothing = {name: np.full((29, 96), np.nan) for name in grid}
    assert watch_rows(site, rows, nothing).findings == ()
    assert watch_rows(site, rows, {}).findings == ()


def test_every_finding_has_words() -> None:
    for fault in FAULTS:
        assert fault.finding in ROW_FINDINGS
    assert finding_words("wind_stuck").startswith("wind was zero")
    assert set(SENSOR_FAULTS) <= set(ROW_FINDINGS)


# Soft checks of rows ----------------------------------------------------------------------------


def test_soft_checks_bite() -> None:
    rows, grid = payerne_grid()
    middle = rows.middle[:2].reshape(-1)
    flat = {name: v[:2].reshape(-1).copy() for name, v in grid.items()}
    noon, night = 44, 4
    flat["wind_speed"] = np.full(192, 0.2)
    flat["shortwave_down"][noon] = 1500.0
    flat["shortwave_down"][night] = -3.0
    flat["shortwave_up"][noon + 1] = 1.0
    flat["shortwave_down"][noon + 1] = 400.0
    flat["longwave_down"][noon] = 510.0
    flat["air_temperature"][100] += 9.0
    flat["relative_humidity"][50] = 2.0
    told = soft_row_checks(PAYERNE, middle, flat)
    assert np.flatnonzero(told["shortwave_down/rare"]).tolist() == [noon]
    assert np.flatnonzero(told["shortwave_down/offset"]).tolist() == [night]
    assert np.flatnonzero(told["shortwave_up/albedo"]).tolist() == [noon + 1]
    assert np.flatnonzero(told["longwave_down/rare"]).tolist() == [noon]
    assert np.flatnonzero(told["air_temperature/step"]).tolist() == [100, 101]
    assert np.flatnonzero(told["relative_humidity/very_dry"]).tolist() == [50]
    assert told["wind_speed/low"].sum() > 90
    assert soft_row_checks(PAYERNE, middle[:0], {"air_temperature": np.zeros(0)})
    missing = soft_row_checks(PAYERNE, middle, {"wind_speed": np.full(192, np.nan)})
    assert not missing["wind_speed/low"].any()
    with pytest.raises(ValueError, match="wind_speed has shape"):
        soft_row_checks(ALAMOSA, middle, {"wind_speed": np.zeros(3)})


def test_winter_minutes_are_counted_as_offset() -> None:
    site, rows, grid = winter()
    flat = {name: v.reshape(-1) for name, v in grid.items()}
    told = soft_row_checks(site, rows.middle.reshape(-1), flat)
    assert 0.2 < told["shortwave_down/offset"].mean() < 0.3
    assert not told["shortwave_down/rare"].any()
