"""One line into fields, and what a field looks like."""

import csv
import re

DELIMITERS = {",": ",", ";": ";", "|": "|", "tab": "\t", "blanks": " "}

# Written forms of "nothing measured" that loggers and spreadsheets share; compared as texts first,
# the figures among them as numbers too. None of the figures is a possible reading of any quantity
# in any unit of app.units.
MISSING = (
    "", "-9999", "-99999", "-9999.9", "-999", "-999.9", "-888.8", "-8888", "-6999", "-7999",
    "6999", "7999", "NAN", "NaN", "nan", "NA", "N/A", "n/a", "#N/A", "#VALUE!", "#DIV/0!",
    "#REF!", "#NUM!", "NULL", "null", "None", "none", "M", "m", "-", "--", "---", "----", "-----",
    "*", "**", "***", "****", "?", ".", "/", "//", "///", "x", "X", "S/D", "s/d", "ND", "nd", "Nd",
    "INF", "-INF", "inf", "-inf", "ERR", "Err", "err", "missing", "no data",
)  # fmt: skip
_MISSING = frozenset(MISSING)
_NUMBER = re.compile(r"[-+]?(?:\d+[.,]?\d*|[.,]\d+)(?:[eE][-+]?\d+)?")
_DATE = re.compile(
    r"(?:\d{1,4}\s*[-/.]\s*\d{1,2}\s*[-/.]\s*\d{1,4}|\d{1,2}[-/. ][A-Za-z]{3,10}\.?[-/., ]+\d{2,4}"
    r"|[A-Za-z]{3,10}\.? \d{1,2},? \d{4})(?:[T,\s]+\d{1,2}[:h].*)?|\d{8}T\d{4,6}Z?"
)
_TIME = re.compile(
    r"\d{1,2}:\d{1,2}(?::\d{2}(?:[.,]\d+)?)?\s*(?:[AaPp]\.?\s?[Mm]\.?)?|\d{1,2}\s?[AaPp][Mm]"
)


def split_line(line: str, delimiter: str) -> list[str]:
    """Fields of one line, blanks and quotes around them taken off."""
    if delimiter == "blanks":
        return [field for field in line.replace("\t", " ").split(" ") if field]
    mark = DELIMITERS[delimiter]
    if '"' not in line:
        return [field.strip() for field in line.split(mark)]
    try:
        fields = next(csv.reader([line], delimiter=mark, skipinitialspace=True), [])
    except csv.Error:
        fields = line.split(mark)
    return [field.strip() for field in fields]


def kind_of(field: str) -> str:
    """`missing`, `number`, `date`, `time` or `text`."""
    if field in _MISSING:
        return "missing"
    if _NUMBER.fullmatch(field):
        return "number"
    if _DATE.fullmatch(field):
        return "date"
    if _TIME.fullmatch(field):
        return "time"
    return "text"
