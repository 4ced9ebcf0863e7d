"""Hard checks of rows: silent on clean real records, loud on faults planted into them.

Limits: Global Network recommended QC tests V2.0 (BSRN), ASCE-EWRI Appendix D. The faults are ours
(regression).
"""

from dataclasses import replace

import numpy as np
import pytest

from app.science.energy.checks import row_checks
from tests.science.energy.records import ALAMOSA, PAYERNE, Record, payerne_rows, surfrad_rows

pytestmark = [
    # pvlib 0.16 under pandas 3; nothing of ours
    pytest.mark.filterwarnings("ignore:The inplace keyword in DataFrame.rename is deprecated"),
]
NOON = int(np.datetime64("2016-06-15T11:37:30").astype("datetime64[s]").astype(np.int64))
NIGHT = int(np.datetime64("2016-06-15T23:37:30").astype("datetime64[s]").astype(np.int64))


def failed(instant: int, **values: float) -> set[str]:
    """Names of the checks that one row fails at Payerne."""
    arrays = {name: np.array([value], dtype=float) for name, value in values.items()}
    told = row_checks(PAYERNE, np.array([instant]), arrays)
    return {name for name, where in told.items() if where[0]}


def test_clean_month_passes() -> None:
    """BSRN Payerne, June 2016: four components, quality controlled; not one value is refused."""
    record = payerne_rows()
    told = row_checks(PAYERNE, record.middle, record.values)
    assert len(told) >= 15
    assert {name: int(where.sum()) for name, where in told.items() if where.any()} == {}


def test_clean_minutes_pass() -> None:
    """SURFRAD, 1 January 2016, one-minute records at 2317 m, night offsets down to -4 W m-2."""
    record = surfrad_rows()
    assert record.values["shortwave_down"].min() < -4.0
    told = row_checks(ALAMOSA, record.middle, record.values)
    assert {name: int(where.sum()) for name, where in told.items() if where.any()} == {}


def test_wrong_clock_is_noticed() -> None:
    """The same clean month, its clock half a day off, fails the possible limit every day."""
    record = payerne_rows()
    told = row_checks(PAYERNE, record.middle + 43_200, record.values)
    days = record.middle // 86400
    hit = np.unique(days[told["shortwave_down/possible"]])
    assert hit.size > 28


@pytest.mark.parametrize(
    ("instant", "values", "expected"),
    [
        (NIGHT, {"shortwave_down": -9.9}, set()),
        (NIGHT, {"shortwave_down": -10.1}, {"shortwave_down/possible"}),
        (NIGHT, {"shortwave_down": 101.0}, {"shortwave_down/possible"}),
        (NOON, {"shortwave_down": 1300.0}, set()),
        (NOON, {"shortwave_down": 1950.0}, {"shortwave_down/possible"}),
        (NIGHT, {"shortwave_up": 51.0}, {"shortwave_up/possible"}),
        (
            NOON,
            {"shortwave_down": 60.0, "shortwave_up": 200.0},
            {"shortwave_down/below_upward", "shortwave_up/above_downward"},
        ),
        (NOON, {"shortwave_down": 20.0, "shortwave_up": 30.0}, set()),  # too dim to tell
        (NOON, {"longwave_down": 39.0}, {"longwave_down/possible"}),
        (NOON, {"longwave_down": 701.0}, {"longwave_down/possible"}),
        (NOON, {"longwave_up": 901.0}, {"longwave_up/possible"}),
        # sigma Ta^4 at 20 degC is 418.8 W m-2
        (NOON, {"longwave_down": 443.0, "air_temperature": 20.0}, set()),
        (
            NOON,
            {"longwave_down": 445.0, "air_temperature": 20.0},
            {"longwave_down/against_air"},
        ),
        (
            NOON,
            {"longwave_down": 167.0, "air_temperature": 20.0},
            {"longwave_down/against_air"},
        ),
        (NOON, {"longwave_up": 574.0, "air_temperature": 20.0}, set()),
        (NOON, {"longwave_up": 583.0, "air_temperature": 20.0}, {"longwave_up/against_air"}),
        (NOON, {"longwave_up": 338.0, "air_temperature": 20.0}, {"longwave_up/against_air"}),
        (
            NOON,
            {"longwave_down": 200.0, "longwave_up": 501.0},
            {"longwave_down/against_upward", "longwave_up/against_downward"},
        ),
        (NIGHT, {"net_radiation": -301.0}, {"net_radiation/possible"}),
        (
            NIGHT,
            {"net_radiation": 150.0, "shortwave_down": -2.0},
            {"net_radiation/above_shortwave"},
        ),
        (NOON, {"relative_humidity": 105.0}, set()),
        (NOON, {"relative_humidity": 105.1}, {"relative_humidity/above_saturation"}),
        (
            NOON,
            {"dew_point": 22.0, "air_temperature": 20.0},
            {"dew_point/above_saturation"},
        ),
        (
            NOON,
            {"vapour_pressure": 2.6, "air_temperature": 20.0},
            {"vapour_pressure/above_saturation"},
        ),
        (
            NOON,
            {"shortwave_down": np.nan, "air_temperature": np.nan, "longwave_down": 300.0},
            set(),
        ),
    ],
)
def test_limits(instant: int, values: dict[str, float], expected: set[str]) -> None:
    assert failed(instant, **values) == expected


