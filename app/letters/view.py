"""A letter's content in the reader's words: what its templates print, nothing left to decide."""

from collections.abc import Mapping
from dataclasses import dataclass
from itertools import groupby

from app.letters.chart import driest, share
from app.letters.content import Content, Doubt, Item, Past, Withheld, one_line
from app.wording.catalogue import RUNGS
from app.wording.reader import Reader

COLUMNS = 72
"""Width of the plain text."""


@dataclass(frozen=True)
class Links:
    """The addresses in a letter; `answers` by the item's number: done, otherwise."""

    answers: Mapping[int, tuple[str, str]]
    page: str
    change: str
    stop: str


@dataclass(frozen=True)
class Line:
    """Water for one field."""

    field: str
    hours: str
    depth: str
    expected: bool
    done: str
    otherwise: str
    item: Item


@dataclass(frozen=True)
class Row:
    """A field's last seven days."""

    field: str
    rain: str
    used: str
    applied: str


@dataclass(frozen=True)
class View:
    """Everything a letter prints."""

    reader: Reader
    subject: str
    heading: str
    title: str
    correction: str
    doubts: tuple[str, ...]
    days: tuple[tuple[str, tuple[Line, ...]], ...]
    expected: bool
    troubles: tuple[str, ...]
    withheld: tuple[str, ...]
    decided: bool
    rest: str
    note: str
    signed: str
    past_title: str
    past: tuple[Row, ...]
    energy: str
    chart_title: str
    chart_alt: str
    links: Links

    def say(self, key: str) -> str:
        """A word of the letter."""
        return self.reader.say("letter", key)

    @property
    def caution_title(self) -> str:
        """The head of the caution."""
        return self.reader.say("common", "caution_title")

    @property
    def caution(self) -> str:
        """The caution."""
        return self.reader.say("common", "caution")

    @property
    def past_lines(self) -> str:
        """The last seven days in columns, for plain text."""
        heads = [self.say(name) for name in ("rain", "used", "applied")]
        widths = [max(len(head), 6) for head in heads]
        room = COLUMNS - sum(widths) - 2 * len(widths)
        table = [
            (self.say("field"), *heads),
            *((row.field, row.rain, row.used, row.applied) for row in self.past),
        ]
        return "\n".join(
            one_line(name)[:room].ljust(room)
            + "".join(f"  {cell:>{width}}" for cell, width in zip(cells, widths, strict=True))
            for name, *cells in table
        )

    @property
    def depth_unit(self) -> str:
        """The unit of the reader's depths."""
        return self.reader.depth(0.0).split("\u00a0")[-1]


def view(content: Content, reader: Reader, links: Links) -> View:
    """A letter in its reader's words."""
    heading = reader.say(
        "letter", "week_of", farm=content.farm, day=reader.day_month(content.first_day)
    )
    return View(
        reader=reader,
        subject=subject(content, reader),
        heading=heading,
        title=_title(content, reader),
        correction=_correction(content, reader),
        doubts=tuple(doubt(one, reader) for one in content.doubts),
        days=tuple(
            (reader.long_day(day), tuple(_line(item, reader, links) for item in items))
            for day, items in groupby(content.items, key=lambda item: item.day)
        ),
        expected=any(item.expected for item in content.items),
        troubles=tuple(
            reader.say("letter", trouble.reason, field=trouble.field)
            for trouble in content.troubles
        ),
        withheld=tuple(_withheld(one, reader) for one in content.withheld),
        decided=any(item.decided for item in content.items),
        rest=reader.count("letter", "rest", len(content.rest), fields=reader.listed(content.rest))
        if content.rest and content.items
        else "",
        note=content.note.strip(),
        signed=_signed(content, reader),
        past_title=reader.say(
            "letter",
            "last_week",
            first=reader.day_month(content.past_first),
            last=reader.day_month(content.past_last),
        ),
        past=_past(content.past, reader),
        energy=energy(content, reader),
        chart_title=reader.say("letter", "chart", day=reader.long_day(content.morning)),
        chart_alt=_chart_alt(content, reader),
        links=links,
    )


