"""Plans of different starts and lengths side by side, as arrays (days, blocks)."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from app.science import Floats
from app.science.crop.curve import Curve, season_curves
from app.science.soil.balance import Terms, without_first
from app.science.soil.block import BlockPlan, BlockWeather
from app.science.soil.terms import Openings, Supplies, make_terms

# Weather of the days after a shorter plan's last: no demand, no water, a mild climate.
PADDING = {"u2": 2.0, "rh_min": 45.0, "irrigation_fw": np.nan, "water_table_m": np.nan}


@dataclass(frozen=True, kw_only=True)
class Stack:
    """Plans side by side: curve, supplies (days, blocks), openings (blocks,)."""

    plans: Sequence[BlockPlan]
    curve: Curve
    supplies: Supplies
    openings: Openings

    def terms(self) -> Terms:
        """Terms of the day loop."""
        seasons = [plan.season for plan in self.plans]
        profiles = [plan.profile for plan in self.plans]
        return make_terms(seasons, profiles, self.curve, self.supplies, self.openings)

    def since(self, passed: Sequence[int]) -> "Stack":
        """The stack without each plan's first `passed` days."""

        def later(columns: Any) -> dict[str, Any]:
            return {name: without_first(values, passed) for name, values in vars(columns).items()}

        return replace(
            self, curve=Curve(**later(self.curve)), supplies=Supplies(**later(self.supplies))
        )


def stack_plans(plans: Sequence[BlockPlan], weather: Sequence[BlockWeather]) -> Stack:
    """Plans and their weather side by side; shorter plans are padded with days without demand.

    Raises ValueError naming column and date for a wrong length, NaN, or a negative depth.
    """
    days = max(plan.days for plan in plans)

    def stacked(name: str, values: Callable[[int], Floats | None]) -> Floats:
        rows = np.full((len(plans), days), PADDING.get(name, 0.0))
        for b, plan in enumerate(plans):
            column = values(b)
            if column is None:
                continue
            if np.shape(column) != (plan.days,):
                raise ValueError(
                    f"{name} of block {b} has shape {np.shape(column)}; its plan has {plan.days} "
                    "days: give one value a day"
                )
            rows[b, : plan.days] = column
        return np.ascontiguousarray(rows.T)

    supplies = Supplies(
        eto=stacked("eto", lambda b: weather[b].eto),
        rain=stacked("rain", lambda b: weather[b].rain),
        irrigation=stacked("irrigation_net", lambda b: plans[b].irrigation_net),
        irrigation_fw=stacked("irrigation_fw", lambda b: plans[b].irrigation_fw),
        capillary_rise=stacked("capillary_rise", lambda b: plans[b].capillary_rise),
        correction=stacked("correction", lambda b: plans[b].correction),
        water_table=stacked("water_table_m", lambda b: plans[b].water_table_m),
        u2=stacked("u2", lambda b: weather[b].u2),
        rh_min=stacked("rh_min", lambda b: weather[b].rh_min),
    )
    _check(plans, supplies)
    starts = np.array([plan.start for plan in plans], dtype="datetime64[D]")
    date = starts + np.arange(days).astype("timedelta64[D]")[:, None]
    within = np.arange(days)[:, None] < np.array([plan.days for plan in plans])
    seasons = [plan.season for plan in plans]
    return Stack(
        plans=plans,
        curve=season_curves(
            seasons,
            date,
            supplies.u2,
            supplies.rh_min,
            within,
            warmth=_warmth(plans, weather, days),
            warmth_before=[plan.degree_days_before for plan in plans],
        ),
        supplies=supplies,
        openings=_openings(plans),
    )


def _warmth(
    plans: Sequence[BlockPlan], weather: Sequence[BlockWeather], days: int
) -> Floats | None:
    """Degree days (days, blocks) of seasons that go by them; None where none does."""
    if all(plan.season.degree_days is None for plan in plans):
        return None
    warmth = np.zeros((days, len(plans)))
    for b, (plan, sky) in enumerate(zip(plans, weather, strict=True)):
        how = plan.season.degree_days
        if how is None:
            continue
        for name in ("tmax", "tmin"):
            column = getattr(sky, name)
            if np.shape(column) != (plan.days,) or np.isnan(column).any():
                raise ValueError(
                    f"{name} of block {b} is missing or has gaps; a season by degree days needs it "
                    f"on each of its plan's {plan.days} days"
                )
        assert sky.tmax is not None
        assert sky.tmin is not None
        warmth[: plan.days, b] = how.daily(sky.tmax, sky.tmin)
    return warmth


def _openings(plans: Sequence[BlockPlan]) -> Openings:
    def column(name: str) -> Floats:
        return np.array([getattr(plan, name) for plan in plans], dtype=np.float64)

    mulches = [plan.season.mulch for plan in plans]
    return Openings(
        depletion_mm=column("initial_depletion_mm"),
        depletion_fraction=column("initial_depletion_fraction"),
        subsoil_fraction=column("initial_subsoil_depletion_fraction"),
        layer_mm=column("initial_evaporation_depletion_mm"),
        roots=column("root_wetted_fraction"),
        under_canopy=np.array([plan.under_canopy for plan in plans]),
        weighted=np.array([plan.same_day == "weighted" for plan in plans]),
        salt=column("salt_factor"),
        open_ground=np.array([m.open_ground if m else 1.0 for m in mulches]),
        mulched=np.array([m.evaporation_factor if m else 1.0 for m in mulches]),
        rising=[plan.rising_soil for plan in plans],
        layer_shares=[plan.subsoil_layer_depletion for plan in plans],
    )


def _check(plans: Sequence[BlockPlan], supplies: Supplies) -> None:
    depths = ("rain", "irrigation", "capillary_rise")
    for name, values in vars(supplies).items():
        if name == "water_table":
            continue
        if name == "irrigation_fw":
            wrong = (supplies.irrigation > 0.0) & np.isnan(values)
            why = "an irrigation without its wetted fraction"
        else:
            wrong, why = np.isnan(values), "missing: fill the gap first"
            if name in depths and not wrong.any():
                wrong, why = values < 0.0, "negative"
        if wrong.any():
            day, b = np.argwhere(wrong)[0]
            raise ValueError(
                f"{name} of block {b} on {plans[b].start.astype('datetime64[D]') + day} is {why}"
            )