def with_fault(name: str, where: np.ndarray, value: float) -> Record:
    clean = payerne_rows()
    values = dict(clean.values)
    values[name] = np.where(where, value, values[name])
    return Record(clean.middle, values)


@pytest.mark.parametrize("name", ["air_temperature", "longwave_down"])
def test_stuck_all_day(name: str) -> None:
    """A sensor that repeats one value through a local day is refused for that day only."""
    middle = payerne_rows().middle
    local_day = (middle + 3600) // 86400
    stuck = local_day == local_day[96 * 10]
    record = with_fault(name, stuck, 300.0 if name == "longwave_down" else 17.0)
    told = row_checks(PAYERNE, middle, record.values)
    np.testing.assert_array_equal(told[f"{name}/stuck"], stuck)


def test_wind_zero_all_day_but_not_all_night() -> None:
    middle = payerne_rows().middle
    local_day = (middle + 3600) // 86400
    hour = (middle + 3600) % 86400 // 3600
    wind = 1.0 + 0.1 * (np.arange(middle.size) % 7)
    dead = local_day == local_day[96 * 5]
    calm = (local_day == local_day[96 * 8]) & (hour < 9)
    told = row_checks(PAYERNE, middle, {"wind_speed": np.where(dead | calm, 0.0, wind)})
    np.testing.assert_array_equal(told["wind_speed/stuck"], dead)


def test_dead_pyranometer_and_polar_night() -> None:
    """Zero all day under the sun is a fault; under no sun it is the truth."""
    middle = payerne_rows().middle[92 : 92 + 96]  # 2 June, local
    dark = {"shortwave_down": np.zeros(96)}
    assert row_checks(PAYERNE, middle, dark)["shortwave_down/stuck"].all()
    south_pole = replace(PAYERNE, latitude_deg=-85.0)
    assert not row_checks(south_pole, middle, dark)["shortwave_down/stuck"].any()


def test_shape_is_checked_by_name() -> None:
    with pytest.raises(ValueError, match="wind_speed has shape"):
        row_checks(PAYERNE, np.arange(3), {"wind_speed": np.zeros(2)})


def test_nothing_in_nothing_out() -> None:
    assert row_checks(PAYERNE, np.arange(3), {}) == {}
    empty = row_checks(PAYERNE, np.zeros(0, dtype=np.int64), {"wind_speed": np.zeros(0)})
    assert empty["wind_speed/stuck"].shape == (0,)
