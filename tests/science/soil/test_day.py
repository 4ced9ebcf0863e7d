"""A day opened again gives the ledger's figures, with every feature on: random blocks (regression),
its steps by the handbook's formulas (FAO-56 eq 71, 74, 80, 83 to 85; NEH 630 chapter 10)."""

import numpy as np
import pytest

from app.science.ledger import block_ledgers
from app.science.soil.day import day_working
from tests.science.random_blocks import random_plan, random_weather


@pytest.mark.parametrize("seed", range(150))
def test_each_step_of_a_day_leads_to_the_ledgers_figures(seed: int) -> None:
    rng = np.random.default_rng(seed)
    plan = random_plan(rng, 90)
    sky = random_weather(rng, plan.days)
    (ledger,) = block_ledgers([plan], [sky])
    for place in {0, plan.days - 1, *rng.integers(0, plan.days, 4).tolist()}:
        day = day_working(plan, sky, ledger, place)
        for name, column in (
            ("depletion", ledger.depletion_mm), ("raw", ledger.raw_mm), ("ks", ledger.ks),
            ("et", ledger.et_actual_mm), ("percolation", ledger.deep_percolation_mm),
            ("growth", ledger.root_growth_depletion_mm), ("runoff", ledger.runoff_mm),
            ("rain_outside", ledger.rain_outside_roots_mm), ("taw", ledger.taw_mm),
            ("subsoil", ledger.subsoil_depletion_mm), ("correction", ledger.correction_mm),
        ):  # fmt: skip
            assert getattr(day, name) == pytest.approx(column[place], abs=1e-9), name
        assert day.given_rise + day.rise == pytest.approx(ledger.capillary_rise_mm[place])
        # the steps, each from the figures before it
        assert day.raw == pytest.approx(day.p * day.taw)
        assert day.ks == pytest.approx(day.ks_water * day.salt)
        if np.isfinite(day.retention):
            over = max(day.rain - 0.2 * day.retention, 0.0)
            most = day.rain + 0.8 * day.retention
            assert day.runoff == pytest.approx(over**2 / most if most > 0 else 0.0)
        water = (day.rain - day.runoff) * day.roots + day.irrigation + day.given_rise + day.rise
        assert day.depletion_wet == pytest.approx(day.opening + day.growth - water)
        left = max(day.taw - day.depletion_wet, 0.0)
        assert day.evaporation == pytest.approx(min(day.ke * day.eto, left), abs=1e-9)
        asked = day.ks * day.k * day.eto
        assert day.transpiration == pytest.approx(min(asked, left - day.evaporation), abs=1e-9)
        held = day.excess - day.percolation
        closing = day.depletion_wet + day.et + day.excess - held
        assert day.depletion == pytest.approx(closing - day.correction, abs=1e-9)
    with pytest.raises(ValueError, match="not a day"):
        day_working(plan, sky, ledger, plan.days)
