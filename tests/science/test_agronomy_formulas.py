"""Every formula of crop and soil: one value as in an array, whole numbers as floats, NaN as NaN,
and the bounds it promises."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from app.science.crop import bare_soil, climate, cover
from app.science.soil import evaporation, root_zone, runoff

# A formula and arguments it is used with; each argument is varied and replaced by NaN in turn.
FORMULAS: list[tuple[Callable[..., Any], tuple[float, ...]]] = [
    (climate.climate_term, (3, 40, 2)),
    (climate.adjust, (1, 3, 40, 2)),
    (climate.alfalfa_to_grass, (3, 40)),
    (bare_soil.kc_ini, (4, 5, 20, 9)),
    (bare_soil.kc_ini_light, (4, 5)),
    (bare_soil.kc_ini_between, (20, 1, 2)),
    (bare_soil.infiltrated_depth, (12, 1)),
    (bare_soil.wetting_interval, (30, 3)),
    (cover.sin_noon_elevation, (40, 200)),
    (cover.effective_cover_rows, (0.4, 1, 1)),
    (cover.effective_cover_round, (0.4, 0.9)),
    (cover.kcb_full, (2, 45, 3)),
    (cover.kcb_from_cover, (0.4, 0.5, 2, 1.2, 0.15)),
    (cover.density_coefficient, (0.4, 2, 1.5)),
    (cover.kcb_from_lai, (2, 1.2, 0.15)),
    (cover.lai_from_kcb, (1, 1.2, 0.15)),
    (cover.sparse_stand_reduction, (0.4, 0.9)),
    (cover.stomatal_factor, (400, 0.19, 0.067, 2)),
    (cover.mulched, (1, 0.1)),
    (cover.windbreak, (4, 8, 1)),
    (evaporation.total_evaporable_water, (0.3, 0.1, 0.1)),
    (evaporation.kc_max, (1, 2, 45, 1)),
    (evaporation.cover_fraction, (1, 1.2, 1, 0.15)),
    (evaporation.exposed_wetted_fraction, (0.4, 0.5)),
    (evaporation.under_canopy, (0.4, 0.5)),
    (evaporation.evaporation_reduction, (12, 20, 9)),
    (evaporation.evaporation_coefficient, (0.5, 1.2, 1, 0.4)),
    (evaporation.rew_from_texture, (40, 20)),
    (root_zone.total_available_water, (0.3, 0.1, 1)),
    (root_zone.depletion_fraction, (0.5, 6)),
    (root_zone.readily_available_water, (0.5, 100)),
    (root_zone.stress_coefficient, (60, 100, 40)),
    (root_zone.salinity_stress, (3, 2, 10, 1)),
    (root_zone.leaching_requirement, (1, 2)),
    (root_zone.yield_share, (400, 500, 1)),
    (root_zone.stress_from_yield, (8, 10, 1)),
    (runoff.dry_curve_number, (75,)),
    (runoff.wet_curve_number, (75,)),
    (runoff.retention, (75,)),
    (runoff.runoff, (50, 75)),
]
NAMES = [function.__name__ for function, _ in FORMULAS]


@pytest.mark.parametrize(("formula", "arguments"), FORMULAS, ids=NAMES)
def test_one_value_is_the_arrays_value(
    formula: Callable[..., Any], arguments: tuple[float, ...]
) -> None:
    factors = np.array([[0.9, 1.0], [1.05, 0.97]])
    many = formula(*(value * factors for value in arguments))
    assert many.shape == (2, 2)
    assert many.dtype == np.float64
    for place in np.ndindex(2, 2):
        one = formula(*(float(value * factors[place]) for value in arguments))
        assert float(one) == many[place]


@pytest.mark.parametrize(("formula", "arguments"), FORMULAS, ids=NAMES)
def test_whole_numbers_count_as_floats(
    formula: Callable[..., Any], arguments: tuple[float, ...]
) -> None:
    as_floats = formula(*(float(value) for value in arguments))
    assert float(formula(*arguments)) == float(as_floats)
    assert np.isfinite(as_floats)


@pytest.mark.parametrize(("formula", "arguments"), FORMULAS, ids=NAMES)
def test_nan_in_any_argument_gives_nan(
    formula: Callable[..., Any], arguments: tuple[float, ...]
) -> None:
    for i in range(len(arguments)):
        holed = [
            np.array([value, np.nan if i == j else value]) for j, value in enumerate(arguments)
        ]
        result = formula(*holed)
        assert np.isfinite(result[0])
        assert np.isnan(result[1]), f"argument {i}"


def test_bounds() -> None:
    """Fractions stay fractions however wild their inputs."""
    rng = np.random.default_rng(8)
    wild = rng.uniform(-50.0, 50.0, (6, 500))
    fc = evaporation.cover_fraction(wild[0] / 25, wild[1] / 25, np.abs(wild[2]) / 10, 0.15)
    assert ((fc >= 0.0) & (fc <= 0.99)).all()
    few = evaporation.exposed_wetted_fraction(wild[0] / 50, wild[1] / 50)
    assert ((few >= 0.01) & (few <= 1.0)).all()
    kr = evaporation.evaporation_reduction(wild[0], 20.0, 9.0)
    assert ((kr >= 0.0) & (kr <= 1.0)).all()
    p = root_zone.depletion_fraction(wild[0] / 50, wild[1])
    assert ((p >= 0.1) & (p <= 0.8)).all()
    ks = root_zone.stress_coefficient(wild[0], 40.0, 20.0)
    assert ((ks >= 0.0) & (ks <= 1.0)).all()
    lr = root_zone.leaching_requirement(np.abs(wild[0]), np.abs(wild[1]))
    assert ((lr >= 0.0) & (lr <= 0.9)).all()
    rain = np.abs(wild[0])
    lost = runoff.runoff(rain, 1.0 + np.abs(wild[1]))
    assert ((lost >= 0.0) & (lost <= rain)).all()


def test_leaching_requirement_of_fao_29() -> None:
    """FAO-29, quoted in FAO-56 chapter 8: ECiw / (5 ECe - ECiw); 1.5 and 1.7 dS/m (maize)."""
    assert float(root_zone.leaching_requirement(1.5, 1.7)) == pytest.approx(1.5 / 7.0)
    assert float(root_zone.leaching_requirement(9.0, 1.7)) == 0.9


def test_wetted_fraction_is_the_last_event_that_set_it() -> None:
    """FAO-56 chapter 7: irrigation sets its own, rain above 3 mm all, else yesterday's holds."""
    rain = np.array([0.0, 0.0, 2.0, 10.0, 0.0, 20.0])[:, None]
    event = np.array([np.nan, 0.4, np.nan, np.nan, np.nan, 0.3])[:, None]
    fw, by_irrigation = evaporation.wetted_fraction_series(rain, event)
    np.testing.assert_array_equal(fw[:, 0], [1.0, 0.4, 0.4, 1.0, 1.0, 0.3])
    np.testing.assert_array_equal(by_irrigation[:, 0], [0, 1, 1, 0, 0, 1])
