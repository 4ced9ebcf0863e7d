"""Measured against modelled, and the energy balance residual.

BSRN Payerne, June 2016, against the figures of an independent scalar computation.
"""

from dataclasses import fields, replace

import numpy as np
import pytest

from app.science.energy.compare import (
    Pairs,
    acre_feet,
    closure_of_span,
    compare,
    compare_by_month,
    compare_by_season,
    pairs,
    residual,
    volume_m3,
)
from app.science.energy.station_day import station_days
from tests.science.energy.records import PAYERNE
from tests.science.energy.test_hourly import payerne_hours, payerne_utc_days

UTC = replace(PAYERNE, utc_offset_h=0.0)


def june(mean_humidity: bool = False) -> Pairs:
    weather = payerne_utc_days()
    if mean_humidity:
        weather = replace(weather, vapour_pressure=payerne_hours().vapour_pressure.mean(axis=1))
    days = station_days(UTC, weather)
    return pairs(
        days.date,
        days.rn_measured,
        days.rn_modelled,
        days.tmax,
        days.tmin,
        days.vapour_pressure,
        days.wind_2m,
        UTC.elevation_m,
    )


def test_payerne_june_2016() -> None:
    """+1.52 MJ (+14.1 %), RMSE 1.61 with the mean vapour pressure; +1.36 (+12.6 %), RMSE 1.49,
    108.5 against 99.8 mm with RHmax and RHmin."""
    mean = compare(june(mean_humidity=True))
    assert mean.both == 30
    assert mean.bias_mj == pytest.approx(1.52, rel=0.01)
    assert mean.ratio == pytest.approx(1.141, abs=0.002)
    assert mean.rmse_mj == pytest.approx(1.61, rel=0.01)
    extremes = compare(june())
    assert extremes.bias_mj == pytest.approx(1.36, rel=0.01)
    assert extremes.ratio == pytest.approx(1.126, abs=0.002)
    assert extremes.rmse_mj == pytest.approx(1.49, rel=0.01)
    assert extremes.eto_modelled_mm == pytest.approx(108.5, abs=0.1)
    assert extremes.eto_measured_mm == pytest.approx(99.8, abs=0.1)
    assert extremes.eto_more_mm == pytest.approx(8.7, abs=0.1)


def test_only_days_with_both_count() -> None:
    given = june()
    one = np.arange(30) == 4
    weather = [given.measured, given.modelled]
    assert not np.isnan(weather).any()
    broken = pairs(
        given.date,
        np.where(one, np.nan, given.measured),
        np.where(np.arange(30) == 9, np.nan, given.modelled),
        *(np.full(30, v) for v in (25.0, 12.0, 1.2, 2.0)),
        UTC.elevation_m,
    )
    told = compare(broken)
    assert (told.days, told.both, told.eto_days) == (30, 28, 28)
    rest = ~one & (np.arange(30) != 9)
    assert told.measured_mj == pytest.approx(given.measured[rest].sum())
    nothing = compare(broken, one)
    assert (nothing.days, nothing.both) == (1, 0)
    assert np.isnan([nothing.ratio, nothing.bias_mj, nothing.rmse_mj]).all()
    assert nothing.eto_more_mm == 0.0


def test_months_and_quarters_add_up() -> None:
    date = np.arange("2023-11-20", "2024-06-10", dtype="datetime64[D]")
    rng = np.random.default_rng(1)
    measured = rng.uniform(2.0, 15.0, date.size)
    flat = [np.full(date.size, v) for v in (25.0, 12.0, 1.2, 2.0)]
    given = pairs(date, measured, measured * 1.1 + 0.2, *flat, 100.0)
    whole = compare(given)
    months, quarters = compare_by_month(given), compare_by_season(given)
    assert [str(m) for m, _ in months] == [
        str(m) for m in np.arange("2023-11", "2024-07", dtype="datetime64[M]")
    ]
    assert [q for q, _ in quarters] == ["2023-SON", "2024-DJF", "2024-MAM", "2024-JJA"]
    for parts in (months, quarters):
        for name in ("days", "both", "measured_mj", "modelled_mj", "eto_more_mm"):
            total = sum(getattr(c, name) for _, c in parts)
            assert total == pytest.approx(getattr(whole, name))
    assert dict(quarters)["2024-DJF"].days == 31 + 31 + 29
    none = Pairs(*(getattr(given, f.name)[:0] for f in fields(given)))
    assert compare_by_month(none) == []
    assert compare(none).both == 0


def test_depth_over_an_area() -> None:
    """31 mm over 12 ha; an acre-foot is a foot of water over an acre (0.3048 m, 4046.856 m2)."""
    assert volume_m3(31.0, 12.0) == pytest.approx(3720.0)
    assert acre_feet(0.3048 * 4046.8564224) == pytest.approx(1.0, rel=1e-6)


def test_residual() -> None:
    """FAO-56 eq 1 and eq 20: 12 MJ less 1 into the soil and 3 into the air leave 8, 3.26 mm."""
    told = residual(12.0, 1.0, 3.0, 6.8)
    assert told.latent == pytest.approx(8.0)
    assert told.et == pytest.approx(8.0 / 2.45, rel=0.001)
    assert told.closure == pytest.approx(9.8 / 11.0)
    days = residual(np.array([12.0, np.nan, 1.0]), np.zeros(3), np.array([3.0, 3.0, 0.2]))
    np.testing.assert_allclose(days.latent, [9.0, np.nan, 0.8])
    assert np.isnan(days.closure).all()
    dark = residual(1.0, 0.0, 0.2, 0.5)
    assert np.isnan(dark.closure)  # too little energy for a ratio
    rn, g, h, le = (np.array(v) for v in ([12.0, 10.0, 9.0], [1.0, 0.0, 0.0], [3.0, 2.0, 1.0],
                                          [6.8, 6.0, np.nan]))  # fmt: skip
    ratio, whole = closure_of_span(rn, g, h, le)
    assert ratio == pytest.approx((9.8 + 8.0) / 21.0)
    assert whole.tolist() == [True, True, False]
    assert np.isnan(closure_of_span(rn, g, h, np.full(3, np.nan))[0])
