"""A letter's content with everything in it, hostile names and all."""

from datetime import UTC, date, datetime, timedelta
from typing import Any

from app.letters.compose import Envelope
from app.letters.content import Content, Doubt, Dryness, Energy, Item, Past, Trouble
from app.letters.view import Links
from app.settings import Mail

MONDAY = date(2026, 7, 13)
AT = datetime(2026, 7, 13, 1, 0, tzinfo=UTC)
HOSTILE = "<script>alert(1)</script>\"'&{{7*7}}"
LONG = "Unbrokenlongnamewithoutanyspacewhatsoeverinitatall and then some more of it"
MAIL = Mail(
    host="127.0.0.1",
    sender="Tarrow Advice <letters@example.org>",
    base_url="https://rillbook.example.org",
)
ENVELOPE = Envelope("Ana Núñez", "ana@example.org", "letter.2026-07-13.7.0@example.org", AT)


def item(number: int, field: str = "Long Piece", days: int = 0, hours: float = 7.4) -> Item:
    """Water for a field."""
    key = field.split()[0].lower() if field.isascii() and "<" not in field else "odd"
    return Item(
        number=number,
        uid=f"2026-07-13.{key}.{number}@example.org",
        field_key=key,
        field=field,
        day=MONDAY + timedelta(days=days),
        hours=hours,
        gross_mm=53.3,
        expected=number == 3,
    )


def content(**more: Any) -> Content:
    """A letter about three fields, one of them unsure."""
    names = ("Long Piece", "East Drip", HOSTILE)
    plain: dict[str, Any] = {
        "farm_key": "hollin",
        "farm": "Hollin Farm",
        "morning": MONDAY - timedelta(days=1),
        "first_day": MONDAY,
        "last_day": MONDAY + timedelta(days=6),
        "items": [
            item(1),
            item(2, HOSTILE, 1, 120.0),
            item(3, days=5),
        ],
        "doubts": [
            Doubt(
                kind="stale",
                fields=[HOSTILE, "Long Piece"],
                station="Sand Lane",
                day=MONDAY - timedelta(days=3),
            ),
            Doubt(kind="range", fields=["East Drip"], days=6),
        ],
        "troubles": [Trouble(field="Long Piece", reason="falling_behind")],
        "rest": ["East Drip"],
        "past_first": MONDAY - timedelta(days=7),
        "past_last": MONDAY - timedelta(days=1),
        "past": [
            Past(field=name, area_ha=10.0, rain_mm=6.0, used_mm=40.0, applied_mm=20.0 * number)
            for number, name in enumerate(names)
        ],
        "energy": [Energy(station="Tarrow North", rungs={1: 6, 9: 1})],
        "dryness": [
            Dryness(
                field=name,
                depletion_mm=30.0 * number,
                p10_mm=25.0 * number,
                p90_mm=36.0 * number,
                limit_mm=50.0,
                taw_mm=110.0,
            )
            for number, name in enumerate(names)
        ],
        "note": f"Hold Long Piece if it rains.\n{HOSTILE}",
        "signed": "D. Arden",
    }
    return Content(**(plain | more))


def links(of: Content) -> Links:
    """Addresses as long as they are."""
    base = MAIL.base_url
    token = "done.1.1.20260810.e1528fb65c1bd410a193e2d3552dae61"
    return Links(
        {one.number: (f"{base}/answer/{token}", f"{base}/answer/o{token}") for one in of.items},
        page=f"{base}/farm/hollin",
        change=f"{base}/farm/hollin#letters",
        stop=f"{base}/stop/stop.1.99991231.b73e8188edf37585ada967e5cdc3c907.{'x' * 90}",
    )
