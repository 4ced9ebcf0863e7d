"""Random but plausible plans and weather, for properties that hold for all of them."""

import numpy as np

from app.science.crop.degree_days import DegreeDays
from app.science.crop.mulch import Mulch
from app.science.crop.season import CropSeason
from app.science.crop.seen import CoverSeen, StageSeen
from app.science.crop.stand import Canopy
from app.science.ledger import BlockPlan, BlockWeather
from app.science.soil.capillary import RisingSoil
from app.science.soil.profile import Layer, Profile

FIRST = np.datetime64("2024-02-25")  # so that a leap day falls in


def random_season(rng: np.random.Generator, start: np.datetime64) -> CropSeason:
    single = rng.random() < 0.3
    root_min = rng.uniform(0.1, 0.4)
    stages = rng.integers(0, 50, 4)
    stages[rng.integers(4)] += 1
    planting = start + np.timedelta64(int(rng.integers(-40, 30)), "D")
    end = planting + np.timedelta64(int(rng.integers(0, 160)), "D")

    def days_on(count: int) -> list[np.datetime64]:
        return sorted({planting + np.timedelta64(int(d), "D") for d in rng.integers(0, 120, count)})

    stages_seen = [StageSeen(date=d, stage=int(rng.integers(1, 5))) for d in days_on(3)]
    cover_seen = [
        CoverSeen(date=d, cover=rng.random(), height_m=rng.uniform(0.05, 5.0)) for d in days_on(3)
    ]
    sums = rng.uniform(0.0, 500.0, 4)
    shape = str(rng.choice(["even", "rows", "round"]))
    return CropSeason(
        planting=planting,
        stage_days=(int(stages[0]), int(stages[1]), int(stages[2]), int(stages[3])),
        coefficients="single" if single else "dual",
        k_ini=rng.uniform(0.1, 1.0),
        k_mid=rng.uniform(0.2, 1.25),
        k_end=rng.uniform(0.1, 1.1),
        kc_min=rng.uniform(0.0, 0.2),
        height_max_m=rng.uniform(0.1, 6.0),
        root_min_m=root_min,
        root_max_m=root_min + rng.uniform(0.0, 2.0),
        depletion_fraction=rng.uniform(0.1, 0.8),
        mad=rng.uniform(0.1, 0.9) if rng.random() < 0.5 else None,
        perennial=bool(rng.random() < 0.2),
        climate_adjustment=str(rng.choice(["trailing", "stage_mean", "day", "none"])),
        end=end if rng.random() < 0.3 else None,
        mad_by_stage=(0.3, None, 0.5, 0.8) if rng.random() < 0.2 else None,
        degree_days=DegreeDays(
            base_c=rng.uniform(0.0, 10.0),
            upper_c=rng.uniform(25.0, 40.0),
            method=str(rng.choice(["mean", "clipped", "sine"])),
            stage_sums=(float(sums[0]), float(sums[1]), float(sums[2]), float(sums[3]) + 1.0),
        )
        if rng.random() < 0.2
        else None,
        stages_seen=tuple(stages_seen) if rng.random() < 0.3 else (),
        cover_seen=tuple(cover_seen) if not single and rng.random() < 0.3 else (),
        canopy=Canopy(
            shape=shape,
            width_m=2.0,
            row_azimuth_deg=rng.uniform(0.0, 180.0),
            latitude_deg=rng.uniform(-50.0, 50.0),
            ground_cover_kcb=rng.uniform(0.2, 0.9) if rng.random() < 0.5 else None,
            full=str(rng.choice(["height", "table"])),
        ),
        cuttings=tuple(days_on(4)) if rng.random() < 0.2 else (),
        cycle_days=(5, 10, 10, 5) if rng.random() < 0.1 else None,
        mulch=Mulch(
            kind=str(rng.choice(["plastic", "organic"])),
            cover=rng.random(),
            reduction=rng.uniform(0.0, 0.3),
        )
        if rng.random() < 0.2
        else None,
    )


