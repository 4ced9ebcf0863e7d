"""A small root-zone balance, used only to let the invented growers water at believable times.

Short forms of FAO Irrigation and Drainage Paper 56: equations 6, 39, 62, 66, 71-79, 82-88.
"""

from dataclasses import dataclass, field
from datetime import date, timedelta
from itertools import accumulate
from typing import Any

import numpy as np
from make_crops import NUMBERS
from make_tables import TEXTURES
from make_weather import PER_DAY, Array, Weather, saturation


@dataclass
class Days:
    """A station's days as the program will see them, from `first` on."""

    first: date
    eto: Array
    rain: Array
    u2: Array
    rh_min: Array
    rn: Array
    tmax: Array
    tmin: Array
    ea: Array
    elevation: float
    # climate term of FAO-56 equation 62 without its (h/3)^0.3: of the day, of the last 30 days
    today: list[float] = field(default_factory=list)
    slope: list[float] = field(default_factory=list)

    def __post_init__(self) -> None:
        """The climate terms, once."""
        for i in range(len(self.eto)):
            self.today.append(self._term(slice(i, i + 1)))
            self.slope.append(self._term(slice(max(i - 29, 0), i + 1)))

    def _term(self, days: slice) -> float:
        u2 = min(max(float(self.u2[days].mean()), 1), 6)
        rh = min(max(float(self.rh_min[days].mean()), 20), 80)
        return 0.04 * (u2 - 2) - 0.004 * (rh - 45)

    def ahead(self, today: date) -> "Days":
        """These days up to yesterday, then dry days like the last seven."""
        i = self.at(today)

        def on(values: Array, usual: float) -> Array:
            return np.concatenate([values[:i], np.full(16, usual)])

        names = ("eto", "u2", "rh_min", "rn", "tmax", "tmin", "ea")
        parts: dict[str, Any] = {
            k: on(getattr(self, k), float(getattr(self, k)[i - 7 : i].mean())) for k in names
        }
        return Days(self.first, rain=on(self.rain, 0.0), elevation=self.elevation, **parts)

    def reference_et(self) -> Array:
        """Reference ET of what these days hold now [mm d-1]."""
        return reference_et(self.tmax, self.tmin, self.ea, self.rn, self.u2, self.elevation)

    def at(self, day: date) -> int:
        return (day - self.first).days


def net_longwave(tmax: Array, tmin: Array, ea: Array, ratio: Array) -> Array:
    """FAO-56 equation 39 [MJ m-2 d-1]."""
    warmth = ((tmax + 273.16) ** 4 + (tmin + 273.16) ** 4) / 2
    cover = 1.35 * np.clip(ratio, 0.3, 1.0) - 0.35
    return np.asarray(4.901e-9 * warmth * (0.34 - 0.14 * np.sqrt(ea)) * cover)


def reference_et(
    tmax: Array, tmin: Array, ea: Array, rn: Array, u2: Array, elevation: float
) -> Array:
    """ASCE-EWRI short reference ET [mm d-1]."""
    gamma = 0.000665 * 101.3 * ((293 - 0.0065 * elevation) / 293) ** 5.26
    t = (tmax + tmin) / 2
    slope = 4098 * saturation(t) / (t + 237.3) ** 2
    deficit = np.maximum((saturation(tmax) + saturation(tmin)) / 2 - ea, 0)
    top = 0.408 * slope * rn + gamma * 900 / (t + 273) * u2 * deficit
    return np.asarray(np.maximum(top / (slope + gamma * (1 + 0.34 * u2)), 0))


