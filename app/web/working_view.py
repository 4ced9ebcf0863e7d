"""A day's working: every term of one ledger day with its equation, figures and source."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from app import wording
from app.science.constants import WIND_FLOOR
from app.science.energy.humidity import (
    atmospheric_pressure,
    mean_saturation_vapour_pressure,
    psychrometric_constant,
    saturation_slope,
)
from app.science.energy.ladder import USUAL
from app.science.soil.day import DayWorking
from app.storage.pages import EventRow, SourceRow
from app.storage.pages_field import BlockRow
from app.wording import number
from app.workflows.agronomy import PURPOSE_SHARE, gross_and_net, wetted_fraction
from app.workflows.day_working import Opened

EVENT_SOURCE = "event as entered"
FAO = "FAO-56"
Row = Mapping[str, Any]


@dataclass(frozen=True)
class Term:
    """One figure: what it is, its value and unit, how it comes about in symbols or words, who says
    so, and the same equation in figures (`sum`), which gives the value."""

    name: str
    value: str
    unit: str
    how: str
    source: str
    link: str = ""
    sum: str = ""


@dataclass(frozen=True)
class Section:
    """Terms that belong together."""

    title: str
    terms: tuple[Term, ...]


def working(
    row: Row,
    before: Row | None,
    block: BlockRow,
    opened: Opened,
    sources: Mapping[str, SourceRow],
    station_days: Mapping[int, Row],
    heights: Mapping[int, float],
    events: Sequence[EventRow],
) -> list[Section]:
    """The sections of one day, in the order in which the figures are made. heights: elevation of
    each station [m]."""
    day = opened.day
    sections = [
        Section("Energy", tuple(_energy(row, sources, station_days))),
        Section("Weather", tuple(_weather(sources, station_days))),
        Section("Reference ET", (_reference(row, sources, station_days, heights),)),
        Section("Roots and what they reach", tuple(_roots(day, block, opened))),
        Section("Water in", tuple(_water(row, day, block, sources, events))),
        Section("Soil evaporation", tuple(_evaporation(day) if day.dual else ())),
        Section("Crop ET", tuple(_crop(row, day, opened))),
        Section("Close of the day", tuple(_close(row, day, before))),
    ]
    return [section for section in sections if section.terms]


def _energy(row: Row, sources: Mapping[str, SourceRow], days: Mapping[int, Row]) -> list[Term]:
    source = sources.get("energy")
    day = days.get(source.station_id) if source else None
    how = f"rung {row['rung']}, {wording.rung(row['rung'])}"
    if source is not None:
        how += f", {source.station_name}"
    terms = []
    if row["rung"] == USUAL or day is None or day["rung"] == 0:
        how += "; the station has no usable radiation or temperature for this day"
    link = f"/stations/{source.station_key}/days/{row['day']}" if source and day else ""
    terms.append(
        Term(
            "net radiation, Rn",
            number(row["rn_mj_m2"], 2),
            "MJ m⁻² d⁻¹",
            how,
            RN.get(row["rung"], "Methods 3"),
            link,
        )
    )
    if day is not None:
        for rung, reason in wording.why_codes(day["why_not"]):
            terms.append(
                Term(f"not rung {rung}, {wording.rung(rung)}", "", "", reason, "checks of the day")
            )
        if day["rn_uncertainty"] is not None:
            terms.append(
                Term(
                    "standard uncertainty of Rn",
                    number(day["rn_uncertainty"], 2),
                    "MJ m⁻² d⁻¹",
                    "the rung’s share, at least 0.5",
                    "working value",
                )
            )
        for name, label in (("rn_measured", "measured"), ("rn_modelled", "modelled from solar")):
            if day[name] is not None:
                terms.append(
                    Term(f"Rn, {label}", number(day[name], 2), "MJ m⁻² d⁻¹", "for comparison", "")
                )
    return terms


RN = {
    1: "sum of four components",
    2: "FAO-56 eq 38, 40, with the sky measured",
    3: "the sensor itself",
    5: "FAO-56 eq 38 to 40; ASCE-EWRI eq 15 to 18",
    7: "FAO-56 eq 35, 38 to 40",
    8: "FAO-56 eq 38 to 40, 50",
    9: "working value",
}


def _weather(sources: Mapping[str, SourceRow], days: Mapping[int, Row]) -> list[Term]:
    terms = []
    temperature, wind = sources.get("temperature"), sources.get("wind")
    day = days.get(temperature.station_id) if temperature else None
    if temperature is not None and day is not None:
        link = f"/stations/{temperature.station_key}/days/{day['day']}"
        for name, label in (("tmax", "highest temperature"), ("tmin", "lowest temperature")):
            terms.append(
                Term(label, number(day[name], 1), "°C", temperature.station_name, "station", link)
            )
        rung = wording.HUMIDITY_RUNGS[day["humidity_rung"]]
        terms.append(
            Term("vapour pressure, ea", number(day["vapour_pressure"], 3), "kPa",
                 f"from {rung}, {temperature.station_name}", "FAO-56 eq 14 to 19", link)
        )  # fmt: skip
    day = days.get(wind.station_id) if wind else None
    if wind is not None and day is not None:
        terms.append(
            Term("wind at 2 m, u2", number(day["wind_2m"], 2), "m/s",
                 f"{wording.WIND_RUNGS[day['wind_rung']]}, {wind.station_name}", "FAO-56 eq 47",
                 f"/stations/{wind.station_key}/days/{day['day']}")
        )  # fmt: skip
    return terms


def _reference(
    row: Row,
    sources: Mapping[str, SourceRow],
    days: Mapping[int, Row],
    heights: Mapping[int, float],
) -> Term:
    """ETo in figures where the daily equation made it; else how it was made."""
    found = [sources.get(name) for name in ("energy", "temperature", "wind")]
    eto, source = number(row["eto_mm"], 2), "ASCE-EWRI eq 1; FAO-56 eq 6"
    if row["rung"] == USUAL or not all(one and days.get(one.station_id) for one in found):
        return Term("reference ET, ETo", eto, "mm", "the usual for the date", "working value")
    energy, air, wind = (days[one.station_id] for one in found if one is not None)
    hourly = energy["eto_hours"] if energy.get("eto_hours") is not None else None
    if (
        hourly is not None
        and energy["eto"] == row["eto_mm"]
        and energy["eto"] != energy.get("eto_daily")
    ):
        return Term("reference ET, ETo", eto, "mm", "the equation hour by hour, summed", source)
    parts = (row["rn_mj_m2"], air["tmax"], air["tmin"], air["vapour_pressure"], wind["wind_2m"])
    if any(part is None for part in parts):
        return Term("reference ET, ETo", eto, "mm", "the equation of the station’s day", source)
    rn, tmax, tmin, ea, u2 = (float(part) for part in parts)
    assert found[1] is not None
    mean, wind_2m = (tmax + tmin) / 2, max(u2, WIND_FLOOR)
    gamma = float(psychrometric_constant(atmospheric_pressure(heights[found[1].station_id])))
    delta, es = float(saturation_slope(mean)), float(mean_saturation_vapour_pressure(tmax, tmin))
    d, g, w = number(delta, 5), number(gamma, 5), number(wind_2m, 3)
    return Term(
        "reference ET, ETo",
        eto,
        "mm",
        "[0.408 Δ (Rn − G) + γ 900 / (T + 273) u2 (es − ea)] / [Δ + γ (1 + 0.34 u2)], at least 0; "
        "G = 0, T the mean of highest and lowest, u2 at least 0.5",
        source,
        sum=f"max((0.408 × {d} × {number(rn, 3)} + {g} × 900 / ({number(mean, 2)} + 273) × {w} × "
        f"({number(es, 4)} − {number(ea, 4)})) / ({d} + {g} × (1 + 0.34 × {w})), 0)",
    )


def _roots(day: DayWorking, block: BlockRow, opened: Opened) -> list[Term]:
    layers, top = [], 0.0
    for n, layer in enumerate(opened.soil.layers):
        last = n == len(opened.soil.layers) - 1
        bottom = day.root_depth if last else min(layer.bottom_m, day.root_depth)
        if bottom > top:
            held = f"({number(layer.field_capacity, 4)} − {number(layer.wilting_point, 4)})"
            layers.append(f"1000 × {held} × {number(bottom - top, 4)}")
        top = max(top, bottom)
    held = " + ".join(layers)
    roots = number(day.roots, 3)
    part = day.roots != 1.0
    taken = "depletion of the soil that the roots grew into that day, from the store below"
    return [
        Term("root depth", number(day.root_depth, 2), "m", "the crop curve of the day",
             "FAO-56 eq 8-1"),
        Term("in reach of the roots, TAW", number(day.taw, 2), "mm",
             f"Σ 1000 (θFC − θWP) z over {block.soil_name}"
             + (" × wetted root fraction" if part else ""), "FAO-56 eq 82",
             sum=f"({held}) × {roots}" if part else held),
        Term("depletion at the opening", number(day.opening, 2), "mm",
             "the close of the day before, or what the season opens with", "FAO-56 eq 85"),
        Term("taken over by new roots", number(day.growth, 2), "mm", taken, "Methods 6"),
    ]  # fmt: skip


def _evaporation(day: DayWorking) -> list[Term]:
    damped = "" if day.mulched == 1.0 else f" × {number(day.mulched, 3)}"
    by = " × mulch" if damped else ""
    k, most, kr, few = (number(x, 4) for x in (day.k, day.kc_max, day.kr, day.exposed))
    water = number(max(day.tew - day.layer_wet, 0.0), 3)
    held = f", {few} × {water} / {number(day.eto, 3)}" if day.eto > 0 else ""
    return [
        Term("basal coefficient, Kcb", number(day.k, 3), "", "the crop curve of the day",
             "FAO-56 eq 66, 70"),
        Term("most after wetting, Kc max", number(day.kc_max, 3), "",
             "1.2 and the climate term, or Kcb + 0.05", "FAO-56 eq 72"),
        Term("ground cover, fc", number(day.cover, 3), "", "from Kcb and height, or as seen",
             "FAO-56 eq 76"),
        Term("exposed and wetted, few", number(day.exposed, 3), "",
             f"the smaller of 1 − fc and the wetted fraction, {number(day.fw, 2)}; less under a "
             "canopy or plastic", "FAO-56 eq 75"),
        Term("evaporation layer after the day’s water, De", number(day.layer_wet, 2), "mm",
             "its opening less rain and irrigation where they fall, at least 0", "FAO-56 eq 77, 79",
             sum=f"max({number(day.layer_opening, 3)} − ({number(day.rain, 3)} − "
             f"{number(day.runoff, 3)} + {number(day.irrigation, 3)} / {number(day.fw, 4)}), 0)"),
        Term("reduction of evaporation, Kr", number(day.kr, 3), "",
             "(TEW − De) / (TEW − REW), from 0 to 1", "FAO-56 eq 74",
             sum=f"min(max(({number(day.tew, 3)} − {number(day.layer_wet, 3)}) / "
             f"({number(day.tew, 3)} − {number(day.rew, 3)}), 0), 1)"),
        Term("soil evaporation, Ke", number(day.ke, 3), "",
             f"the least of Kr (Kc max − Kcb){by}, few Kc max{by}, and few × the layer’s water "
             "/ ETo", "FAO-56 eq 71",
             sum=f"min({kr} × ({most} − {k}){damped}, {few} × {most}{damped}{held})"),
    ]  # fmt: skip


def _crop(row: Row, day: DayWorking, opened: Opened) -> list[Term]:
    k, ke, ks, eto = (number(x, 4) for x in (day.k, day.ke, day.ks, day.eto))
    taw, raw, wet = (number(x, 3) for x in (day.taw, day.raw, day.depletion_wet))
    terms = []
    if not day.dual:
        terms.append(
            Term("crop coefficient, Kc", number(day.k, 3), "", "the crop curve of the day",
                 "FAO-56 eq 58, 62")
        )  # fmt: skip
    factor = f"({k} + {ke})" if day.dual else k
    left = f"{number(max(day.taw - day.depletion_wet, 0.0), 3)}"
    salt = day.salt != 1.0
    if day.dual:
        evaporated = f"min({ke} × {eto}, {left})"
        actual = f"{evaporated} + min({ks} × {k} × {eto}, {left} − {evaporated})"
        how = "Ke ETo + Ks Kcb ETo, each no more than the root zone still holds"
    else:
        actual, how = f"min({ks} × {k} × {eto}, {left})", "Ks Kc ETo, no more than is left"
    return [
        *terms,
        Term("crop ET without stress, ETc", number(day.etc, 2), "mm",
             "Kcb ETo + Ke ETo, the latter no more than the root zone still holds" if day.dual
             else "Kc ETo", "FAO-56 eq 69" if day.dual else "FAO-56 eq 58",
             sum=f"{k} × {eto} + {evaporated}" if day.dual else f"{k} × {eto}"),
        Term("fraction readily drawn, p", number(day.p, 3), "",
             f"p table + 0.04 (5 − {'(Kcb + Ke)' if day.dual else 'Kc'} ETo), from 0.1 to 0.8",
             "FAO-56 Table 22",
             sum=f"min(max({number(day.p_table, 3)} + 0.04 × (5 − {factor} × {eto}), 0.1), 0.8)"),
        Term("readily available, RAW", number(day.raw, 2), "mm", "p TAW", "FAO-56 eq 83",
             sum=f"{number(day.p, 6)} × {taw}"),
        Term("depletion after the day’s water, Dr", number(day.depletion_wet, 2), "mm",
             "opening + new roots − water in", "Methods 6",
             sum=f"{number(day.opening, 3)} + {number(day.growth, 3)} − {_came(day)}"),
        Term("stress, Ks", number(day.ks, 3), "",
             "(TAW − Dr) / (TAW − RAW), from 0 to 1" + (", × salt" if salt else ""),
             "FAO-56 eq 84" + (", 92" if salt else ""),
             sum=f"min(max(({taw} − {wet}) / ({taw} − {raw}), 0), 1)"
             + (f" × {number(day.salt, 4)}" if salt else "")),
        Term("crop ET", number(day.et, 2), "mm", how,
             "FAO-56 eq 80, 81", sum=actual),
        Term("actual coefficient", number(row["kc_actual"], 3), "", "crop ET / ETo",
             "FAO-56 eq 80", sum=f"{number(day.et, 4)} / {eto}" if day.eto > 0 else ""),
        _limit(row, day, opened),
    ]  # fmt: skip


def _limit(row: Row, day: DayWorking, opened: Opened) -> Term:
    season = opened.season
    by_stage = season.mad_by_stage
    own = None if by_stage is None or not day.stage else by_stage[day.stage - 1]
    mad = season.mad if own is None else own
    taw = number(day.taw, 3)
    if not (day.in_season or season.perennial):
        how, figures = "all of TAW: no crop stands", taw
    elif mad is None:
        how, figures = "RAW: the season sets no MAD", number(day.raw, 3)
    else:
        stage = f" of the {wording.STAGES[day.stage - 1]} stage" if own is not None else ""
        how, figures = f"MAD{stage} × TAW", f"{number(mad, 3)} × {taw}"
    return Term("limit", number(row["limit_mm"], 2), "mm", how, "the season’s setting", sum=figures)


def _came(day: DayWorking) -> str:
    """The water of the day in figures: rain on the roots, irrigation, rise."""
    rise = day.given_rise + day.rise
    return (
        f"(({number(day.rain, 3)} − {number(day.runoff, 3)}) × {number(day.roots, 3)} + "
        f"{number(day.irrigation, 3)} + {number(rise, 3)})"
    )


def _water(
    row: Row,
    day: DayWorking,
    block: BlockRow,
    sources: Mapping[str, SourceRow],
    events: Sequence[EventRow],
) -> list[Term]:
    rain = sources.get("rain")
    own = [event for event in events if event.kind == "rain"]
    terms = [
        Term("rain", number(row["rain_mm"], 1), "mm",
             "the field’s own gauge" if own else rain.station_name if rain else "no source",
             EVENT_SOURCE if own else "station",
             "" if own or rain is None else f"/stations/{rain.station_key}/days/{row['day']}"),
    ]  # fmt: skip
    if row["runoff_mm"]:
        s = number(day.retention, 3)
        terms.append(
            Term("runoff", number(day.runoff, 2), "mm",
                 "(P − 0.2 S)² / (P + 0.8 S), S by the curve number at the layer’s wetness",
                 "NEH 630 ch. 10",
                 sum=f"({number(day.rain, 3)} − 0.2 × {s}) × ({number(day.rain, 3)} − 0.2 × {s}) / "
                 f"({number(day.rain, 3)} + 0.8 × {s})")
        )  # fmt: skip
    if row["rain_outside_roots_mm"]:
        terms.append(
            Term("rain outside the roots", number(day.rain_outside, 2), "mm",
                 "(1 − wetted root fraction) × (rain − runoff)", "Methods 6",
                 sum=f"(1 − {number(day.roots, 3)}) × ({number(day.rain, 3)} − "
                 f"{number(day.runoff, 3)})")
        )  # fmt: skip
    for event in events:
        if event.kind == "irrigation":
            terms += _irrigation(event, block)
    if row["irrigation_gross_mm"]:
        terms.append(
            Term("irrigation, net, over the block", number(day.irrigation, 2), "mm",
                 f"of {number(row['irrigation_gross_mm'], 2)} gross; "
                 f"{number(row['application_loss_mm'], 2)} lost in application; wetted fraction "
                 f"{number(wetted_fraction(block.system), 2)}", "Methods 6")
        )  # fmt: skip
    if row["capillary_rise_mm"]:
        table = day.most_rise > 0
        terms.append(
            Term("capillary rise", number(row["capillary_rise_mm"], 2), "mm",
                 "the smaller of what the soil above the water table can carry and what the root "
                 "zone lacks" if table else "as stated",
                 "Darcy’s law, steady flow" if table else "as stated",
                 sum=f"min({number(day.most_rise, 3)}, {number(day.depletion_wet + day.rise, 3)})"
                 if table else "")
        )  # fmt: skip
    return terms


def _irrigation(event: EventRow, block: BlockRow) -> list[Term]:
    """An irrigation as entered, and the net depth it leaves the roots."""
    system, told = block.system, event.details or {}
    share = told.get("area_share", 1.0) if event.unit != "volume_m3" else 1.0
    efficiency, amount = system["efficiency"], event.amount
    _, net = gross_and_net(amount, event.unit, event.purpose, system, block.area_ha, share)
    figures = {
        "net_mm": f"{number(amount, 3)} / {number(efficiency, 3)}",
        "hours": f"{number(amount, 3)} × {number(system['rate_mm_h'], 4)}",
        "volume_m3": f"{number(amount, 3)} / (10 × {number(block.area_ha, 4)})",
    }.get(event.unit, number(amount, 3))
    counted = PURPOSE_SHARE.get(event.purpose, 1.0)
    purpose = wording.word(wording.PURPOSES, event.purpose)
    words = {
        "net_mm": "(depth / efficiency) × efficiency",
        "hours": "hours × rate × efficiency",
        "volume_m3": "volume / (10 × area) × efficiency",
    }.get(event.unit, "gross depth × efficiency")
    if counted != 1.0:
        words += f" × {number(counted, 2)}: water of this purpose counts for that much"
        figures_end = f" × {number(counted, 2)}"
    else:
        figures_end = ""
    if share != 1.0:
        words, figures_end = words + " × share of the area", figures_end + f" × {number(share, 3)}"
    return [
        Term(f"irrigation, {purpose}", number(amount, 1),
             wording.word(wording.UNITS, event.unit),
             f"{wording.word(wording.CONFIRMATIONS, event.confirmation)} by {event.who}",
             EVENT_SOURCE),
        Term("its net depth", number(net, 2), "mm", words, "Methods 6",
             sum=f"({figures}) × {number(efficiency, 3)}{figures_end}"),
    ]  # fmt: skip


def _close(row: Row, day: DayWorking, before: Row | None) -> list[Term]:
    figures = (
        f"{number(day.opening, 3)} + {number(day.growth, 3)} − "
        f"({number(row['rain_mm'], 3)} − {number(row['runoff_mm'], 3)} − "
        f"{number(row['rain_outside_roots_mm'], 3)}) − {number(row['irrigation_net_mm'], 3)} − "
        f"{number(row['capillary_rise_mm'], 3)} + {number(row['et_actual_mm'], 3)} + "
        f"{number(row['deep_percolation_mm'], 3)} − {number(row['correction_mm'], 3)}"
    )
    excess = f"max(0 − {number(day.depletion_wet, 3)} − {number(day.et, 3)}, 0)"
    slow = day.drainage_days > 0
    terms = [
        Term("deep percolation", number(day.percolation, 2), "mm",
             f"the day’s part of what is above field capacity after ET, {number(day.excess, 2)} "
             f"mm: it drains over {number(day.drainage_days + 1)} days" if slow
             else "what is above field capacity after ET: − (Dr + ET), at least 0",
             "Methods 6" if slow else "FAO-56 eq 88", sum="" if slow else excess),
        Term("correction by a reading", number(day.correction, 2), "mm",
             "none" if not day.correction else "the reading of the day", "Methods 6"),
        Term("depletion at the close", number(day.depletion, 2), "mm",
             "opening + new roots − (rain − runoff − rain outside the roots) − net irrigation − "
             "capillary rise + crop ET + percolation − correction",
             "FAO-56 eq 85; Methods 6", sum=figures),
        Term("its range, eight years in ten",
             f"{number(row['depletion_p10_mm'], 1)} to {number(row['depletion_p90_mm'], 1)}", "mm",
             "200 members of the same balance", "Methods 7, working values"),
        Term("store below the roots, depletion", number(day.subsoil, 2), "mm",
             "its opening − what new roots took − percolation, at least 0", "Methods 6",
             sum=f"max({number(day.subsoil_opening, 3)} − {number(day.growth, 3)} − "
             f"{number(day.percolation, 3)}, 0)"),
    ]  # fmt: skip
    if day.dual:
        terms.append(
            Term("evaporation layer, depletion", number(day.layer, 2), "mm",
                 "De + evaporation / few", "FAO-56 eq 77",
                 sum=f"{number(day.layer_wet, 3)} + {number(day.evaporation, 5)} / "
                 f"{number(day.exposed, 5)}")
        )  # fmt: skip
    return terms
