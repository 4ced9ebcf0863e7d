"""How well the outlook would have spoken on real records: what it foretold, and what came.

`python -m tests.journey.hindcast` prints the tables. Records: NOAA daily summaries 2012-2015 as
carried in vega_datasets; the hourly typical years 723170 and 703165 of the pvlib wheel (NREL TMY3
user's manual). The usual, the sequences and the range read only days before each morning.
"""

import csv
from dataclasses import dataclass, replace
from importlib.resources import files
from pathlib import Path

import numpy as np

from app.science import Bools, Days, Floats, Ints
from app.science.crop.season import CropSeason
from app.science.energy.records import DailyWeather, Site
from app.science.energy.station_day import station_days
from app.science.energy.usual import usual_for_date
from app.science.ledger import Ahead, BlockPlan, BlockWeather, block_ledgers, ensemble_depletions
from app.science.outlook.ensemble import Spread
from app.science.outlook.sequences import past_sequences
from app.science.outlook.usual import usual_ahead
from app.science.soil.profile import Layer, Profile

HORIZON = 14
LEADS = (1, 3, 7, 14)
WEATHER_ONLY = Spread(kc=0.0, taw=0.0, efficiency=0.0, rain=0.0, rain_mm=0.0, energy=0.0)
SOIL = Profile(layers=(Layer(3.0, 0.30, 0.15, 0.45),), rew_mm=8.0)
BLOCK_DAYS = 21
"""Length of the blocks of the bootstrap: longer than the horizon, so that blocks hold whole
spells."""


@dataclass(frozen=True)
class Record:
    """A station's days: ETo, Ra and rain, (days,)."""

    name: str
    date: Days
    eto: Floats
    ra: Floats
    rain: Floats


def daily_record() -> Record:
    """Four years of daily temperatures, wind and rain: rung 8."""
    path = Path(str(files("vega_datasets"))) / "_data" / "seattle-weather.csv"
    with path.open(newline="") as source:
        rows = list(csv.DictReader(source))
    date = np.array([row["date"].replace("/", "-") for row in rows], dtype="datetime64[D]")
    weather = replace(
        DailyWeather.missing(date),
        tmax=np.array([float(row["temp_max"]) for row in rows]),
        tmin=np.array([float(row["temp_min"]) for row in rows]),
        wind=np.array([float(row["wind"]) for row in rows]),
        rain=np.array([float(row["precipitation"]) for row in rows]),
    )
    site = Site(
        latitude_deg=47.45, longitude_deg=-122.31, elevation_m=130, utc_offset_h=-8,
        wind_height_m=10, coastal=True,
    )  # fmt: skip
    return _record("NOAA daily 2012-2015", site, weather)


def typical_year(name: str, site: Site) -> Record:
    """A typical year's hours as days: shortwave, temperature, humidity and wind, rung 5.

    Its rain stands in tenths of a millimetre whatever its header says: the steps are 3, 5, 8, 10,
    hundredths of an inch, and the year of 723170 adds up to 8345.
    """
    path = Path(str(files("pvlib"))) / "data" / name
    with path.open(newline="") as source:
        next(source)
        rows = list(csv.DictReader(source))

    def hours(column: str) -> Floats:
        return np.array([float(row[column]) for row in rows]).reshape(-1, 24)

    air, humidity = hours("Dry-bulb (C)"), hours("RHum (%)")
    date = np.datetime64("2025-01-01") + np.arange(air.shape[0])
    weather = replace(
        DailyWeather.missing(date),
        tmax=air.max(axis=1),
        tmin=air.min(axis=1),
        rh_max=humidity.max(axis=1),
        rh_min=humidity.min(axis=1),
        wind=hours("Wspd (m/s)").mean(axis=1),
        shortwave_down=hours("GHI (W/m^2)").sum(axis=1) * 0.0036,
        rain=0.1 * np.maximum(hours("Lprecip depth (mm)"), 0.0).sum(axis=1),
    )
    return _record(f"typical year {name[:6]}", site, weather)


