"""Bytes of a logger or spreadsheet file to columns, readings and days, with a report by line.

    sniffed = sniff(file, clock, remembered)          # mapping, questions, examples, why
    mapping = answer(sniffed.mapping, {"time.order": "dmy"})
    reading = read(file, mapping, clock, progress)    # rows, problems, counts
    packs = pack(reading.rows, clock)                 # one small blob a station day
    rows = fold([unpack(blob) for blob in blobs])     # later wins, NaN never overwrites
    weather, notes = aggregate(rows, site, days)      # daily weather and what was done to it

Knows nothing of the database.
"""

from app.intake.aggregate import aggregate
from app.intake.errors import IntakeError
from app.intake.fold import fold
from app.intake.hours import hours_of
from app.intake.model import (
    Choice,
    Clock,
    ColumnMap,
    Counts,
    DayNote,
    DayPack,
    Mapping,
    Problem,
    Question,
    Reading,
    Rows,
    Sniffed,
    TimeColumn,
    TimeLayout,
)
from app.intake.pack import pack, station_day, unpack
from app.intake.questions import answer, check_mapping, unanswered
from app.intake.read import read
from app.intake.sniff import sniff
from app.intake.watching import SHAPE, Watched, watched

__all__ = [
    "SHAPE",
    "Choice",
    "Clock",
    "ColumnMap",
    "Counts",
    "DayNote",
    "DayPack",
    "IntakeError",
    "Mapping",
    "Problem",
    "Question",
    "Reading",
    "Rows",
    "Sniffed",
    "TimeColumn",
    "TimeLayout",
    "Watched",
    "aggregate",
    "answer",
    "check_mapping",
    "fold",
    "hours_of",
    "pack",
    "read",
    "sniff",
    "station_day",
    "unanswered",
    "unpack",
    "watched",
]
