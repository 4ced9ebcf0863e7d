"""Salinity, intake rate, retention, texture with gravel: formulas, bounds, published rows."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from app import handbook
from app.science.crop.bare_soil import kc_ini, kc_ini_own_soil
from app.science.soil import salinity
from app.science.soil.intake_rate import BASIC_RATES, intake_warning, local_rate
from app.science.soil.profile import Layer
from app.science.soil.retention import content_error, tension, water_content
from app.science.soil.root_zone import yield_by_stages, yield_share
from app.science.soil.texture import gravel_volume

LOAM = Layer(1.0, 0.28, 0.14, 0.46)

FORMULAS: list[tuple[Callable[..., Any], tuple[float, ...]]] = [
    (salinity.soil_salinity, (1.5, 0.2)),
    (salinity.most_salinity, (1.7, 12.0)),
    (salinity.salinity_yield, (3.0, 1.7, 12.0)),
    (salinity.drip_leaching_requirement, (1.5, 10.0)),
    (salinity.gross_with_leaching, (40.0, 0.8, 0.2)),
    (salinity.gross_with_leaching, (40.0, 0.8, 0.05)),
    (local_rate, (5.0, 0.4)),
    (lambda suction: water_content(suction, LOAM), (60.0,)),
    (lambda suction: water_content(suction, LOAM), (20.0,)),
    (lambda theta: tension(theta, LOAM), (0.2,)),
    (lambda suction: content_error(suction, 0.1, LOAM), (60.0,)),
    (gravel_volume, (30.0, 1.4)),
    (kc_ini_own_soil, (6.0, 4.0, 20.0, 9.0, 15.0, 0.8)),
]


@pytest.mark.parametrize(("formula", "arguments"), FORMULAS)
def test_scalar_is_array_and_nan_stays(
    formula: Callable[..., Any], arguments: tuple[float, ...]
) -> None:
    factors = np.array([0.95, 1.0, 1.04])
    many = formula(*(value * factors for value in arguments))
    assert many.dtype == np.float64
    for i, factor in enumerate(factors):
        assert float(formula(*(value * factor for value in arguments))) == many[i]
    for i in range(len(arguments)):
        holed = [
            np.array([value, np.nan if i == j else value]) for j, value in enumerate(arguments)
        ]
        result = formula(*holed)
        assert np.isfinite(result[0])
        assert np.isnan(result[1]), f"argument {i}"


def test_salt_balance_of_fao_56() -> None:
    """FAO-56 chapter 8, after eq 93: ECe is about 1.5 ECiw at a leaching fraction of 0.15-0.20."""
    assert float(salinity.soil_salinity(1.0, 0.15)) == pytest.approx(1.53, abs=0.01)
    assert float(salinity.soil_salinity(1.0, 0.20)) == pytest.approx(1.2)
    # At the leaching requirement of surface irrigation, by the same balance for maize (1.7 dS/m):
    lr = float(salinity.leaching_requirement(1.0, 1.7))
    assert lr == pytest.approx(1.0 / 7.5)
    assert float(salinity.soil_salinity(1.0, lr)) == pytest.approx(1.7)
    assert salinity.above_threshold(1.0, lr, 1.7) == pytest.approx(0.0, abs=1e-12)
    assert salinity.above_threshold(2.0, lr, 1.7) == pytest.approx(1.7)


def test_yield_under_salt_ends_where_the_slope_says() -> None:
    """FAO-56 eq 89 with the table's maize (1.7 dS/m, 12 %): none lost at the threshold, half at
    threshold + 50 / b, all at threshold + 100 / b."""
    maize = handbook.crop("maize_grain")
    threshold, slope = maize.ece_threshold_ds_m, maize.salinity_slope_pct_per_ds_m
    assert threshold is not None
    assert slope is not None
    most = float(salinity.most_salinity(threshold, slope))
    assert most == pytest.approx(1.7 + 100.0 / 12.0)  # about 10 dS/m, as FAO-29 prints
    ece = np.array([0.0, threshold, threshold + 50.0 / slope, most, most + 5.0])
    share = salinity.salinity_yield(ece, threshold, slope)
    np.testing.assert_allclose(share, [1.0, 1.0, 0.5, 0.0, 0.0], atol=1e-12)
    assert float(salinity.drip_leaching_requirement(1.5, most)) == pytest.approx(1.5 / (2 * most))


def test_leaching_is_added_above_a_tenth() -> None:
    """NEH 623, from memory: net / efficiency up to LR 0.1, above it 0.9 net / ((1 - LR) Ea)."""
    gross = salinity.gross_with_leaching(40.0, 0.8, np.array([0.0, 0.1, 0.11, 0.25, 0.9]))
    expected = [50.0, 50.0, 0.9 * 40 / (0.89 * 0.8), 0.9 * 40 / (0.75 * 0.8), 0.9 * 40 / 0.08]
    np.testing.assert_allclose(gross, expected)
    assert (np.diff(gross) >= 0.0).all()


def test_an_application_faster_than_the_soil_is_told() -> None:
    """FAO Training Manual 5, Annex 2 (from memory): clay 1-5 mm/h, sandy loam 20-30 mm/h."""
    assert intake_warning(8.0, BASIC_RATES["sandy_loam"][0]) is None
    told = intake_warning(8.0, BASIC_RATES["clay"][1])
    assert told is not None
    assert told.excess == pytest.approx(3.0 / 8.0)
    drip = intake_warning(4.0, 10.0, wetted_fraction=0.3)
    assert drip is not None
    assert drip.rate_mm_h == pytest.approx(4.0 / 0.3)
    assert intake_warning(5.0, 5.0) is None
    for wrong in (0.0, float("nan")):
        with pytest.raises(ValueError, match="intake_mm_h is"):
            intake_warning(5.0, wrong)


def test_every_texture_class_has_an_intake_rate() -> None:
    assert set(BASIC_RATES) == set(handbook.soil_textures())
    assert all(0.0 < low < high for low, high in BASIC_RATES.values())


def test_retention_goes_through_its_three_points() -> None:
    """Saxton & Rawls 2006: field capacity at 33, wilting point at 1500 kPa, saturation at none."""
    at = water_content([0.0, 33.0, 1500.0], LOAM)
    np.testing.assert_allclose(at, [0.46, 0.28, 0.14])
    suction = np.geomspace(0.1, 5000.0, 200)
    content = water_content(suction, LOAM)
    assert (np.diff(content) < 0.0).all()
    np.testing.assert_allclose(tension(content, LOAM), suction, rtol=1e-9)
    sand = water_content([10.0, 1500.0], LOAM, field_capacity_kpa=10.0)
    np.testing.assert_allclose(sand, [0.28, 0.14])
    dry = Layer(1.0, 0.1, 0.0, 0.4)
    assert (np.diff(water_content(suction, dry)) < 0.0).all()


def test_the_error_of_a_tension_grows_towards_the_wet_end_of_the_curve() -> None:
    error = content_error([40.0, 100.0, 1000.0], 0.1, LOAM)
    assert (np.diff(error) < 0.0).all()
    slope = np.log(0.28 / 0.14) / np.log(1500.0 / 33.0)
    expected = 0.1 * slope * water_content(100.0, LOAM)
    assert float(error[1]) == pytest.approx(float(expected), rel=0.02)


def test_kc_ini_of_a_known_soil() -> None:
    """FAO-56 Annex 7: eq 7-1 from 5 mm/d on; TEW times sqrt(ETo / 5) below; a light wetting gives
    no more than its depth; a part of the surface counts as that part (eq 60)."""
    plain = kc_ini_own_soil(8.0, 6.0, 20.0, 9.0)
    assert float(plain) == float(kc_ini(8.0, 6.0, 20.0, 9.0))
    cool = kc_ini_own_soil(8.0, 3.2, 20.0, 9.0)
    assert float(cool) == float(kc_ini(8.0, 3.2, 20.0 * 0.8, 9.0))
    light = float(kc_ini_own_soil(10.0, 6.0, 20.0, 9.0, depth=5.0))
    assert light == pytest.approx(5.0 / 60.0, rel=0.01)
    assert float(kc_ini_own_soil(8.0, 6.0, 20.0, 9.0, fw=1.0)) == float(plain)
    part = float(kc_ini_own_soil(8.0, 6.0, 20.0, 9.0, depth=60.0, fw=0.4))
    assert part == pytest.approx(0.4 * float(plain))


def test_yield_by_stages_is_the_product_of_its_stages() -> None:
    """1 - Ky (1 - ETa / ETc) of each stage multiplied (FAO-33's relation by stage, from memory)."""
    share = yield_by_stages([90.0, 200.0, 0.0], [100.0, 250.0, 0.0], [0.4, 1.5, 0.2])
    assert float(share) == pytest.approx((1 - 0.4 * 0.1) * (1 - 1.5 * 0.2))
    assert float(yield_by_stages([300.0], [400.0], [1.25])) == pytest.approx(
        float(yield_share(300.0, 400.0, 1.25))
    )
    many = yield_by_stages([[90.0, np.nan], [200.0, 200.0]], [[100.0], [250.0]], [[0.4], [1.5]])
    assert many[0] == pytest.approx(0.96 * 0.7)
    assert np.isnan(many[1])
    assert float(yield_by_stages([0.0, 50.0], [100.0, 50.0], [1.5, 1.0])) == 0.0
