"""Where the points of a drawing lie: plain geometry for the SVG templates."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, timedelta

from app import wording

WIDTH, HEIGHT, LEFT, RIGHT, BOTTOM = 720, 290, 44, 10, 26
MARKS = 34
"""Height kept above field capacity for rain and irrigation."""
STEPS = (1, 2, 5, 10, 20, 25, 50, 100, 200, 500)


@dataclass(frozen=True)
class Mark:
    """A tick or a bar: place, size, words."""

    x: float
    y: float
    size: float
    text: str
    anchor: str = ""


@dataclass(frozen=True)
class DepletionChart:
    """The depletion of a root zone, hanging below field capacity."""

    width: int
    height: int
    left: int
    right: float
    bottom: float
    levels: tuple[Mark, ...]
    dates: tuple[Mark, ...]
    known: str
    ahead: str
    limit: str
    veil: str
    rain: tuple[Mark, ...]
    irrigation: tuple[Mark, ...]
    now: float | None
    limit_label: float
    said: str


def path(points: Sequence[tuple[float, float | None]]) -> str:
    """An SVG path through points; a missing value breaks the line."""
    parts, pen_up = [], True
    for x, y in points:
        if y is None or y != y:
            pen_up = True
            continue
        parts.append(f"{'M' if pen_up else 'L'}{x:.1f} {y:.1f}")
        pen_up = False
    return "".join(parts)


def step_for(span: float, lines: int = 5) -> float:
    """A round distance between levels, so that about `lines` of them fit."""
    return next((float(step) for step in STEPS if span / step <= lines), float(STEPS[-1]))


def depletion_chart(
    days: Sequence[date],
    depletion: Sequence[float | None],
    limit: Sequence[float | None],
    rain: Sequence[float],
    irrigation: Sequence[float],
    ahead_days: Sequence[date],
    ahead: Sequence[float | None],
    ahead_limit: Sequence[float | None],
    p10: Sequence[float | None],
    p90: Sequence[float | None],
) -> DepletionChart | None:
    """The drawing of known days and the days ahead; None when there is nothing to draw."""
    every = [*days, *ahead_days]
    if not every:
        return None
    first, count = every[0], (every[-1] - every[0]).days + 1
    deepest = [
        value
        for values in (depletion, limit, ahead, ahead_limit)
        for value in values
        if value is not None
    ]
    # the dry side of the range may run far below; it is cut at a fifth below the median path
    most = max([*deepest, 10.0]) * 1.08
    right, bottom = WIDTH - RIGHT, HEIGHT - BOTTOM

    def x(day: date) -> float:
        return LEFT + (right - LEFT) * ((day - first).days + 1) / count

    def y(value: float | None) -> float | None:
        if value is None or value != value:
            return None
        return MARKS + (bottom - MARKS) * min(max(value, 0.0), most) / most

    veil = ""
    if days and any(value is not None for value in p10):
        start = (x(days[-1]), y(depletion[-1]))
        low = [start, *((x(day), y(v)) for day, v in zip(ahead_days, p10, strict=False))]
        high = [start, *((x(day), y(v)) for day, v in zip(ahead_days, p90, strict=False))]
        ring = [*low, *reversed(high)]
        veil = path([point for point in ring if point[1] is not None]) + "Z"
    tallest = max([*rain, *irrigation, 20.0])
    step = step_for(most)
    last = (x(days[-1]), y(depletion[-1])) if days else (LEFT, None)
    limits = [*zip(days, limit, strict=True), *zip(ahead_days, ahead_limit, strict=False)]
    label = next((y(v) for _, v in reversed(limits) if y(v) is not None), None)
    return DepletionChart(
        width=WIDTH,
        height=HEIGHT,
        left=LEFT,
        right=right,
        bottom=bottom,
        levels=tuple(
            Mark(LEFT, y(level) or 0.0, 0.0, wording.number(level))
            for level in (step * place for place in range(int(most / step) + 1))
        ),
        dates=_dates(every, count, x, days[-1] if days else None),
        known=path([(x(day), y(v)) for day, v in zip(days, depletion, strict=True)]),
        ahead=path([last, *((x(day), y(v)) for day, v in zip(ahead_days, ahead, strict=False))]),
        limit=path([(x(day), y(v)) for day, v in limits]),
        veil=veil,
        rain=_bars(days, rain, x, tallest),
        irrigation=_bars(days, irrigation, x, tallest),
        now=x(days[-1]) if days else None,
        limit_label=(label or MARKS) - 5,
        said=_said(days, depletion, limit, ahead_days, ahead),
    )


def _bars(
    days: Sequence[date], depths: Sequence[float], x: object, tallest: float
) -> tuple[Mark, ...]:
    assert callable(x)
    return tuple(
        Mark(
            x(day) - 3,
            MARKS - 3 - 28 * depth / tallest,
            max(28 * depth / tallest, 2.0),
            f"{wording.short_day(day)}: {wording.number(depth, 1)} mm",
        )
        for day, depth in zip(days, depths, strict=True)
        if depth >= 0.05
    )


def _dates(every: Sequence[date], count: int, x: object, today: date | None) -> tuple[Mark, ...]:
    """About five mornings along the foot, this one among them."""
    assert callable(x)
    gap = max(7 * round(count / 35), 7) if count > 20 else max(count // 4, 1)
    anchor = today or every[0]
    found: list[Mark] = []
    for place in range(-60, 60):
        day = anchor + timedelta(days=place * gap)
        if every[0] <= day <= every[-1]:
            where = x(day)
            side = "mid" if LEFT + 30 < where < WIDTH - 40 else "end" if where > LEFT + 30 else ""
            if side == "end" and found and where - found[-1].x < 110:
                continue
            morning = wording.plain_day(day + timedelta(days=1))
            found.append(Mark(where, HEIGHT - 8, 0.0, morning, side))
    return tuple(found)


def _said(
    days: Sequence[date],
    depletion: Sequence[float | None],
    limit: Sequence[float | None],
    ahead_days: Sequence[date],
    ahead: Sequence[float | None],
) -> str:
    """What the drawing shows, for those who do not see it."""
    said = "Root-zone depletion below field capacity"
    if days:
        said += (
            f" from {wording.plain_day(days[0])} to {wording.plain_day(days[-1])}, at the end "
            f"{wording.depth(depletion[-1])} mm against a limit of {wording.depth(limit[-1])} mm"
        )
    if ahead_days and ahead and ahead[-1] is not None:
        said += (
            f"; without water {wording.depth(ahead[-1])} mm by {wording.plain_day(ahead_days[-1])}"
        )
    return said + "."


@dataclass(frozen=True)
class EnergyChart:
    """A station's net radiation, measured and modelled."""

    width: int
    height: int
    left: int
    right: float
    bottom: float
    levels: tuple[Mark, ...]
    dates: tuple[Mark, ...]
    measured: str
    modelled: str
    used: str
    said: str


