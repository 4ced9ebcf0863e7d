"""Every figure of the Payerne month within 1 % of an independent computation's."""

import pytest

from tests.science.energy.figures import all_figures


@pytest.mark.parametrize("name", all_figures())
def test_within_one_percent(name: str) -> None:
    expected, ours = all_figures()[name]
    assert ours == pytest.approx(expected, rel=0.01)