def typical_years() -> list[Record]:
    """The two of the pvlib wheel: one in a humid temperate climate, one on a subpolar coast."""
    southern = Site(
        latitude_deg=36.1, longitude_deg=-79.95, elevation_m=273, utc_offset_h=-5, wind_height_m=10
    )
    northern = Site(
        latitude_deg=55.32, longitude_deg=-160.52, elevation_m=7, utc_offset_h=-9, wind_height_m=10
    )
    return [typical_year("723170TYA.CSV", southern), typical_year("703165TY.csv", northern)]


def _record(name: str, site: Site, weather: DailyWeather) -> Record:
    days = station_days(site, weather)
    return Record(name, weather.date, days.eto, days.ra, weather.rain)


@dataclass(frozen=True)
class Morning:
    """What was foretold on one morning, (HORIZON,) and its sequences."""

    place: int
    eto: Floats
    ahead: Ahead


def mornings(record: Record, places: Ints) -> list[Morning]:
    """What the outlook would have said on the mornings at these places of the record."""
    found = []
    for t in places.tolist():
        past, ahead = slice(t), slice(t, t + HORIZON)
        days = record.date[: t + HORIZON]
        usual = usual_for_date(days, record.date[past], record.eto[past])
        eto = usual_ahead(record.eto[past], record.ra[past], record.ra[ahead], usual)
        sequences = past_sequences(
            record.date[t], record.date[past], record.eto[past], record.rain[past],
            record.ra[past], HORIZON,
        )  # fmt: skip
        members = sequences.eto(eto, record.ra[ahead])
        found.append(Morning(t, eto, Ahead(0, members, sequences.rain)))
    return found


def growing_days(record: Record, first_year: bool = False) -> Ints:
    """Mornings of April to September with 100 days of record before and the horizon after; the
    first year of a longer record only teaches, unless `first_year`."""
    month = record.date.astype("datetime64[M]").astype(np.int64) % 12 + 1
    place = np.arange(record.date.size)
    least = 100 if first_year or record.date.size < 400 else 365
    return place[
        (month >= 4) & (month <= 9) & (place >= least) & (place + HORIZON <= record.date.size)
    ]


def plan(start: np.datetime64, days: int, depletion: float, mad: float) -> BlockPlan:
    """A full green cover with 180 mm of available water, watered evenly; limit `mad` x 180 mm."""
    season = CropSeason(
        planting=start - np.timedelta64(60, "D"), stage_days=(5, 5, 400, 0),
        coefficients="single", k_ini=1.05, k_mid=1.05, k_end=1.05, height_max_m=0.5,
        root_min_m=0.2, root_max_m=1.2, depletion_fraction=0.5, mad=mad, perennial=True,
        climate_adjustment="none",
    )  # fmt: skip
    none = np.zeros(days)
    return BlockPlan(
        season=season, profile=SOIL, start=start, days=days, irrigation_gross=none,
        irrigation_net=none, irrigation_fw=np.full(days, np.nan), initial_depletion_mm=depletion,
    )  # fmt: skip


def sky(eto: Floats, rain: Floats) -> BlockWeather:
    """Weather of a plan in a climate that leaves coefficients alone."""
    days = eto.size
    return BlockWeather(
        eto=eto, rain=rain, u2=np.full(days, 2.0), rh_min=np.full(days, 45.0),
        rung=np.full(days, 9, np.int8), rn=np.full(days, np.nan),
    )  # fmt: skip


