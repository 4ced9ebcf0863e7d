"""A day's working: every term of one ledger day with its equation, figures and source."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from app import wording
from app.science.energy.ladder import USUAL
from app.storage.pages import EventRow, SourceRow
from app.storage.pages_field import BlockRow, SeasonRow
from app.wording import number

EVENT_SOURCE = "event as entered"
FAO = "FAO-56"
Row = Mapping[str, Any]


@dataclass(frozen=True)
class Term:
    """One figure: what it is, its value and unit, how it comes about, who says so."""

    name: str
    value: str
    unit: str
    how: str
    source: str
    link: str = ""


@dataclass(frozen=True)
class Section:
    """Terms that belong together."""

    title: str
    terms: tuple[Term, ...]


def working(
    row: Row,
    before: Row | None,
    block: BlockRow,
    season: SeasonRow | None,
    sources: Mapping[str, SourceRow],
    station_days: Mapping[int, Row],
    events: Sequence[EventRow],
) -> list[Section]:
    """The sections of one day, in the order in which the figures are made."""
    sections = [
        Section("Energy", tuple(_energy(row, sources, station_days))),
        Section("Weather", tuple(_weather(sources, station_days))),
        Section("Crop ET", tuple(_crop(row))),
        Section("Water in", tuple(_water(row, block, sources, events))),
        Section("Root zone", tuple(_root_zone(row, block, season))),
        Section("Close of the day", tuple(_close(row, before))),
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


def _crop(row: Row) -> list[Term]:
    cut = abs(row["kc_actual"] * row["eto_mm"] - row["et_actual_mm"]) > 0.006
    single = number(row["kcb"], 3) == number(None, 3)
    curve, factor, actual = _single(row) if single else _dual(row)
    return [
        Term("reference ET, ETo", number(row["eto_mm"], 2), "mm",
             "[0.408 Δ (Rn − G) + γ 900/(T + 273) u2 (es − ea)] / [Δ + γ (1 + 0.34 u2)], G = 0",
             "ASCE-EWRI eq 1; FAO-56 eq 6"),
        *curve,
        Term("water stress, Ks", number(row["ks"], 3), "",
             f"(TAW − Dr) / (TAW − RAW), at most 1; RAW {number(row['raw_mm'], 1)}",
             "FAO-56 eq 84"),
        Term("actual coefficient", number(row["kc_actual"], 3), "",
             actual, "FAO-56 eq 81" if single else "FAO-56 eq 80"),
        Term("crop ET without stress", number(row["etc_potential_mm"], 2), "mm",
             f"{factor} × {number(row['eto_mm'], 2)}",
             "FAO-56 eq 58" if single else "FAO-56 eq 69"),
        Term("crop ET", number(row["et_actual_mm"], 2), "mm",
             f"{number(row['kc_actual'], 3)} × {number(row['eto_mm'], 2)}"
             + ("; cut so that no layer goes below empty" if cut else ""),
             "FAO-56 eq 81" if single else "FAO-56 eq 80"),
    ]  # fmt: skip


def _dual(row: Row) -> tuple[list[Term], str, str]:
    """The terms of dual coefficients, and how the unstressed and the actual one are made."""
    ks, kcb, ke = (number(row[name], 3) for name in ("ks", "kcb", "ke"))
    terms = [
        Term("basal coefficient, Kcb", kcb, "", "the crop curve of the day", "FAO-56 eq 66, 70"),
        Term("soil evaporation, Ke", ke, "", "Kr (Kc max − Kcb) ≤ few Kc max",
             "FAO-56 eq 71 to 77"),
    ]  # fmt: skip
    return terms, f"(Kcb + Ke) ETo = ({kcb} + {ke})", f"Ks Kcb + Ke = {ks} × {kcb} + {ke}"


def _single(row: Row) -> tuple[list[Term], str, str]:
    """The same of a single coefficient, which the ledger holds as crop ET without stress by ETo."""
    kc = number(row["etc_potential_mm"] / row["eto_mm"] if row["eto_mm"] else None, 3)
    terms = [Term("crop coefficient, Kc", kc, "", "the crop curve of the day", "FAO-56 eq 58, 62")]
    return terms, f"Kc ETo = {kc}", f"Ks Kc = {number(row['ks'], 3)} × {kc}"


def _water(
    row: Row, block: BlockRow, sources: Mapping[str, SourceRow], events: Sequence[EventRow]
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
        terms.append(
            Term("runoff", number(row["runoff_mm"], 1), "mm", "by curve number", "NEH 630 ch. 10")
        )
    if row["rain_outside_roots_mm"]:
        terms.append(
            Term("rain outside the roots", number(row["rain_outside_roots_mm"], 1), "mm",
                 "(1 − wetted root fraction) × rain", "Methods 6")
        )  # fmt: skip
    for event in events:
        if event.kind != "rain":
            unit = wording.word(wording.UNITS, event.unit)
            terms.append(
                Term(f"irrigation, {wording.word(wording.PURPOSES, event.purpose)}",
                     number(event.amount, 1), unit,
                     f"{wording.word(wording.CONFIRMATIONS, event.confirmation)} by {event.who}",
                     EVENT_SOURCE)
            )  # fmt: skip
    if row["irrigation_gross_mm"]:
        share = wording.share(block.system.get("efficiency"))
        terms += [
            Term("irrigation, gross", number(row["irrigation_gross_mm"], 1), "mm",
                 f"hours × {number(block.system.get('rate_mm_h'), 2)} mm/h, or the depth or "
                 "volume as entered", "Methods 6"),
            Term("lost in application", number(row["application_loss_mm"], 1), "mm",
                 f"gross − net, efficiency {share}", "Methods 6"),
            Term("irrigation, net", number(row["irrigation_net_mm"], 1), "mm",
                 f"gross × {share}", "Methods 6"),
        ]  # fmt: skip
    if row["capillary_rise_mm"]:
        terms.append(
            Term("capillary rise", number(row["capillary_rise_mm"], 1), "mm", "as given", FAO)
        )
    return terms


def _root_zone(row: Row, block: BlockRow, season: SeasonRow | None) -> list[Term]:
    mad = season.details.get("mad") if season else None
    limit = f"MAD {wording.share(mad)} × TAW" if mad is not None else "RAW"
    return [
        Term("root depth", number(row["root_depth_m"], 2), "m", "the crop curve of the day",
             "FAO-56 eq 8-1"),
        Term("in reach of the roots, TAW", number(row["taw_mm"], 1), "mm",
             f"Σ 1000 (θFC − θWP) over {block.soil_name} down to {number(row['root_depth_m'], 2)} "
             "m", "FAO-56 eq 82"),
        Term("readily available, RAW", number(row["raw_mm"], 1), "mm",
             "p TAW, p = p table + 0.04 (5 − ETc)", "FAO-56 eq 83, Table 22"),
        Term("limit", number(row["limit_mm"], 1), "mm", limit, "the season’s setting"),
        Term("taken over by new roots", number(row["root_growth_depletion_mm"], 2), "mm",
             "depletion of the layer the roots grew into", "Methods 6"),
    ]  # fmt: skip


def _close(row: Row, before: Row | None) -> list[Term]:
    start = opening(row)
    figures = (
        f"{number(start, 2)} + {number(row['root_growth_depletion_mm'], 2)} − "
        f"({number(row['rain_mm'], 2)} − {number(row['runoff_mm'], 2)} − "
        f"{number(row['rain_outside_roots_mm'], 2)}) − {number(row['irrigation_net_mm'], 2)} − "
        f"{number(row['capillary_rise_mm'], 2)} + {number(row['et_actual_mm'], 2)} + "
        f"{number(row['deep_percolation_mm'], 2)} − {number(row['correction_mm'], 2)}"
    )
    begins = (
        f"the close of {wording.short_day(before['day'])}"
        if before is not None
        else "the ledger begins on this day"
    )
    gap = abs(start - before["depletion_mm"]) if before is not None else 0.0
    return [
        Term("depletion at the opening", number(start, 2), "mm",
             begins + (f", which was {number(before['depletion_mm'], 2)}"
                       if before is not None and gap > 0.005 else ""), "FAO-56 eq 85"),
        Term("deep percolation", number(row["deep_percolation_mm"], 2), "mm",
             "what the root zone cannot hold", "FAO-56 eq 88"),
        Term("correction by a reading", number(row["correction_mm"], 2), "mm",
             "none" if not row["correction_mm"] else "the reading of the day", "Methods 6"),
        Term("depletion at the close", number(row["depletion_mm"], 2), "mm", figures,
             "FAO-56 eq 85; Methods 6"),
        Term("its range, eight years in ten",
             f"{number(row['depletion_p10_mm'], 1)} to {number(row['depletion_p90_mm'], 1)}", "mm",
             "200 members of the same balance", "Methods 7, working values"),
        Term("store below the roots, depletion", number(row["subsoil_depletion_mm"], 2), "mm",
             "takes the percolation, gives to new roots", "Methods 6"),
        Term("evaporation layer, depletion", number(row["evaporation_layer_depletion_mm"], 2),
             "mm", "of the uppermost soil", "FAO-56 eq 77"),
    ]  # fmt: skip


def opening(row: Row) -> float:
    """Depletion at the opening of a ledger day, from the closing equation."""
    return float(
        row["depletion_mm"]
        - row["root_growth_depletion_mm"]
        + (row["rain_mm"] - row["runoff_mm"] - row["rain_outside_roots_mm"])
        + row["irrigation_net_mm"]
        + row["capillary_rise_mm"]
        - row["et_actual_mm"]
        - row["deep_percolation_mm"]
        + row["correction_mm"]
    )
