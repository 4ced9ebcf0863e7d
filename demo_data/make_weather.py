"""The invented valley's weather: one latent series of fronts, cloud and air for all stations.

Everything is local standard time. A step's value is the mean (rain: the sum) over the step that
ENDS at its time. Standard formulas: sun and clear-sky radiation after FAO Irrigation and Drainage
Paper 56 (equations 21-28, Annex 3 equations 3-17 to 3-20); clear-sky longwave with a water-vapour
emissivity; surface temperature by the Penman-Monteith energy balance of clipped, watered grass.
"""

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
SIGMA = 5.670374e-8
STEP_MIN = 30
PER_DAY = 24 * 60 // STEP_MIN
STEP_H = STEP_MIN / 60


@dataclass(frozen=True)
class Place:
    """Where a station stands and how its air differs from the valley's."""

    key: str
    name: str
    latitude: float
    longitude: float
    elevation: float
    wind_factor: float
    warm_nights: float  # degC added to clear nights (above the cold pool)
    moist: float  # degC added to the dew point
    rain_factor: float


@dataclass
class Weather:
    """A station's true weather, one value a step."""

    place: Place
    end: NDArray[np.datetime64]
    values: dict[str, Array] = field(default_factory=dict)

    def __getitem__(self, name: str) -> Array:
        return self.values[name]


def saturation(temperature: Array) -> Array:
    """Saturation vapour pressure [kPa] of a temperature [degC]."""
    return np.asarray(0.6108 * np.exp(17.27 * temperature / (temperature + 237.3)))


def persistent(rng: np.random.Generator, n: int, hours: float) -> Array:
    """A standard normal series that forgets itself over `hours`."""
    keep = np.exp(-STEP_H / hours)
    shock = rng.standard_normal(n) * np.sqrt(1 - keep**2)
    out = np.empty(n)
    value = rng.standard_normal()
    for i in range(n):
        value = keep * value + shock[i]
        out[i] = value
    return out


