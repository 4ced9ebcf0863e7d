"""Every worked example of examples.csv belongs to exactly one of the published tests."""

from tests.published import (
    test_asce_ewri,
    test_fao56_crop_coefficients,
    test_fao56_reference_et,
    test_fao56_soil_water,
)
from tests.published.examples import all_rows

ROOMS = (
    test_asce_ewri.ROWS,
    test_fao56_crop_coefficients.ROWS,
    test_fao56_reference_et.ROWS,
    test_fao56_soil_water.ROWS,
)


def test_no_row_is_left_out_or_taken_twice() -> None:
    taken = [row.key for rows in ROOMS for row in rows]
    assert sorted(taken) == sorted(row.key for row in all_rows())
