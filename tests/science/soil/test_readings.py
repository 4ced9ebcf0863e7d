"""Readings of soil water: depletion by depth, errors, bounds."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.science.soil.profile import Layer, Profile
from app.science.soil.readings import (
    DepthReading,
    by_content,
    by_count_ratio,
    by_tension,
    depletion_by_layer,
    gravimetric,
    layer_at,
    measured_depletion,
)

SOIL = Profile(layers=(Layer(0.4, 0.30, 0.15, 0.45), Layer(2.0, 0.20, 0.10, 0.40)), rew_mm=8.0)
EVEN = Profile(layers=(Layer(2.0, 0.30, 0.15, 0.45),), rew_mm=8.0)


def at(depth: float, content: float, error: float = 0.03) -> DepthReading:
    return DepthReading(depth_m=depth, content=content, error=error)


def test_one_content_for_the_whole_root_zone() -> None:
    """FAO-56 eq 86: 1000 (0.30 - 0.24) 0.8 m = 48 mm; three depths of one content say the same."""
    three = [at(0.1, 0.24), at(0.4, 0.24), at(0.7, 0.24)]
    whole = measured_depletion(three, EVEN, 0.8)
    assert whole.depletion_mm == pytest.approx(48.0)
    assert whole.error_mm == pytest.approx(1000 * 0.03 * 0.8)
    assert whole.kind == "value"
    assert measured_depletion(three[::-1], EVEN, 0.8) == whole


def test_each_reading_speaks_for_the_soil_halfway_to_the_next() -> None:
    readings = [at(0.2, 0.30), at(0.6, 0.20)]  # to 0.4 m full, from there on 0.10 short
    assert measured_depletion(readings, EVEN, 0.7).depletion_mm == pytest.approx(100.0 * 0.3)


def test_layers_have_their_own_field_capacity() -> None:
    readings = [at(0.2, 0.24), at(0.6, 0.16)]
    expected = 1000 * (0.06 * 0.4 + 0.04 * 0.3)
    assert measured_depletion(readings, SOIL, 0.7).depletion_mm == pytest.approx(expected)
    assert layer_at(SOIL, 0.4) is SOIL.layers[0]
    assert layer_at(SOIL, 9.0) is SOIL.layers[1]


def test_roots_below_the_deepest_reading_are_as_dry_with_twice_the_error() -> None:
    """One reading at 0.25 m speaks down to 0.40 m; below, the same share of available water."""
    one = measured_depletion([at(0.25, 0.24)], SOIL, 1.0)
    share = 0.06 / 0.15
    assert one.depletion_mm == pytest.approx(share * float(SOIL.taw(1.0)))
    assert one.error_mm == pytest.approx(30.0 * (0.4 + 2.0 * 0.6))
    at_the_end = measured_depletion([at(0.5, 0.20), at(1.0, 0.15)], SOIL, 1.0)
    assert at_the_end.error_mm == pytest.approx(30.0)
    deep = measured_depletion([at(0.25, 0.24), at(1.5, 0.10)], SOIL, 1.0)
    assert deep == one
    only_below = measured_depletion([at(1.5, 0.15)], SOIL, 1.0)
    assert only_below.depletion_mm == pytest.approx(0.5 * float(SOIL.taw(1.0)))


def test_depletion_stays_within_what_the_soil_holds() -> None:
    """FAO-56 eq 87: between 0 and TAW; a soil that drains over days may hold more."""
    assert measured_depletion([at(0.4, 0.40)], EVEN, 0.8).depletion_mm == 0.0
    assert measured_depletion([at(0.4, 0.02)], EVEN, 0.8).depletion_mm == pytest.approx(120.0)
    slow = replace(EVEN, drainage_days=2.0)
    assert measured_depletion([at(0.4, 0.40)], slow, 0.8).depletion_mm == pytest.approx(-80.0)
    assert measured_depletion([at(0.4, 0.99)], slow, 0.8).depletion_mm == pytest.approx(-120.0)


def test_a_wetted_part_counts_as_its_share() -> None:
    part = measured_depletion([at(0.4, 0.24)], EVEN, 0.8, root_wetted_fraction=0.35)
    assert part.depletion_mm == pytest.approx(0.35 * 48.0)
    assert part.error_mm == pytest.approx(0.35 * 30.0 * (0.55 + 2 * 0.25))


@settings(max_examples=50, deadline=None)
@given(st.floats(0.16, 0.29), st.floats(0.3, 1.5), st.integers(1, 6))
def test_a_uniform_soil_gives_back_its_depletion(content: float, roots: float, count: int) -> None:
    depths = np.linspace(0.05, roots, count)
    measured = measured_depletion([at(float(d), content) for d in depths], EVEN, roots)
    assert measured.depletion_mm == pytest.approx(1000.0 * (0.30 - content) * roots)


def test_depletion_by_layer_opens_a_subsoil() -> None:
    """0.4 m at 0.24 of (0.30, 0.15): 0.4 dry; below, 0.15 of (0.20, 0.10): half dry."""
    readings = [at(0.2, 0.24), at(0.6, 0.15)]
    np.testing.assert_allclose(depletion_by_layer(readings, SOIL), (0.4, 0.5))
    np.testing.assert_allclose(depletion_by_layer([at(0.2, 0.24)], SOIL), (0.4, 0.4))
    mixed = [at(0.1, 0.30), at(0.3, 0.15), at(0.9, 0.40)]
    np.testing.assert_allclose(depletion_by_layer(mixed, SOIL), (0.5, 0.2 / 1.6))
    thin = [at(0.02, 0.15), at(0.08, 0.30)]  # 0.05 m at the wilting point, the rest full
    np.testing.assert_allclose(depletion_by_layer(thin, SOIL), (0.05 / 0.4, 0.0), atol=1e-12)
    assert measured_depletion(thin, SOIL, 0.5).depletion_mm == pytest.approx(150.0 * 0.05)
    with pytest.raises(ValueError, match="at least one depth"):
        depletion_by_layer([], SOIL)


def test_weight_and_count_ratio() -> None:
    """20 % by weight at 1.35 g cm-3 is 27 % by volume (definition)."""
    assert float(gravimetric(0.20, 1.35)) == pytest.approx(0.27)
    np.testing.assert_allclose(by_count_ratio([0.5, 1.0], 0.3, -0.02), [0.13, 0.28])
    assert np.isnan(gravimetric(np.nan, 1.35))
    assert np.isnan(by_count_ratio(0.5, 0.3, np.nan))


def test_tension_goes_through_the_curve_of_its_layer() -> None:
    """Field capacity reads as no depletion, and the second layer has its own curve."""
    full = [by_tension(0.2, 33.0, SOIL), by_tension(0.6, 33.0, SOIL)]
    assert [reading.content for reading in full] == pytest.approx([0.30, 0.20])
    assert measured_depletion(full, SOIL, 0.8).depletion_mm == pytest.approx(0.0, abs=1e-9)
    slope = np.log(0.30 / 0.15) / np.log(1500.0 / 33.0)
    dry = by_tension(0.2, 70.0, SOIL)
    assert dry.content == pytest.approx(0.30 * (70.0 / 33.0) ** -slope)
    assert dry.error == pytest.approx(np.hypot(0.1 * slope * dry.content, 0.03), rel=0.01)
    with pytest.raises(ValueError, match="tension_kpa is -5"):
        by_tension(0.2, -5.0, SOIL)


def test_outside_its_range_an_instrument_only_bounds() -> None:
    dry, wet = by_tension(0.3, 85.0, SOIL), by_tension(0.6, 0.0, SOIL)
    assert measured_depletion([dry], SOIL, 0.8).kind == "at_least"
    assert measured_depletion([wet], SOIL, 0.8).kind == "at_most"
    assert measured_depletion([dry, wet], SOIL, 0.8).kind == "nothing"
    assert by_content(0.2, 0.50, wettest=0.45).range_end == "wet"
    assert by_content(0.2, 0.04, driest=0.05).range_end == "dry"
    assert by_content(0.2, 0.25, driest=0.05, wettest=0.45).range_end == ""


def test_wrong_readings_are_refused_by_name() -> None:
    for field, value in (("depth_m", 0.0), ("content", 1.2), ("error", 0.0), ("content", np.nan)):
        with pytest.raises(ValueError, match=f"{field} is"):
            replace(at(0.2, 0.2), **{field: value})
    with pytest.raises(ValueError, match="range_end is 'low'"):
        replace(at(0.2, 0.2), range_end="low")
    with pytest.raises(ValueError, match="at least one depth"):
        measured_depletion([], SOIL, 0.8)
    with pytest.raises(ValueError, match="two readings at one depth"):
        measured_depletion([at(0.2, 0.2), at(0.2, 0.3)], SOIL, 0.8)
