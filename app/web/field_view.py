"""What the Field page shows, worded."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date, timedelta
from itertools import accumulate
from typing import Any

from app import handbook, wording
from app.science.crop.season import CropSeason
from app.science.soil.intake_rate import intake_warning
from app.science.soil.root_zone import yield_share
from app.storage.pages import RoundsRow
from app.storage.pages_field import BlockRow, SeasonRow, SeasonSums
from app.storage.seen import SeenRow
from app.web.charts import DepletionChart, depletion_chart
from app.web.crops import season_words
from app.web.rounds_view import Bar, bar, decision_words, span, when
from app.workflows import agronomy
from app.workflows.agronomy import as_date, wetted_fraction
from app.workflows.crop import Seen, crop_season

CHART_DAYS = 35
LEDGER_DAYS = 14


@dataclass(frozen=True)
class Order:
    """The one sentence that matters, and what stands under it."""

    lead: str
    rest: str
    standing: str
    why: str
    bound: str
    unsure: tuple[str, ...]
    state: str


def order(
    advice: Mapping[str, Any] | None, today: date, stations: Mapping[str, str]
) -> Order | None:
    """An advice as a sentence; None without one."""
    if advice is None:
        return None
    watering = advice["day"] is not None and advice["gross_mm"] > 0
    lead = f"Water {when(advice['day'], today)}:" if watering else "No water needed."
    if not watering and advice["standing"] in ("late", "due"):
        lead = "No chance to water."
    rest = (
        f"{wording.depth(advice['gross_mm'])} mm gross, {wording.number(advice['hours'], 1)} hours,"
        f" {wording.volume(advice['volume_m3'])} m³."
        if watering
        else ""
    )
    ranged = span(advice["depletion_p10_mm"], advice["depletion_p90_mm"])
    state = (
        f"{wording.depth(advice['depletion_mm'])} mm"
        + (f" ({ranged})" if ranged else "")
        + f" are missing from the root zone; the limit is {wording.depth(advice['limit_mm'])}."
    )
    if watering:
        state += f" {wording.depth(advice['net_mm'])} mm net reach it."
    return Order(
        lead,
        rest,
        advice["standing"],
        wording.reason(advice["reason"], advice["figures"], advice["day"], today),
        wording.bound(advice["figures"], today),
        tuple(wording.unsure(advice["unsure"], stations, advice["issued_on"])),
        state,
    )


@dataclass(frozen=True)
class Decision:
    """What the advisor decided on the advice of the morning, in words."""

    lead: str
    rest: str
    says: str


def decided(rows: Sequence[RoundsRow], block_key: str, today: date) -> Decision | None:
    """The decision that stands for a block; None without one."""
    row = next((row for row in rows if row.block_key == block_key), None)
    if row is None or row.decision is None:
        return None
    says = decision_words(row, today).strip()
    if row.decision.verdict == "withhold":
        return Decision("Water withheld.", "", says)
    if row.day is None:
        return Decision("No water needed.", "", says)
    rest = (
        f"{wording.depth(row.gross_mm)} mm gross, {wording.number(row.hours, 1)} hours, "
        f"{wording.volume(row.volume_m3)} m³."
    )
    return Decision(f"Water {when(row.day, today)}:", rest, says)


def bar_of(advice: Mapping[str, Any]) -> Bar:
    """The bullet bar of an advice."""
    names = ("depletion_mm", "limit_mm", "taw_mm", "depletion_p10_mm", "depletion_p90_mm")
    return bar(*(float(advice[name]) for name in names))


def facts(
    advice: Mapping[str, Any] | None,
    block: BlockRow,
    season: SeasonRow | None,
    today: date,
) -> list[tuple[str, str]]:
    """Why this number: what the depth and the day rest on."""
    if advice is None or season is None:
        return []
    mad = season.details.get("mad")
    share_of_taw = f"MAD {wording.share(mad)}" if mad is not None else "RAW"
    system = block.system
    found = [
        ("in reach of the roots (TAW)", f"{wording.depth(advice['taw_mm'])} mm"),
        (f"limit ({share_of_taw})", f"{wording.depth(advice['limit_mm'])} mm"),
        ("depletion this morning", f"{wording.depth(advice['depletion_mm'])} mm"),
    ]
    expected = _expected_et(advice, today)
    if expected:
        found.append(expected)
    if advice["limit_day"] is not None and advice["depletion_mm"] <= advice["limit_mm"]:
        found.append(("closes past the limit", wording.short_day(advice["limit_day"])))
    figures = advice["figures"]
    for name, label in (("refill_to_mm", "left for a deficit"), ("rain_room_mm", "room for rain")):
        if float(figures.get(name) or 0.0) > 0:
            found.append((label, f"{wording.depth(float(figures[name]))} mm"))
    found += [
        ("application efficiency", wording.share(system.get("efficiency"))),
        ("rate, gross", f"{wording.number(system.get('rate_mm_h'), 2)} mm/h"),
        ("area", f"{wording.number(block.area_ha, 1)} ha"),
        ("energy of the last day", wording.rung(advice["rung"])),
    ]
    if advice["data_until"] is not None:
        found.append(("data to", wording.short_day(advice["data_until"])))
    return found


def _expected_et(advice: Mapping[str, Any], today: date) -> tuple[str, str] | None:
    """Crop ET expected up to the advised day, or over the outlook without one."""
    ahead = advice["outlook"]
    until = advice["day"] or advice["limit_day"]
    days = [date.fromisoformat(day) for day in ahead.get("date", [])]
    total = sum(
        value or 0.0
        for day, value in zip(days, ahead.get("etc", []), strict=False)
        if until is None or day < until
    )
    if not days or total <= 0:
        return None
    if until is not None:
        return f"crop ET expected before {when(until, today)}", f"{wording.depth(total)} mm"
    return f"crop ET expected in {wording.days(len(days))}", f"{wording.depth(total)} mm"


def chart(
    ledger: Sequence[Mapping[str, Any]], advice: Mapping[str, Any] | None, whole: bool
) -> DepletionChart | None:
    """The drawing of the last weeks (or the whole season) and the days ahead."""
    shown = list(ledger if whole else ledger[-CHART_DAYS:])
    ahead = advice["outlook"] if advice is not None else {}
    return depletion_chart(
        [row["day"] for row in shown],
        [row["depletion_mm"] for row in shown],
        [row["limit_mm"] for row in shown],
        [row["rain_mm"] for row in shown],
        [row["irrigation_net_mm"] for row in shown],
        [date.fromisoformat(day) for day in ahead.get("date", [])],
        ahead.get("depletion", []),
        ahead.get("limit", []),
        ahead.get("p10", []),
        ahead.get("p90", []),
    )


def ahead_rows(advice: Mapping[str, Any] | None) -> list[tuple[str, ...]]:
    """The days ahead as a table: day, ETo, crop ET, depletion, range, limit."""
    if advice is None:
        return []
    ahead = advice["outlook"]
    names = ("date", "eto", "etc", "depletion", "p10", "p90", "limit")
    columns = [ahead.get(name, []) for name in names]
    return [
        (
            wording.short_day(date.fromisoformat(day)),
            wording.number(eto, 1),
            wording.number(etc, 1),
            wording.number(depletion, 1),
            span(_nan(p10), _nan(p90)),
            wording.number(limit, 1),
        )
        for day, eto, etc, depletion, p10, p90, limit in zip(*columns, strict=False)
    ]


def _nan(value: float | None) -> float:
    return float("nan") if value is None else value


def soil_rows(soil: Mapping[str, Any]) -> list[tuple[str, str, str, str, str]]:
    """The layers of a profile: depth, texture, field capacity, wilting point, held."""
    rows, top = [], 0.0
    profile = agronomy.profile(dict(soil))
    for part, layer in zip(soil["layers"], profile.layers, strict=True):
        held = 1000 * (layer.field_capacity - layer.wilting_point) * (layer.bottom_m - top)
        rows.append(
            (
                f"{wording.number(top, 2)} to {wording.number(layer.bottom_m, 2)} m",
                (part["texture"] or "as measured").replace("_", " "),
                wording.share(layer.field_capacity),
                wording.share(layer.wilting_point),
                wording.number(held),
            )
        )
        top = layer.bottom_m
    return rows


def season_facts(
    season: SeasonRow | None, noticed: Sequence[SeenRow] = ()
) -> list[tuple[str, str]]:
    """The crop as it is reckoned with: stages, coefficients, roots, depletion fraction."""
    if season is None:
        return []
    seen = [
        Seen(row.day, row.kind, row.amount, row.details.get("height_m", 0.0))
        for row in reversed(noticed)
        if row.kind in ("stage", "cover", "cutting")
    ]
    crop = crop_season(season.details, season.planting, seen)
    ends = _stage_ends(season.planting, crop)
    symbol = "Kcb" if crop.coefficients == "dual" else "Kc"
    coefficients = (crop.k_ini, crop.k_mid, crop.k_end)
    facts = [
        (f"{name} to", wording.plain_day(end))
        for name, end in zip(wording.STAGES, ends, strict=False)
    ]
    return [
        *facts,
        (
            f"{symbol} initial, mid, end",
            ", ".join(wording.number(value, 2) for value in coefficients),
        ),
        (
            "roots",
            f"{wording.number(crop.root_min_m, 2)} to {wording.number(crop.root_max_m, 2)} m",
        ),
        ("p of the table", wording.number(crop.depletion_fraction, 2)),
        ("limit", f"MAD {wording.share(crop.mad)} of TAW" if crop.mad is not None else "RAW"),
        *_figures_from(season.details, symbol.lower()),
    ]


def _stage_ends(planting: date, crop: CropSeason) -> list[date]:
    """The last day of each stage, by its days and by the stages seen; of forage, of the cycle."""
    lengths = crop.stage_days
    ends = [planting + timedelta(days=days - 1) for days in accumulate(lengths)]
    for day, stage, cut in crop.anchors:
        begins = as_date(day)
        if cut:
            lengths, ends = crop.cycle_days or lengths, [begins - timedelta(days=1)] * 4
        ends[: stage - 1] = [min(end, begins - timedelta(days=1)) for end in ends[: stage - 1]]
        later = accumulate(lengths[stage - 1 :])
        ends[stage - 1 :] = [begins + timedelta(days=days - 1) for days in later]
    return ends


def _figures_from(details: Mapping[str, Any], symbol: str) -> list[tuple[str, str]]:
    """Where the stage lengths and coefficients are from: the book, or a page of the handbook."""
    if own_crop := details.get("own_crop"):
        return [("crop", own_crop["name"]), ("figures from", own_crop["source"])]
    usable = handbook.usable(details["crop"], details["coefficients"])
    given = [details[f"{symbol}_{stage}"] for stage in ("ini", "mid", "end")]
    own = "this farm’s book"
    partly = f"{own}, else {usable.coefficients_source}"
    return [
        ("stages from", own if details["stage_days"] else usable.stages_source),
        (
            "coefficients from",
            usable.coefficients_source
            if not any(value is not None for value in given)
            else partly
            if None in given
            else own,
        ),
    ]


def title(block: BlockRow, season: SeasonRow | None, today: date) -> str:
    """Farm, area, crop and system in one line."""
    crop = (
        season_words(season.crop, season.planting, season.details.get("stage_days"), today)
        + f" (planted {wording.plain_day(season.planting)})"
        if season is not None
        else "nothing planted"
    )
    kind = block.system.get("kind") or block.system_name
    return f"{block.farm_name} · {wording.number(block.area_ha, 1)} ha · {crop} · {kind}"


def first_ledger_day(season: SeasonRow | None, today: date, whole: bool) -> date:
    """From which day the page reads the ledger."""
    if whole and season is not None:
        return season.planting
    return today - timedelta(days=CHART_DAYS)


def season_so_far(sums: SeasonSums | None, season: SeasonRow | None) -> list[tuple[str, str]]:
    """The season in sums, and what its stress may have cost in yield, as an estimate."""
    if sums is None or season is None:
        return []
    facts = [
        ("rain", f"{wording.number(sums.rain_mm)} mm"),
        (
            "applied, gross; net",
            f"{wording.number(sums.gross_mm)}; {wording.number(sums.net_mm)} mm",
        ),
        ("crop ET", f"{wording.number(sums.et_mm)} mm"),
        ("past the roots", f"{wording.number(sums.percolation_mm)} mm"),
        ("days past the limit", f"{sums.late_days} of {sums.days}"),
    ]
    if sums.runoff_mm > 0.0:
        facts.append(("run off", f"{wording.number(sums.runoff_mm)} mm"))
    return [*facts, *_yield(sums, season)]


def _yield(sums: SeasonSums, season: SeasonRow) -> list[tuple[str, str]]:
    """Estimated share of the full yield by FAO-56 eq 90, where a seasonal Ky is published."""
    row = None if season.details.get("own_crop") else handbook.crops().get(season.crop)
    if row is None or row.ky_seasonal is None or sums.etc_mm <= 0.0:
        return []
    share = float(yield_share(sums.et_mm, sums.etc_mm, row.ky_seasonal))
    said = f"about {wording.share(share)} of full, by Ky {wording.number(row.ky_seasonal, 2)}"
    return [("yield so far, an estimate", f"{said} ({row.ky_source})")]


def intake_words(block: BlockRow) -> str:
    """A warning where the system applies faster than the soil is stated to take; else empty."""
    stated = block.soil.get("intake_mm_h")
    if stated is None:
        return ""
    told = intake_warning(
        block.system["rate_mm_h"], stated, wetted_fraction=wetted_fraction(block.system)
    )
    if told is None:
        return ""
    return (
        f"Water falls at {wording.number(told.rate_mm_h, 1)} mm/h, the soil takes "
        f"{wording.number(told.intake_mm_h, 1)}: once it is wet {wording.share(told.excess)} of it "
        "stands or runs. Give it in shorter sets."
    )