def covered(record: Record, said: list[Morning]) -> dict[int, Bools]:
    """By lead: whether the depletion that came lay within p10-p90 of the weather alone.

    Every morning opens at 40 mm of 180, so that neither field capacity nor stress bounds what a
    week of weather does; rain comes as it came. A ledger at field capacity with the range at field
    capacity counts as covered.
    """
    plans = [plan(record.date[one.place], HORIZON, 40.0, 0.5) for one in said]
    came = [slice(one.place, one.place + HORIZON) for one in said]
    truth = block_ledgers(plans, [sky(record.eto[days], record.rain[days]) for days in came])
    ranges = ensemble_depletions(
        plans,
        [sky(one.eto, np.zeros(HORIZON)) for one in said],
        range(len(said)),
        ahead=[one.ahead for one in said],
        spread=WEATHER_ONLY,
    )
    return {
        lead: np.array(
            [
                low[lead - 1] - 1e-9 <= ledger.depletion_mm[lead - 1] <= high[lead - 1] + 1e-9
                for ledger, (low, high) in zip(truth, ranges, strict=True)
            ]
        )
        for lead in LEADS
    }


def seven_days(record: Record, said: list[Morning]) -> tuple[Floats, Floats]:
    """Misses of the week's crop ET [mm], each (mornings,): of the outlook, and of persistence, the
    last seven days' mean carried on. Both under the same full cover, neither with rain."""
    kc = 1.05
    came = np.array([record.eto[one.place : one.place + 7].sum() for one in said])
    last = np.array([record.eto[one.place - 7 : one.place].sum() for one in said])
    told = np.array([one.eto[:7].sum() for one in said])
    return kc * (told - came), kc * (last - came)


@dataclass(frozen=True)
class Warnings:
    """Crossings of the limit and how many came unwarned; mornings warned and how many in vain."""

    crossings: int
    unwarned: int
    warned: int
    in_vain: int


def warnings(record: Record, said: list[Morning], limit: float) -> Warnings:
    """A field with its limit at `limit` mm, refilled the day after each crossing.

    A morning warns where p90 passes the limit within two days. A crossing is unwarned where the
    morning before it did not warn; a warning is in vain where no crossing comes in its two days.
    """
    mad = limit / 180.0
    by_place = {one.place: one for one in said}
    warns: dict[int, bool] = {}
    crossed: set[int] = set()
    for year in np.unique(record.date[list(by_place)].astype("datetime64[Y]")):
        depletion = 0.0
        for t in sorted(p for p in by_place if record.date[p].astype("datetime64[Y]") == year):
            one = by_place[t]
            two = plan(record.date[t], 2, depletion, mad)
            first = Ahead(0, one.ahead.eto[:2], one.ahead.rain[:2])
            _, high = ensemble_depletions(
                [two], [sky(one.eto[:2], np.zeros(2))], [t], ahead=[first]
            )[0]
            day = plan(record.date[t], 1, depletion, mad)
            closed = block_ledgers([day], [sky(record.eto[t : t + 1], record.rain[t : t + 1])])[0]
            warns[t] = bool((high > limit).any())
            depletion = float(closed.depletion_mm[0])
            if depletion > limit:
                crossed.add(t)
                depletion = 0.0
    known = [t for t in crossed if t - 1 in warns]
    in_vain = [t for t, warned in warns.items() if warned and not {t, t + 1} & crossed]
    return Warnings(
        len(known), sum(not warns[t - 1] for t in known), sum(warns.values()), len(in_vain)
    )