def station_days(weather: Weather, measures: str) -> Days:
    """The days of a station that measures "four components", "solar" or only "temperature"."""
    n = len(weather.end) // PER_DAY

    def by_day(name: str) -> Array:
        return weather[name][: n * PER_DAY].reshape(n, PER_DAY)

    z = weather.place.elevation
    tmax, tmin = by_day("t").max(axis=1), by_day("t").min(axis=1)
    u2, ea = by_day("wind").mean(axis=1), by_day("ea").mean(axis=1)
    ra, rs = (by_day(k).mean(axis=1) * 0.0864 for k in ("above", "sw_down"))
    rh_min = by_day("rh").min(axis=1)
    if measures == "temperature":
        ea, u2 = saturation(tmin), np.full(n, 2.0)
        rs = np.minimum(0.16 * np.sqrt(tmax - tmin), 0.77) * ra
        rh_min = 100 * ea / saturation(tmax)
    if measures == "four components":
        net = weather["sw_down"] - weather["sw_up"] + weather["lw_down"] - weather["lw_up"]
        rn = net[: n * PER_DAY].reshape(n, PER_DAY).mean(axis=1) * 0.0864
    else:
        rn = 0.77 * rs - net_longwave(tmax, tmin, ea, rs / ((0.75 + 2e-5 * z) * ra))
    first = weather.end[0].astype("datetime64[D]").astype(date)
    eto = reference_et(tmax, tmin, ea, rn, u2, z)
    return Days(first, eto, by_day("rain").sum(axis=1), u2, rh_min, rn, tmax, tmin, ea, z)


def mixed(own: Days, energy: Days, wind: Days, rain: Days) -> Days:
    """The days of a field that takes its variables from several stations."""
    eto = reference_et(own.tmax, own.tmin, own.ea, energy.rn, wind.u2, own.elevation)
    return Days(
        own.first,
        eto,
        rain.rain,
        wind.u2,
        own.rh_min,
        energy.rn,
        own.tmax,
        own.tmin,
        own.ea,
        own.elevation,
    )


@dataclass
class Crop:
    """A season's crop numbers, the handbook's unless the season overrides them."""

    dual: bool
    stages: list[int]
    k: tuple[float, float, float]
    height: float
    root: tuple[float, float]
    p: float
    mad: float | None
    perennial: bool
    kc_min: float = 0.15

    def curve(self, day: int, term: float) -> float:
        """Crop coefficient on a day after planting (1 = planting), climate-adjusted by `term`."""
        ini, dev, mid, late = accumulate(self.stages)
        middle, last = (v + term if v >= 0.45 else v for v in self.k[1:])
        if day <= ini:
            return self.k[0]
        if day <= dev:
            return self.k[0] + (middle - self.k[0]) * (day - ini) / (dev - ini)
        if day <= mid:
            return middle
        return middle + (last - middle) * min((day - mid) / (late - mid), 1.0)


def crop_of(season: dict[str, Any]) -> Crop:
    """The crop numbers of a season of the book."""
    (ini, mid, end), height, p, perennial = NUMBERS[season["crop"]]
    dual = season.get("coefficients", "dual") == "dual"
    prefix = "kcb" if dual else "kc"
    deepest = season["root_depth_max_m"]
    return Crop(
        dual=dual,
        stages=season["stage_days"],
        k=(
            season.get(f"{prefix}_ini", ini),
            season.get(f"{prefix}_mid", mid),
            season.get(f"{prefix}_end", end),
        ),
        height=season.get("height_m", height),
        root=(season.get("root_depth_min_m", deepest), deepest),
        p=p,
        mad=season.get("mad"),
        perennial=perennial,
    )


@dataclass
class Soil:
    """Bottoms, field capacity and wilting point of the layers; the evaporation layer."""

    layers: list[tuple[float, float, float]]
    rew: float
    tew: float
    drainage_days: int

    def taw(self, depth: float) -> float:
        total, top = 0.0, 0.0
        for bottom, fc, wp in self.layers:
            total += 1000 * max(min(bottom, depth) - top, 0) * (fc - wp)
            top = bottom
        return total