def energy_chart(
    days: Sequence[date],
    measured: Sequence[float | None],
    modelled: Sequence[float | None],
    used: Sequence[float | None],
) -> EnergyChart | None:
    """The drawing of daily net radiation [MJ m-2]; None when there is nothing to draw."""
    known = [v for values in (measured, modelled, used) for v in values if v is not None]
    if not days or not known:
        return None
    height, top = 230, 14
    first, count = days[0], max((days[-1] - days[0]).days, 1)
    low, high = min(0.0, *known), max(*known, 5.0) * 1.05
    right, bottom = WIDTH - RIGHT, height - BOTTOM

    def x(day: date) -> float:
        return LEFT + (right - LEFT) * (day - first).days / count

    def y(value: float | None) -> float | None:
        return None if value is None else bottom - (bottom - top) * (value - low) / (high - low)

    step = step_for(high - low)
    levels = [step * place for place in range(int(low // step), int(high / step) + 1)]
    broken = _with_gaps(days)

    def line(values: Sequence[float | None]) -> str:
        by_day = dict(zip(days, values, strict=True))
        return path([(x(day), y(by_day.get(day))) for day in broken])

    pairs = [(m, d) for m, d in zip(measured, modelled, strict=True) if m is not None]
    return EnergyChart(
        width=WIDTH,
        height=height,
        left=LEFT,
        right=right,
        bottom=bottom,
        levels=tuple(
            Mark(LEFT, y(level) or 0.0, 0.0, wording.number(level))
            for level in levels
            if low <= level <= high
        ),
        dates=tuple(
            Mark(x(day), height - 8, 0.0, wording.plain_day(day), side)
            for day, side in (
                (days[0], ""),
                (days[0] + timedelta(days=count // 2), "mid"),
                (days[-1], "end"),
            )
        ),
        measured=line(measured),
        modelled=line(modelled),
        used=line(used),
        said=f"Daily net radiation from {wording.plain_day(days[0])} to "
        f"{wording.plain_day(days[-1])}, measured on {len(pairs)} of {len(days)} days.",
    )


def _with_gaps(days: Sequence[date]) -> list[date]:
    """Every calendar day from the first to the last."""
    return [days[0] + timedelta(days=step) for step in range((days[-1] - days[0]).days + 1)]