def subject(content: Content, reader: Reader) -> str:
    """The subject: the week, and how many fields to water."""
    watered = len(content.watered)
    water = reader.count(
        "fields",
        "water_of",
        watered,
        all=reader.count("fields", "fields", content.fields),
    )
    return reader.say(
        "letter",
        "subject_correction" if content.revision else "subject",
        day=reader.day_month(content.first_day),
        farm=content.farm,
        water=water if watered else reader.say("letter", "subject_none"),
        **({"n": reader.number(content.revision)} if content.revision else {}),
    )


def doubt(one: Doubt, reader: Reader) -> str:
    """Why something is unsure, a sentence or two."""
    fields = reader.listed(one.fields)
    if one.kind == "stale":
        key = "doubt_stale" if one.day else "doubt_silent"
        day = {"day": reader.long_day(one.day)} if one.day else {}
        return reader.say("letter", key, fields=fields, station=one.station, **day)
    if one.kind == "range":
        days = reader.count("letter", "days", one.days)
        return reader.say("letter", "doubt_range", fields=fields, days=days)
    if one.kind == "morning" and one.day:
        return reader.say("letter", "doubt_morning", day=reader.long_day(one.day))
    return reader.say("letter", "doubt_other", fields=fields)


def energy(content: Content, reader: Reader) -> str:
    """How the energy was obtained, in one sentence."""
    ways = [
        reader.say(
            "letter",
            "energy_way",
            station=one.station,
            ways=reader.listed(
                [
                    reader.count("letter", "energy_days", days, way=_rung(rung, reader))
                    for rung, days in sorted(one.rungs.items())
                ]
            ),
        )
        for one in content.energy
    ]
    if not ways:
        return reader.say("letter", "energy_none")
    return reader.say("letter", "energy", ways="; ".join(ways))


def _rung(number: int, reader: Reader) -> str:
    return reader.say("rungs", str(number if 0 <= number < len(RUNGS) else 0))


def _title(content: Content, reader: Reader) -> str:
    watered, fields = content.watered, content.fields
    if not watered:
        return reader.say("letter", "title_none")
    if len(watered) == 1:
        return reader.say("letter", "title_one", field=watered[0])
    if len(watered) == fields:
        return reader.say("letter", "title_all")
    return reader.say("letter", "title", n=reader.number(len(watered)), all=reader.number(fields))


def _correction(content: Content, reader: Reader) -> str:
    if not content.revision:
        return ""
    return reader.say(
        "letter",
        "correction",
        n=reader.number(content.revision),
        fields=reader.listed(content.changed),
    )


def _withheld(one: Withheld, reader: Reader) -> str:
    day = reader.day_month(one.until)
    if not one.note:
        return reader.say("letter", "withheld", field=one.field, day=day)
    return reader.say("letter", "withheld_note", field=one.field, day=day, note=one.note)


def _line(item: Item, reader: Reader, links: Links) -> Line:
    done, otherwise = links.answers.get(item.number, ("", ""))
    return Line(
        item.field,
        reader.hours(item.hours),
        reader.depth(item.gross_mm),
        item.expected,
        done,
        otherwise,
        item,
    )


def _signed(content: Content, reader: Reader) -> str:
    if content.signed_for:
        return reader.say("letter", "signed_for", name=content.signed, advisor=content.signed_for)
    return content.signed


def _past(fields: list[Past], reader: Reader) -> tuple[Row, ...]:
    """The fields' last seven days, and all of them by area where there is more than one."""
    rows = [
        Row(
            one.field,
            reader.plain_depth(one.rain_mm),
            reader.plain_depth(one.used_mm),
            reader.plain_depth(one.applied_mm),
        )
        for one in fields
    ]
    area = sum(one.area_ha for one in fields)
    if len(fields) > 1 and area > 0:

        def mean(name: str) -> str:
            whole = sum(one.area_ha * float(getattr(one, name)) for one in fields)
            return reader.plain_depth(whole / area)

        whole = reader.say("letter", "whole_farm")
        rows.append(Row(whole, mean("rain_mm"), mean("used_mm"), mean("applied_mm")))
    return tuple(rows)


def _chart_alt(content: Content, reader: Reader) -> str:
    shares = [
        reader.say("letter", "chart_share", field=field.field, share=reader.share(share(field)))
        for field in driest(content.dryness)
    ]
    return reader.say("letter", "chart_alt", fields=", ".join(shares))