def soil_of(part: dict[str, Any]) -> Soil:
    """The numbers of a soil of the book."""
    layers, rew = [], part.get("rew_mm")
    for layer in part["layers"]:
        if "texture" in layer:
            fc, wp, evaporable = TEXTURES[layer["texture"]]
            rew = rew or evaporable
        else:
            fc, wp = layer["field_capacity"], layer["wilting_point"]
        layers.append((layer["bottom_m"], fc, wp))
    tew = 100 * (layers[0][1] - 0.5 * layers[0][2])
    return Soil(layers, float(rew or 8), tew, part.get("drainage_days", 0))


@dataclass
class Root:
    """The running state of one block."""

    crop: Crop
    soil: Soil
    share: float  # wetted part of the root zone
    depletion: float = 0.0
    top: float = 0.0
    wetted: float = 1.0
    height: float = 0.0
    taw: float = 1.0
    limit: float = 1.0
    etc: float = 0.0
    soaked: int = 0  # days in a row above field capacity

    def start(self, fraction: float) -> None:
        depth = self.crop.root[1] if self.crop.perennial else self.crop.root[0]
        self.taw = self.soil.taw(depth) * self.share
        self.depletion = fraction * self.taw
        self.limit = (self.crop.mad or self.crop.p) * self.taw

    def day(self, number: int, i: int, w: Days, net: float, fw: float, under: bool) -> None:
        """One day: water first, then evapotranspiration, then drainage."""
        c, eto, slope = self.crop, float(w.eto[i]), w.slope[i]
        k = c.curve(number, slope * (c.height / 3) ** 0.3)
        middle = c.k[1] + (slope * (c.height / 3) ** 0.3 if c.k[1] >= 0.45 else 0)
        self.height = max(self.height, c.height * min(k / middle, 1), 0.05)
        if not c.perennial:
            grown = min(max((k - c.k[0]) / (middle - c.k[0]), 0), 1)
            if number > sum(c.stages[:2]):
                grown = 1.0
            depth = c.root[0] + (c.root[1] - c.root[0]) * grown
            self.taw = max(self.taw, self.soil.taw(depth) * self.share)
        rain = float(w.rain[i])
        cover = 0.0
        ke = 0.0
        self.depletion = self.depletion - rain * self.share - net
        if c.dual:
            kc_max = max(1.2 + w.today[i] * (self.height / 3) ** 0.3, k + 0.05)
            open_ = max(k - c.kc_min, 0.01) / max(kc_max - c.kc_min, 0.01)
            cover = min(open_ ** (1 + 0.5 * self.height), 0.99)
            if under:
                fw *= 1 - 2 / 3 * cover
            if net > 0:
                self.wetted = fw
            elif rain > 3:
                self.wetted = 1.0
            exposed = max(min(1 - cover, self.wetted), 0.01)
            self.top = max(self.top - rain - (net / fw if net > 0 else 0), 0)
            dry = self.soil.tew - self.top
            kr = 1.0 if self.top <= self.soil.rew else max(dry / (self.soil.tew - self.soil.rew), 0)
            ke = min(kr * (kc_max - k), exposed * kc_max)
            ke = min(ke, max(dry, 0) * exposed / max(eto, 0.1))
            self.top = min(self.top + ke * eto / exposed, self.soil.tew)
        p = min(max(c.p + 0.04 * (5 - (k + ke) * eto), 0.1), 0.8)
        ks = 1.0
        if self.depletion > p * self.taw:
            ks = max((self.taw - self.depletion) / ((1 - p) * self.taw), 0)
        self.etc = (ks * k + ke) * eto
        self.depletion = min(self.depletion + self.etc, self.taw)
        excess = max(-self.depletion, 0.0)
        self.soaked = self.soaked + 1 if excess else 0
        wait = self.soil.drainage_days
        self.depletion += excess / max(wait + 2 - self.soaked, 1) if wait else excess
        self.limit = (c.mad if c.mad is not None else p) * self.taw


def stretch(first: str | date, last: str | date) -> set[date]:
    """Every day from first to last, both included."""
    a = date.fromisoformat(first) if isinstance(first, str) else first
    b = date.fromisoformat(last) if isinstance(last, str) else last
    return {a + timedelta(k) for k in range((b - a).days + 1)}