def covered_in_full(record: Record, fields: int, seed: int) -> dict[int, Bools]:
    """By day of the season: whether a field's own depletion lies within the ledger's full range.

    The fields are synthetic: each differs from its ledger by errors of another shape than the
    members' (log-normal for coefficients and soil, wandering from day to day as well; gamma for the
    gauge's rain; uniform for efficiency) of the same published or working size. They are watered
    by the ledger's depletion each time it passes 60 mm, as an advisor would.
    """
    lots = np.random.default_rng(seed)
    days, first = 120, int(np.flatnonzero(record.date == np.datetime64("2015-05-01"))[0])
    eto, rain = record.eto[first : first + days], record.rain[first : first + days]
    net = np.zeros(days)
    ledger_plan = plan(record.date[first], days, 0.0, 0.5)
    while True:
        watered = replace(
            ledger_plan,
            irrigation_net=net, irrigation_gross=net / 0.8,
            irrigation_fw=np.where(net > 0.0, 1.0, np.nan),
        )  # fmt: skip
        closing = block_ledgers([watered], [sky(eto, rain)])[0].depletion_mm
        passed = np.flatnonzero((closing[:-1] > 60.0) & (net[1:] == 0.0))
        if passed.size == 0:
            break
        net[passed[0] + 1] = closing[passed[0]]
    weather = replace(sky(eto, rain), rung=np.full(days, 8, np.int8), rn=eto / 0.3)
    low, high = ensemble_depletions([watered], [weather], [seed])[0]
    plans, skies = [], []
    for _ in range(fields):
        wander = np.zeros(days)
        for day in range(1, days):
            wander[day] = 0.5 * wander[day - 1] + lots.normal(0.0, 0.087)
        crop = np.exp(lots.normal(0.0, np.hypot(0.10, 0.10)) + wander)
        applied = net * np.clip(lots.uniform(0.86, 1.14), None, 1.25)
        held = np.exp(lots.normal(0.0, 0.10))
        plans.append(
            replace(
                watered,
                irrigation_net=applied,
                profile=replace(SOIL, layers=(Layer(3.0, 0.15 + 0.15 * held, 0.15, 0.50),)),
            )
        )
        caught = rain * lots.gamma(40.0, 1 / 40.0) * lots.gamma(12.0, 1 / 12.0, days)
        skies.append(sky(eto * crop, caught))
    truth = np.array([one.depletion_mm for one in block_ledgers(plans, skies)])
    return {
        day: (low[day] <= truth[:, day]) & (truth[:, day] <= high[day])
        for day in (13, 29, 59, 89, 119)
    }


def interval(values: Floats | Bools, seed: int = 1) -> tuple[float, float]:
    """90 % interval of a mean by the moving-block bootstrap, for values that follow each other."""
    lots = np.random.default_rng(seed)
    count = len(values)
    blocks = -(-count // BLOCK_DAYS)
    starts = lots.integers(0, max(count - BLOCK_DAYS, 0) + 1, (1000, blocks))
    places = (starts[:, :, None] + np.arange(BLOCK_DAYS)).reshape(1000, -1)[:, :count]
    low, high = np.percentile(
        np.asarray(values, float)[np.minimum(places, count - 1)].mean(1), [5, 95]
    )
    return float(low), float(high)


def main() -> None:
    """Print coverage, skill and warnings."""
    for record in [daily_record(), *typical_years()]:
        said = mornings(record, growing_days(record))
        print(f"{record.name}, {len(said)} mornings of April to September")
        for lead, inside in covered(record, said).items():
            low, high = interval(inside)
            print(f"  within p10-p90 at {lead:2d} days: {inside.mean():.2f} ({low:.2f}-{high:.2f})")
        outlook, persistence = seven_days(record, said)
        print(
            f"  week's crop ET, RMSE: outlook {_rmse(outlook):.2f} mm, persistence "
            f"{_rmse(persistence):.2f} mm, ratio {_rmse(outlook) / _rmse(persistence):.2f}, "
            f"bias {outlook.mean():+.2f} mm"
        )
        for limit in (12.0, 30.0, 60.0):
            found = warnings(record, said, limit)
            print(
                f"  limit {limit:.0f} mm: {found.unwarned} of {found.crossings} crossings unwarned,"
                f" {found.in_vain} of {found.warned} warnings in vain"
            )
    for day, inside in covered_in_full(daily_record(), 1000, seed=7).items():
        print(f"synthetic fields within the full range on day {day + 1}: {inside.mean():.2f}")


def _rmse(missed: Floats) -> float:
    return float(np.sqrt(np.mean(missed**2)))


if __name__ == "__main__":
    main()
