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
from app.science.soil.texture import texture_water

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
