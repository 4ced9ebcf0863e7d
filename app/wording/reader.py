"""A reader: the language, the units and the figures of whoever a page or letter is for."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from functools import cache
from typing import Literal

from babel import Locale
from babel.dates import format_date
from babel.lists import format_list
from babel.numbers import format_decimal

from app.wording.catalogue import TABLES, Counted, Language, Words
from app.wording.figures import MINUS, NARROW, NO_FIGURE

UnitSystem = Literal["metric", "us"]
MM_PER_INCH = 25.4
ACRE_FOOT_M3 = 43_560 * 0.3048**3
"""An acre is 43 560 square feet; a foot 0.3048 m (NIST SP 811, appendix B)."""
NO_BREAK = "\u00a0"
LONG = {"en": "EEEE d MMMM", "es": "EEEE d 'de' MMMM"}
SHORT = {"en": "EEE d MMM", "es": "EEE d MMM"}
DAY_MONTH = {"en": "d MMMM", "es": "d 'de' MMMM"}
FULL = {"en": "d MMMM y", "es": "d 'de' MMMM 'de' y"}


@dataclass(frozen=True)
class Reader:
    """Who reads: `locale` is a CLDR locale that settles the decimal sign and the names of days."""

    language: Language = "en"
    units: UnitSystem = "metric"
    locale: str = "en"

    def say(self, table: str, key: str, /, **figures: str) -> str:
        """A sentence of the catalogue, its names filled in."""
        words = TABLES[table][key]
        assert isinstance(words, Words)
        text: str = getattr(words, self.language)
        return text.format(**figures)

    def count(self, table: str, key: str, n: int, /, **figures: str) -> str:
        """A sentence that counts."""
        words = TABLES[table][key]
        assert isinstance(words, Counted)
        text: str = getattr(words.one if n == 1 else words.other, self.language)
        return text.format(n=self.number(n), **figures)

    # Figures

    def number(self, value: float | None, digits: int = 0) -> str:
        """A figure with `digits` decimals and the reader's decimal sign; a dash for none."""
        if value is None or not math.isfinite(value):
            return NO_FIGURE
        pattern = "#,##0" + ("." + "0" * digits if digits else "")
        rounded = round(value, digits) + 0.0  # never minus zero
        text = format_decimal(rounded, pattern, locale=self.locale)
        group, sign = _symbols(self.locale)
        return text.replace(group, NARROW).replace(sign, MINUS)

    def hours(self, value: float | None) -> str:
        """Running time [h]: `7.4 h`; whole where it is, and from 100 h on."""
        whole = value is None or abs(value) >= 99.95 or round(value, 1) == round(value)
        return self._with_unit("hours", self.number(value, 0 if whole else 1))

    def depth(self, mm: float | None) -> str:
        """A depth [mm] in the reader's units: `53 mm`, `2.1 in`."""
        if mm is None or not math.isfinite(mm):
            return NO_FIGURE
        if self.units == "us":
            return self._with_unit("inches", self.plain_depth(mm))
        return self._with_unit("mm", self.plain_depth(mm))

    def plain_depth(self, mm: float | None) -> str:
        """The same without its unit; a hundredth of an inch below one inch, a tenth of a
        millimetre below ten, so that what is small is not lost."""
        if mm is None or not math.isfinite(mm):
            return NO_FIGURE
        if self.units == "us":
            inches = mm / MM_PER_INCH
            return self.number(inches, 2 if 0.005 <= abs(inches) < 0.995 else 1)
        return self.number(mm, 1 if 0.05 <= abs(mm) < 9.95 else 0)

    def depth_mm(self, value: float) -> float:
        """A depth in the reader's units as millimetres, to a hundredth."""
        return round(value * MM_PER_INCH if self.units == "us" else value, 2)

    def volume(self, m3: float | None) -> str:
        """A volume [m3] to three figures, in m³ or acre-feet."""
        if m3 is None or not math.isfinite(m3):
            return NO_FIGURE
        key, value = ("acre_feet", m3 / ACRE_FOOT_M3) if self.units == "us" else ("m3", m3)
        value = float(f"{value:.3g}")
        digits = 0 if value == 0 else 2 - math.floor(math.log10(abs(value)))
        return self._with_unit(key, self.number(value, max(digits, 0)))

    def share(self, value: float) -> str:
        """A fraction as per cent."""
        return f"{self.number(100 * value)}{NARROW}%"

    def _with_unit(self, key: str, figure: str) -> str:
        return self.say("common", key, n=figure).replace(" ", NO_BREAK)

    # Days and lists

    def long_day(self, day: date) -> str:
        """`Monday 13 July`, `lunes 13 de julio`."""
        return format_date(day, LONG[self.language], locale=self.locale)

    def short_day(self, day: date) -> str:
        """`Mon 13 Jul`, `lun 13 jul`."""
        return format_date(day, SHORT[self.language], locale=self.locale).replace(".", "")

    def day_month(self, day: date) -> str:
        """`13 July`, `13 de julio`."""
        return format_date(day, DAY_MONTH[self.language], locale=self.locale)

    def full_day(self, day: date) -> str:
        """`13 July 2026`, `13 de julio de 2026`."""
        return format_date(day, FULL[self.language], locale=self.locale)

    def weekday(self, number: int) -> str:
        """The name of a weekday, 0 being Monday."""
        names: str = Locale.parse(self.locale).days["stand-alone"]["wide"][number]
        return names

    def near_day(self, day: date, today: date) -> str:
        """`today`, `tomorrow`, `yesterday`, else the short day."""
        near = {-1: "yesterday", 0: "today", 1: "tomorrow"}.get((day - today).days)
        return self.say("common", near) if near else self.short_day(day)

    def listed(self, words: Sequence[str]) -> str:
        """`a, b and c`."""
        text = format_list(list(words), locale=self.locale) if words else ""
        return text.replace(", and ", " and ") if self.language == "en" else text


@cache
def _symbols(locale: str) -> tuple[str, str]:
    """The grouping and the minus sign of a locale."""
    symbols = Locale.parse(locale).number_symbols["latn"]
    return symbols["group"], symbols["minusSign"]


def reader(language: str, units: str, time_zone: str | None = None) -> Reader:
    """The reader of a recipient's settings, on a farm in an IANA zone.

    Spanish writes 7.4 in the Americas and 7,4 in Europe; the farm's zone tells which.
    """
    chosen: Language = "es" if language == "es" else "en"
    abroad = (time_zone or "America/").split("/")[0] not in {"America", "US", "Etc"}
    locale = "en" if chosen == "en" else "es" if abroad else "es_419"
    return Reader(chosen, "us" if units == "us" else "metric", locale)
