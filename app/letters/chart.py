"""The small chart of a letter: a bullet bar for each field, as PNG."""

import io
from collections.abc import Sequence

from PIL import Image, ImageDraw, ImageFont

from app.letters.content import Dryness

WIDTH, NAME, ROW, EDGE = 420, 132, 28, 6
"""Width of the picture, room of names, height of a row, margin [CSS px]."""
SCALE = 3
"""Device pixels a CSS pixel, for sharp letters on a phone."""
MOST = 14
"""More fields than this are left to the farm's page; the driest are shown."""
PAPER, INK, QUIET, RULE = "#fffdf8", "#1f2a30", "#5a656b", "#d9d2c3"
DRY, VEIL = "#a5482a", "#9cc9c9"


def driest(fields: Sequence[Dryness]) -> list[Dryness]:
    """The fields shown, driest first as a share of their limit."""
    return sorted(fields, key=lambda field: -share(field))[:MOST]


def share(field: Dryness) -> float:
    """Depletion as a share of the limit; of TAW where the limit is 0."""
    whole = field.limit_mm if field.limit_mm > 0 else field.taw_mm
    return max(field.depletion_mm, 0.0) / whole if whole > 0 else 0.0


def bars(fields: Sequence[Dryness]) -> bytes:
    """PNG of the bullet bars: ink is depletion, dry ink what is past the limit (a tick), the
    veil the range; the whole length is TAW."""
    shown = driest(fields)
    picture = Image.new("RGB", (WIDTH * SCALE, (len(shown) * ROW + EDGE) * SCALE), PAPER)
    draw = ImageDraw.Draw(picture)
    font = ImageFont.load_default(14 * SCALE)
    for number, field in enumerate(shown):
        _row(draw, font, field, EDGE // 2 + number * ROW)
    out = io.BytesIO()
    picture.quantize(64, dither=Image.Dither.NONE).save(out, "PNG", optimize=True)
    return out.getvalue()


def _row(
    draw: ImageDraw.ImageDraw,
    font: ImageFont.FreeTypeFont | ImageFont.ImageFont,
    field: Dryness,
    top: int,
) -> None:
    middle = top + ROW / 2
    draw.text(
        (EDGE * SCALE, middle * SCALE), _fitted(draw, font, field.field), INK, font, anchor="lm"
    )

    def place(mm: float) -> float:
        part = min(max(mm / field.taw_mm, 0.0), 1.0) if field.taw_mm > 0 and mm == mm else 0.0
        return EDGE + NAME + part * (WIDTH - 2 * EDGE - NAME)

    def box(first: float, last: float, half: float, colour: str) -> None:
        if last > first:
            corners = (first, middle - half, last, middle + half)
            draw.rectangle([round(value * SCALE) for value in corners], fill=colour)

    limit = place(field.limit_mm)
    box(place(0.0), place(field.taw_mm), 2.5, RULE)
    box(place(field.p10_mm), place(field.p90_mm), 7.5, VEIL)
    box(place(0.0), min(place(field.depletion_mm), limit), 2.5, INK)
    box(limit, place(field.depletion_mm), 2.5, DRY)
    box(limit - 1, limit + 1, 9.5, DRY)


def _fitted(
    draw: ImageDraw.ImageDraw, font: ImageFont.FreeTypeFont | ImageFont.ImageFont, name: str
) -> str:
    """A name cut to its room, the cut marked."""
    room = (NAME - EDGE) * SCALE
    shown = name = "".join(sign for sign in name if sign.isprintable())
    while draw.textlength(shown, font) > room and name:
        name = name[:-1]
        shown = f"{name.rstrip()}…"
    return shown
