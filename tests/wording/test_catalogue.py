"""Every sentence in every language, and the figures, days and lists of a reader.

Dates and decimal signs are held against CLDR by way of the general library that carries it.
"""

import string
from datetime import date

import pytest
from babel.dates import format_date
from babel.numbers import format_decimal

from app.science.energy.ladder import LADDER
from app.wording import CAUTION, CAUTION_TITLE
from app.wording.catalogue import LANGUAGES, RUNGS, TABLES, Counted, Words
from app.wording.reader import Reader, reader

MONDAY = date(2026, 7, 13)


def sentences() -> list[tuple[str, Words]]:
    """Every sentence, by table and key."""
    found = []
    for table, entries in TABLES.items():
        for key, words in entries.items():
            forms = words if isinstance(words, Counted) else [words]
            found += [(f"{table}.{key}", form) for form in forms]
    return found


def names(text: str) -> set[str]:
    """What a sentence wants filled in."""
    return {name for _, name, _, _ in string.Formatter().parse(text) if name}


@pytest.mark.parametrize(("key", "words"), sentences())
def test_no_sentence_is_missing_and_all_languages_fill_in_the_same(key: str, words: Words) -> None:
    assert words._fields == LANGUAGES
    assert all(text.strip() for text in words), key
    assert len({frozenset(names(text)) for text in words}) == 1, key
    for text in words:
        assert text == text.strip()
        assert "  " not in text


def test_the_caution_is_the_one_of_the_pages() -> None:
    assert Reader("en").say("common", "caution") == CAUTION
    assert Reader("en").say("common", "caution_title") == CAUTION_TITLE
    for word in ("agua", "agrónomo", "suelo", "eléctricos", "bombeo", "químicos"):
        assert word in Reader("es").say("common", "caution")


def test_every_rung_has_its_words() -> None:
    assert len(RUNGS) == len(LADDER) + 1


@pytest.mark.parametrize(
    ("language", "zone", "locale", "text"),
    [
        ("en", "America/Denver", "en", "7.4"),
        ("es", "America/Denver", "es_419", "7.4"),
        ("es", "Europe/Madrid", "es", "7,4"),
        ("es", None, "es_419", "7.4"),
    ],
)
def test_the_decimal_sign_is_the_one_of_the_place(
    language: str, zone: str | None, locale: str, text: str
) -> None:
    who = reader(language, "metric", zone)
    assert who.number(7.4, 1) == text == format_decimal(7.4, locale=locale)


def test_figures() -> None:
    metric, us, spanish = Reader(), Reader(units="us"), reader("es", "us")
    assert metric.depth(53.34) == "53\u00a0mm"
    assert metric.depth(7.26) == "7.3\u00a0mm"
    assert metric.depth(0.0) == "0\u00a0mm"
    assert us.depth(53.34) == "2.1\u00a0in"
    assert us.depth(19.05) == "0.75\u00a0in"
    assert us.depth(25.39) == "1.0\u00a0in"
    assert us.depth(0.0) == "0.0\u00a0in"
    assert spanish.depth(53.34) == "2.1\u00a0pulg"
    assert metric.hours(7.42) == "7.4\u00a0h"
    assert metric.hours(48.02) == "48\u00a0h"
    assert metric.hours(120.4) == "120\u00a0h"
    # an acre-foot is 1233.48 m3 (NIST SP 811, appendix B)
    assert us.volume(6573.0) == "5.33\u00a0acre-feet"
    assert us.volume(1233.4818) == "1.00\u00a0acre-feet"
    assert metric.volume(6573.0) == "6\u202f570\u00a0m³"
    assert metric.volume(0.0) == "0\u00a0m³"
    assert metric.number(-0.04, 1) == "0.0"
    assert metric.number(-3.26, 1) == "\u22123.3"
    assert metric.number(None) == metric.depth(None) == metric.volume(float("nan")) == "–"
    assert metric.share(1.104) == "110\u202f%"


def test_days_and_lists() -> None:
    english, spanish = reader("en", "us"), reader("es", "metric")
    assert english.long_day(MONDAY) == "Monday 13 July"
    assert spanish.long_day(MONDAY) == "lunes 13 de julio"
    assert spanish.long_day(MONDAY).split()[0] == format_date(MONDAY, "EEEE", locale="es_MX")
    assert english.short_day(MONDAY) == "Mon 13 Jul"
    assert spanish.short_day(MONDAY) == "lun 13 jul"
    assert spanish.full_day(MONDAY) == "13 de julio de 2026"
    assert [spanish.weekday(n) for n in (0, 6)] == ["lunes", "domingo"]
    assert spanish.near_day(MONDAY, MONDAY) == "hoy"
    assert english.near_day(date(2026, 7, 16), MONDAY) == "Thu 16 Jul"
    assert english.listed(["A", "B", "C"]) == "A, B and C"
    assert spanish.listed(["A", "B", "C"]) == "A, B y C"
    assert spanish.listed(["A"]) == "A"
    assert english.listed([]) == ""


def test_counting() -> None:
    english, spanish = reader("en", "us"), reader("es", "us")
    assert english.count("fields", "fields", 1) == "1 field"
    assert spanish.count("fields", "fields", 5) == "5 parcelas"
