"""Soil water from texture: Saxton & Rawls 2006 (Soil Sci. Soc. Am. J. 70:1569-1578), Table 3.

The table's water contents (percent by volume at 1500 and 33 kPa and saturation), conductivities
and densities at 2.5 % organic matter stand in the handbook's soils table, from memory; wilting
point and field capacity were checked against the text.
"""

import csv
from pathlib import Path

import numpy as np
import pytest

from app import handbook
from app.science.soil.texture import gravel_volume, rising_soil, texture_layer, texture_water

FILE = Path(handbook.__file__).with_name("soils.csv")


def _rows() -> list[dict[str, str]]:
    with FILE.open(encoding="utf-8", newline="") as lines:
        return list(csv.DictReader(lines))


@pytest.mark.parametrize("row", _rows(), ids=lambda row: row["texture_id"])
def test_table_3(row: dict[str, str]) -> None:
    """Water contents within 0.6 points (the print rounds to 1, the sand row to its clamp), Ks
    within 1 %, density within 0.01 g cm-3 of the print."""
    water = texture_water(float(row["sand_rep_pct"]), float(row["clay_rep_pct"]))
    for value, name in (
        (water.wilting_point, "wp"),
        (water.field_capacity, "fc"),
        (water.saturation, "sat"),
    ):
        assert abs(100.0 * float(value) - float(row[f"sr_published_{name}_pct"])) <= 0.6, name
    printed = float(row["sr_published_ksat_mm_h"])
    assert float(water.conductivity) == pytest.approx(printed, rel=0.01, abs=0.05)
    assert float(water.bulk_density) == pytest.approx(
        float(row["sr_published_density_g_cm3"]), abs=0.0101
    )


def test_scalar_is_array_and_nan_stays() -> None:
    sand, clay = np.array([65.0, 40.0, np.nan]), np.array([10.0, 20.0, 20.0])
    many = texture_water(sand, clay)
    one = texture_water(40.0, 20.0)
    assert float(one.field_capacity) == many.field_capacity[1]
    assert np.isnan(many.wilting_point[2])
    assert np.isnan(many.conductivity[2])


@pytest.mark.parametrize(
    ("sand", "clay", "organic", "told"),
    [
        (110.0, 5.0, 2.5, "sand is 110 %"),
        (20.0, 65.0, 2.5, "clay is 65 %"),
        (60.0, 50.0, 2.5, "sand and clay together is 110 %"),
        (40.0, 20.0, 9.0, "organic matter is 9 %"),
        (-1.0, 20.0, 2.5, "sand is -1 %"),
    ],
)
def test_outside_the_stated_use_is_refused(
    sand: float, clay: float, organic: float, told: str
) -> None:
    with pytest.raises(ValueError, match=told):
        texture_water(sand, clay, organic)


@pytest.mark.parametrize("row", _rows(), ids=lambda row: row["texture_id"])
def test_conductivity_at_field_capacity_by_the_pore_index(row: dict[str, str]) -> None:
    """Equations 16, 17 and 18 together, from memory: K at 33 kPa along the retention curve is
    Ks (FC / S)^(3 + 2 / lambda), and 33 and 1500 kPa lie on one power curve of slope lambda."""
    water = texture_water(float(row["sand_rep_pct"]), float(row["clay_rep_pct"]))
    slope = float(water.pore_index)
    held = float(water.field_capacity) * (1500.0 / 33.0) ** -slope
    assert held == pytest.approx(float(water.wilting_point))
    drained = (float(water.field_capacity) / float(water.saturation)) ** (3.0 + 2.0 / slope)
    assert 0.0 < drained < 0.1


def test_air_entry_rises_from_sand_to_silt() -> None:
    """Saxton & Rawls 2006, eq 4 (from memory): coarse soils let air in first; never below 0."""
    entry = texture_water([92.0, 65.0, 40.0, 20.0], [3.0, 10.0, 20.0, 15.0]).air_entry
    assert (entry >= 0.2).all()
    assert (np.diff(entry[:3]) >= 0.0).all()
    soil = rising_soil(40.0, 20.0)
    assert soil.conductivity_mm_d == pytest.approx(24.0 * 15.5, rel=0.01)
    assert soil.air_entry_m == pytest.approx(float(entry[2]) / 9.81)


def test_gravel_takes_its_share_of_the_volume() -> None:
    """Saxton & Rawls 2006, eq 19 and 20 (from memory). By hand: 30 % by weight in earth of 1.40
    g cm-3: volumes 0.30 / 2.65 and 0.70 / 1.40, so that gravel fills 0.1132 / 0.6132 = 0.185."""
    expected = (0.30 / 2.65) / (0.30 / 2.65 + 0.70 / 1.40)
    assert float(gravel_volume(30.0, 1.40)) == pytest.approx(expected)
    plain, stony = texture_layer(0.5, 40.0, 20.0), texture_layer(0.5, 40.0, 20.0, gravel=30.0)
    water = texture_water(40.0, 20.0)
    assert plain.field_capacity == float(water.field_capacity)
    share = 1.0 - float(gravel_volume(30.0, water.bulk_density))
    for name in ("field_capacity", "wilting_point", "saturation"):
        assert getattr(stony, name) == pytest.approx(share * getattr(plain, name))
    with pytest.raises(ValueError, match="gravel is 95 %"):
        texture_layer(0.5, 40.0, 20.0, gravel=95.0)