def random_profile(rng: np.random.Generator) -> Profile:
    layers = []
    bottom = 0.0
    for _ in range(int(rng.integers(1, 5))):
        bottom += rng.uniform(0.1, 0.8)
        dry = rng.uniform(0.02, 0.25)
        wet = dry + rng.uniform(0.03, 0.2)
        layers.append(Layer(bottom, wet, dry, wet + rng.uniform(0.02, 0.2)))
    depth = rng.uniform(0.08, 0.15)
    tew = 1000.0 * (layers[0].field_capacity - 0.5 * layers[0].wilting_point) * depth
    return Profile(
        layers=tuple(layers),
        evaporation_depth_m=depth,
        rew_mm=tew * rng.uniform(0.0, 0.9),
        curve_number=rng.uniform(40.0, 100.0) if rng.random() < 0.4 else None,
        drainage_days=float(rng.choice([0.0, 0.0, 1.0, 2.0, 3.5])),
    )


def random_plan(rng: np.random.Generator, most_days: int = 150) -> BlockPlan:
    days = int(rng.integers(1, most_days + 1))
    start = FIRST + np.timedelta64(int(rng.integers(0, 60)), "D")
    net = np.where(rng.random(days) < 0.12, rng.gamma(2.0, 15.0, days), 0.0)
    correction = np.where(rng.random(days) < 0.03, rng.normal(0.0, 30.0, days), 0.0)
    profile = random_profile(rng)
    table = bool(rng.random() < 0.2)
    return BlockPlan(
        season=random_season(rng, start),
        profile=profile,
        start=start,
        days=days,
        irrigation_gross=net / rng.uniform(0.5, 1.0),
        irrigation_net=net,
        irrigation_fw=np.where(net > 0.0, rng.uniform(0.2, 1.0), np.nan),
        under_canopy=bool(rng.random() < 0.2),
        root_wetted_fraction=rng.uniform(0.2, 1.0) if rng.random() < 0.3 else 1.0,
        initial_depletion_mm=rng.uniform(-40.0, 200.0) if rng.random() < 0.4 else None,
        initial_depletion_fraction=rng.random(),
        initial_subsoil_depletion_fraction=rng.random(),
        initial_evaporation_depletion_mm=rng.uniform(0.0, 30.0),
        correction=correction if rng.random() < 0.5 else None,
        capillary_rise=rng.uniform(0.0, 2.0, days) if rng.random() < 0.2 else None,
        salt_factor=rng.uniform(0.0, 1.0) if rng.random() < 0.2 else 1.0,
        water_table_m=rng.uniform(0.1, 3.0, days) if table else None,
        rising_soil=RisingSoil(
            conductivity_mm_d=rng.uniform(1.0, 2000.0),
            air_entry_m=rng.uniform(0.05, 1.0),
            pore_index=rng.uniform(0.1, 0.7),
        )
        if table
        else None,
        subsoil_layer_depletion=tuple(float(x) for x in rng.random(len(profile.layers)))
        if rng.random() < 0.3
        else None,
        same_day=str(rng.choice(["irrigation", "weighted"])),
    )


def random_weather(rng: np.random.Generator, days: int) -> BlockWeather:
    tmin = rng.uniform(-5.0, 25.0, days)
    return BlockWeather(
        tmin=tmin,
        tmax=tmin + rng.uniform(0.0, 20.0, days),
        eto=np.maximum(rng.normal(5.0, 2.5, days), -0.2),
        rain=np.where(rng.random(days) < 0.2, rng.gamma(1.0, 15.0, days), 0.0),
        u2=rng.uniform(0.2, 8.0, days),
        rh_min=rng.uniform(5.0, 100.0, days),
        rung=rng.integers(0, 10, days).astype(np.int8),
        rn=rng.uniform(-1.0, 20.0, days),
    )


def random_blocks(
    seed: int, count: int, most_days: int = 150
) -> tuple[list[BlockPlan], list[BlockWeather]]:
    rng = np.random.default_rng(seed)
    plans = [random_plan(rng, most_days) for _ in range(count)]
    return plans, [random_weather(rng, plan.days) for plan in plans]