def running_mean(values: Array, width: int) -> Array:
    """Centred mean over `width` steps, its ends held."""
    padded = np.pad(values, (width // 2, width - 1 - width // 2), mode="edge")
    total = np.cumsum(np.insert(padded, 0, 0.0))
    return np.asarray((total[width:] - total[:-width]) / width)


def year_angle(end: NDArray[np.datetime64]) -> Array:
    """Day of the year with its fraction, as an angle, zero on 1 January."""
    since = (end - end.astype("datetime64[Y]")) / np.timedelta64(1, "D")
    return np.asarray(2 * np.pi * since / 365.25)


def warm(angle: Array, lag_days: float = 20) -> Array:
    """The season: -1 in the depth of winter, +1 in high summer."""
    return np.asarray(-np.cos(angle - 2 * np.pi * lag_days / 365.25))


def sun(place: Place, end: NDArray[np.datetime64], utc_offset: float) -> tuple[Array, Array]:
    """Sine of the sun's height at mid-step (0 when it is down), sunlight above the air [W/m2]."""
    middle = end - np.timedelta64(STEP_MIN * 30, "s")
    day = (middle - middle.astype("datetime64[Y]")) / np.timedelta64(1, "D")
    hour = (day % 1) * 24
    number = np.floor(day) + 1
    declination = 0.409 * np.sin(2 * np.pi * number / 365 - 1.39)
    b = 2 * np.pi * (number - 81) / 364
    equation = 0.1645 * np.sin(2 * b) - 0.1255 * np.cos(b) - 0.025 * np.sin(b)
    solar = hour + (place.longitude - 15 * utc_offset) / 15 + equation
    latitude = np.radians(place.latitude)
    height = np.sin(latitude) * np.sin(declination) + np.cos(latitude) * np.cos(
        declination
    ) * np.cos(np.pi / 12 * (solar - 12))
    height = np.maximum(height, 0.0)
    return height, 1361.0 * (1 + 0.033 * np.cos(2 * np.pi * number / 365)) * height


def clear_sky(height: Array, above: Array, pressure: Array, ea: Array, clean: Array) -> Array:
    """Shortwave below a cloudless sky [W/m2], FAO-56 Annex 3 equations 3-17 to 3-20."""
    sine = np.maximum(height, 0.03)
    water = 0.14 * ea * pressure + 2.1
    beam = 0.98 * np.exp(-0.00146 * pressure / (clean * sine) - 0.091 * (water / sine) ** 0.25)
    diffuse = np.where(beam >= 0.15, 0.35 - 0.33 * beam, 0.18 + 0.82 * beam)
    return np.asarray(0.985 * (beam + diffuse) * above)


def fronts(
    rng: np.random.Generator, end: NDArray[np.datetime64], knobs: dict[str, Any]
) -> dict[str, Array]:
    """Fronts by chance: cloud shield, rain all stations share, cold after them, wind with them."""
    n = len(end)
    season = warm(year_angle(end), 70)
    cloud, rain, cold, wind = (np.zeros(n) for _ in range(4))
    i = int(rng.exponential(4) * PER_DAY)
    while i < n:
        s = season[i]
        length = rng.uniform(14, 40 - 8 * s)
        reach = int(length / STEP_H)
        stretch = np.arange(max(0, i - reach // 2), min(n, i + reach // 2))
        shape = 1 - np.abs((stretch - i) / (reach / 2)) ** 2
        strength = rng.uniform(0.55, 1.0) - 0.10 * s
        cloud[stretch] = np.maximum(cloud[stretch], np.clip(1.6 * strength * shape, 0, 1))
        wind[stretch] += strength * shape
        tail = np.arange(i, min(n, i + 4 * PER_DAY))
        cold[tail] -= (3.2 - 0.8 * s) * strength * np.exp(-(tail - i) * STEP_H / 34)
        if rng.random() < 0.74 - 0.28 * s:
            total = rng.gamma(1.1, knobs["front_rain_mm"]) * strength
            hours = int(rng.uniform(4, 11 - 3 * s) / STEP_H)
            wet = np.arange(i, min(n, i + hours))
            if len(wet):
                share = rng.gamma(0.45, 1.0, len(wet))
                rain[wet] += total * share / share.sum()
                cloud[wet] = np.maximum(cloud[wet], 0.9)
        i += int((2.2 + rng.exponential(4.6 + 4.6 * max(s, -0.4))) * PER_DAY)
    return {"cloud": cloud, "rain": rain, "cold": cold, "wind": wind}


def storms(
    rng: np.random.Generator,
    end: NDArray[np.datetime64],
    places: list[Place],
    knobs: dict[str, Any],
) -> tuple[Array, dict[str, Array]]:
    """Summer thunderstorms: cloud of the valley's storm days, and each station's own rain."""
    n = len(end)
    cloud = np.zeros(n)
    rain = {p.key: np.zeros(n) for p in places}
    season = warm(year_angle(end))
    plan = [
        (np.datetime64(when), hours, dict(zip([p.key for p in places], depths, strict=True)))
        for when, hours, depths in knobs["storms"]
    ]
    quiet = [tuple(np.datetime64(day) for day in span) for span in knobs["no_other_storms"]]
    for first in range(0, n, PER_DAY):
        chance = 0.085 * max(season[first] - 0.15, 0) / 0.85
        hit, hour, hours = rng.random() < chance, rng.uniform(14.5, 20), rng.uniform(0.6, 2.0)
        heavy = rng.gamma(1.5, 5.0)
        felt = np.where(rng.random(len(places)) < 0.6, rng.uniform(0.3, 1.5, len(places)), 0.0)
        if hit and not any(a <= end[first] <= b for a, b in quiet):
            depths = {p.key: heavy * f for p, f in zip(places, felt, strict=True)}
            plan.append((end[first] + np.timedelta64(int(hour * 60), "m"), hours, depths))
    for when, hours, depths in plan:
        i = int((when - end[0]) / np.timedelta64(STEP_MIN, "m"))
        last = max(i + 1, i + int(hours / STEP_H))
        wet = np.arange(i, min(n, last))
        anvil = np.arange(max(0, i - int(3 / STEP_H)), min(n, last + int(4 / STEP_H)))
        cloud[anvil] = np.maximum(cloud[anvil], 0.72)
        cloud[wet] = 0.97
        for p in places:
            share = rng.gamma(1.0, 1.0, len(wet))
            if len(wet):
                rain[p.key][wet] += depths[p.key] * share / share.sum()
    return cloud, rain


def _slab(heat: Array, hours: float) -> Array:
    """What a body that loses its excess over `hours` makes of a heating [degC/h]."""
    keep = np.exp(-STEP_H / hours)
    out = np.empty_like(heat)
    value = 0.0
    for i, h in enumerate(heat):
        value = keep * value + (1 - keep) * hours * h
        out[i] = value
    return out


def longwave_down(temperature: Array, ea: Array, cloud: Array, height: Array) -> Array:
    """Infrared of the sky [W/m2]: emissivity of clear air by its water, raised by cloud.

    The clear emissivity is higher by night, when the air at the mast is colder than the air above.
    """
    kelvin = temperature + 273.15
    water = 46.5 * 10 * ea / kelvin
    clear = 1 - (1 + water) * np.exp(-np.sqrt(1.2 + 3 * water))
    clear = clear - 0.014 - 0.030 * np.minimum(height, 0.7)
    cover = 0.84 * cloud**1.2
    return np.asarray(((1 - cover) * clear + cover) * SIGMA * kelvin**4)


def grass(values: dict[str, Array], pressure: Array, height: Array) -> tuple[Array, Array]:
    """Upward shortwave and longwave [W/m2] of clipped, watered grass 0.12 m high."""
    up = values["sw_down"] * (0.216 + 0.085 * np.exp(-6.0 * height) * (1 - 0.6 * values["cloud"]))
    ta, sky = values["t"], values["lw_down"]
    kelvin = ta + 273.15
    day = values["sw_down"] > 20
    ra = 208 / np.clip(values["wind"], 0.7, None)
    rs = np.where(day, 60.0, 180.0)
    gamma = 0.000665 * pressure
    gamma_star = gamma * (1 + rs / ra)
    slope = 4098 * saturation(ta) / (ta + 237.3) ** 2
    density = 1.02 * 3.486 * pressure / (1.01 * kelvin)
    deficit = np.maximum(saturation(ta) - values["ea"], 0)
    difference = np.zeros_like(ta)
    for _ in range(6):
        out = 0.98 * SIGMA * (kelvin + difference) ** 4 + 0.02 * sky
        net = values["sw_down"] - up + sky - out
        available = net * np.where(net > 0, 0.9, 0.5)
        solved = (gamma_star * ra / (density * 1013) * available - deficit) / (slope + gamma_star)
        difference = 0.5 * difference + 0.5 * np.clip(solved, -5, 9)
    return up, 0.98 * SIGMA * (kelvin + difference) ** 4 + 0.02 * sky


def make(places: list[Place], knobs: dict[str, Any]) -> list[Weather]:
    """The weather of every place from knobs["first"] to knobs["last"], the same for one seed."""
    rng = np.random.default_rng(knobs["seed"])
    first, last = np.datetime64(knobs["first"], "m"), np.datetime64(knobs["last"], "m")
    end = np.arange(first + np.timedelta64(STEP_MIN, "m"), last + 1, np.timedelta64(STEP_MIN, "m"))
    n = len(end)
    angle = year_angle(end)
    season = warm(angle)
    front = fronts(rng, end, knobs)
    storm_cloud, storm_rain = storms(rng, end, places, knobs)

    slow, fast = persistent(rng, n, 22), persistent(rng, n, 1.5)
    clock = ((end - end.astype("datetime64[D]")) / np.timedelta64(1, "h")).astype(float)
    heap = np.clip(np.sin((clock - 10) / 10 * np.pi), 0, None) * (clock > 10)
    fair = 1 / (1 + np.exp(-(-1.5 - 1.5 * season + 1.9 * slow + 0.35 * fast + 0.9 * heap)))
    fair = np.where(fair < 0.12, 0.0, fair)
    cloud = 1 - (1 - fair) * (1 - front["cloud"]) * (1 - storm_cloud)
    cloud = np.clip(cloud * (1 + 0.10 * fast * (cloud < 0.9)), 0, 1)

    clean = np.clip(0.89 - 0.045 * season + 0.03 * persistent(rng, n, 90), 0.78, 1.0)
    air = persistent(rng, n, 80) * (2.7 - 0.9 * season)
    moisture = persistent(rng, n, 60) * 2.3
    breath = persistent(rng, n, 20) * 0.32
    sway = persistent(rng, n, 90)
    made = []
    for place in places:
        own = [persistent(rng, n, h) for h in (2, 8, 1.2)]
        made.append(
            _station(
                place,
                end,
                knobs,
                season,
                clock,
                cloud,
                clean,
                front,
                storm_rain[place.key],
                air,
                moisture,
                breath,
                sway,
                own,
            )
        )
    return made


def _station(
    place: Place,
    end: NDArray[np.datetime64],
    knobs: dict[str, Any],
    season: Array,
    clock: Array,
    valley_cloud: Array,
    clean: Array,
    front: dict[str, Array],
    storm_rain: Array,
    air: Array,
    moisture: Array,
    breath: Array,
    sway: Array,
    own: list[Array],
) -> Weather:
    n = len(end)
    cloud = np.clip(valley_cloud + 0.05 * own[0] * (valley_cloud > 0.05), 0, 1)
    rain = (front["rain"] * np.clip(1 + 0.22 * own[1], 0.3, 2) + storm_rain) * place.rain_factor
    rain = np.where(rain < 0.05, 0.0, rain)
    height, above = sun(place, end, knobs["utc_offset_h"])
    pressure = (
        101.3
        * ((293 - 0.0065 * place.elevation) / 293) ** 5.26
        * (1 - 0.0055 * front["wind"] + 0.0045 * sway)
    )
    through = 1 - 0.76 * cloud**2.6
    rough = 0.75 * above * through
    heating = 0.0072 * rough - 0.80 * (1 - 0.82 * cloud)
    diurnal = _slab(heating, 5.0)
    mean = running_mean(diurnal, 24 * PER_DAY)
    wander = diurnal - mean
    lapse = -0.0065 * (place.elevation - 740)
    base = knobs["mean_t"] + knobs["season_t"] * season
    t = base + lapse + air + front["cold"] + 0.92 * wander + 0.12 * own[2]
    t = t + place.warm_nights * (wander < 0) * np.clip(-wander / 6, 0, 1) * (1 - cloud)

    dew = (
        knobs["mean_dew"]
        + knobs["season_dew"] * season
        + 0.6 * lapse
        + 0.55 * (air + front["cold"])
        + moisture
        + 2.6 * front["cloud"]
        + place.moist
        + 0.25 * own[0]
        + 0.8 * np.sin((clock - 4) / 24 * 2 * np.pi) * (season > 0)
    )
    after = _slab(np.minimum(rain / STEP_H, 3.0) * 0.9, 9.0)
    dew = dew + np.minimum(after, 3.2)
    spread = t - dew
    wetness = 1 - np.exp(-np.minimum(rain, 2) / 0.25)
    wetness = np.maximum(wetness, 0.8 * np.minimum(_slab(wetness / 1.5, 1.5), 1))
    t = t - 0.5 * spread * wetness * (spread > 0)
    dew = np.where(spread > 0, dew + 0.38 * spread * wetness, dew)
    floor = 0.25 + 0.12 * np.abs(own[1])
    dew = np.minimum(dew, t - floor)
    dew = np.maximum(dew, t - 33)
    ea = saturation(dew)

    breeze = np.clip(np.sin((clock - 8.5) / 13 * np.pi), 0, None) * ((clock > 8.5) & (clock < 21.5))
    wind = np.exp(
        np.log(knobs["wind"])
        - 0.25
        + 0.10 * season
        + 0.75 * breeze * (1 - 0.45 * cloud)
        + 0.75 * front["wind"]
        + breath
        + 0.24 * own[2]
        + 0.45 * (storm_rain > 0)
    )
    wind = np.clip(wind * place.wind_factor, 0.15, 17)

    sky = clear_sky(height, above, pressure, ea, clean)
    jitter = 1 + 0.10 * own[2] * np.clip(4 * cloud * (1 - cloud), 0, 1)
    sw = np.minimum(sky * through * np.clip(jitter, 0.4, 1.12), 0.84 * above)
    values = {
        "t": t,
        "dew": dew,
        "ea": ea,
        "wind": wind,
        "rain": rain,
        "cloud": cloud,
        "sw_down": sw,
        "pressure": pressure,
        "height": height,
        "above": above,
    }
    values["rh"] = 100 * ea / saturation(t)
    values["lw_down"] = longwave_down(t, ea, cloud, height)
    values["sw_up"], values["lw_up"] = grass(values, pressure, height)
    assert all(len(v) == n for v in values.values())
    return Weather(place, end, values)
