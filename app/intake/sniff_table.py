"""Where the table of a text begins, what parts its fields, and what stands above it."""

import hashlib
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass

from app.intake.cells import DELIMITERS, kind_of, split_line
from app.intake.errors import IntakeError
from app.intake.names import KIND_OF_WORD, plain_words
from app.units import parse_unit

_LOOKED_AT = 300
_ABOVE = 6


@dataclass(frozen=True)
class Table:
    """The layout of a table: separators, lines (1-based) and what the lines above it say."""

    delimiter: str
    decimal: str
    header_line: int | None
    first_data_line: int
    names: tuple[str, ...]
    units: tuple[str, ...]
    kinds: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]

    @property
    def width(self) -> int:
        """Number of columns."""
        return len(self.names)

    @property
    def signature(self) -> str:
        """Fingerprint of names, units and kinds, the same for the same header."""
        said = "\x1e".join("\x1f".join(part) for part in (self.names, self.units, self.kinds))
        return hashlib.sha256(said.lower().encode()).hexdigest()[:16]


def find_table(lines: list[str], more: list[str]) -> Table:
    """The table in the first lines of a file (`more`: lines from further on)."""
    filled = [line for line in lines if line.strip(" \t,;|")]
    if not filled:
        raise IntakeError("The file holds no rows. Export it from the logger again.")
    delimiter, width = _delimiter(filled[-_LOOKED_AT:])
    usual = _usual_kinds(filled[-_LOOKED_AT:], delimiter, width)
    first = _first_data_line(lines, delimiter, width, usual)
    first -= _odd_rows_above(lines, first, delimiter, width)
    rows = [
        tuple(fields)
        for line in [*lines[first:], *more]
        if len(fields := split_line(line, delimiter)) == width
    ]
    header = _header(lines, first, delimiter, width)
    return Table(
        delimiter, _decimal(rows), header.line, first + 1, header.names, header.units,
        header.kinds, tuple(rows),
    )  # fmt: skip


def _delimiter(lines: list[str]) -> tuple[str, int]:
    best, found = 0.0, ("", 0)
    for delimiter in DELIMITERS:
        rows = [split_line(line, delimiter) for line in lines]
        width, agreeing = Counter(map(len, rows)).most_common(1)[0]
        if width < 2:
            continue
        cells = [kind_of(cell) for row in rows if len(row) == width for cell in row]
        known = sum(kind != "text" for kind in cells) / len(cells)
        filled = sum(kind != "missing" for kind in cells) / len(cells)
        score = agreeing / len(rows) * (0.02 + known) * (0.3 + filled) * (1 + width / 1000)
        if score > best:
            best, found = score, (delimiter, width)
    if not found[0]:
        raise IntakeError(
            "No columns were found: no comma, semicolon, tab, bar or blanks part the lines into "
            "the same number of fields. Export the readings as CSV."
        )
    return found


def _usual_kinds(lines: list[str], delimiter: str, width: int) -> list[str]:
    rows = [row for line in lines if len(row := split_line(line, delimiter)) == width]
    usual = []
    for column in zip(*rows, strict=True):
        kinds = Counter(kind for cell in column if (kind := kind_of(cell)) != "missing")
        usual.append(max(kinds, key=lambda kind: (kinds[kind], kind != "text"), default="missing"))
    return usual


def _first_data_line(lines: list[str], delimiter: str, width: int, usual: list[str]) -> int:
    told = [i for i, kind in enumerate(usual) if kind in ("number", "date", "time")]
    if not told:
        raise IntakeError(
            "The file has a header but no rows with figures below it. Nothing can be taken in; "
            "check the span asked of the logger."
        )
    lead = next((i for i in told if usual[i] == "date"), told[0])
    for at, line in enumerate(lines):
        fields = split_line(line, delimiter)
        if len(fields) != width:
            continue
        kinds = [kind_of(cell) for cell in fields]
        odd = sum(kinds[i] not in (usual[i], "missing") for i in told)
        if kinds[lead] in (usual[lead], "missing") and odd <= len(told) / 3:
            return at
    raise IntakeError(
        "No row of figures was found below the first lines. Check that the file is the table of "
        "readings."
    )


def _odd_rows_above(lines: list[str], first: int, delimiter: str, width: int) -> int:
    """Rows right above the first good one that are data all the same: to be read and reported."""
    count = 0
    while count < first:
        fields = split_line(lines[first - count - 1], delimiter)
        kinds = [kind for field in fields if (kind := kind_of(field)) != "missing"]
        known = sum(kind != "text" for kind in kinds)
        if len(fields) <= width / 2 or known <= 0.6 * len(kinds):
            break
        count += 1
    return count


@dataclass(frozen=True)
class _Header:
    line: int | None
    names: tuple[str, ...]
    units: tuple[str, ...]
    kinds: tuple[str, ...]


def _header(lines: list[str], first: int, delimiter: str, width: int) -> _Header:
    names: list[str] = []
    units, kinds = [""] * width, [""] * width
    names_line = None
    counts = []
    for at in range(first - 1, max(first - 1 - _ABOVE, -1), -1):
        if not lines[at].strip():
            continue
        fields = _fit(lines[at], delimiter, width)
        if fields is None:
            counts.append(len(split_line(lines[at], delimiter)))
            if names:
                break
            continue
        said = [field for field in fields if field]
        if len(said) < 0.5 * width and len(said) < 2:
            break
        if _share(said, _is_kind) >= 0.6:
            kinds = fields
        elif _share(said, lambda text: parse_unit(text) is not None) >= 0.5:
            units = fields
        else:
            names, names_line = fields, at + 1
            above = _fit(lines[at - 1], delimiter, width) if at else None
            if above and _share([text for text in above if text], _is_kind) >= 0.6:
                kinds = above
            break
    if not names:
        _refuse_split_decimals(counts, delimiter, width)
        names = [f"column {i + 1}" for i in range(width)]
    names = [name.lstrip("#").strip() or f"column {i + 1}" for i, name in enumerate(names)]
    return _Header(names_line, tuple(names), tuple(units), tuple(kinds))


def _fit(line: str, delimiter: str, width: int) -> list[str] | None:
    """Header fields brought to the rows' width: one may be short or have an empty one too many."""
    fields = split_line(line.lstrip("#"), delimiter)
    if len(fields) == width:
        return fields
    if delimiter == "blanks":
        wide = [part.strip() for part in line.replace("\t", "  ").split("  ") if part.strip()]
        return wide if len(wide) == width else None
    if len(fields) == width - 1:
        return [*fields, ""]
    if len(fields) > width and not any(fields[width:]):
        return fields[:width]
    return None


def _refuse_split_decimals(counts: list[int], delimiter: str, width: int) -> None:
    if delimiter == "," and any(width / 2 < count < width for count in counts):
        raise IntakeError(
            f"The header names {counts[0]} columns and the rows have {width} fields: commas seem "
            "to part both the fields and the decimals. Export with semicolons or decimal points."
        )


def _share(texts: list[str], test: Callable[[str], bool]) -> float:
    return sum(test(text) for text in texts) / max(len(texts), 1)


def _is_kind(text: str) -> bool:
    words = plain_words(text)
    return bool(words) and all(word in KIND_OF_WORD for word in words)


def _decimal(rows: list[tuple[str, ...]]) -> str:
    commas = points = 0
    for row in rows[:500]:
        for cell in row:
            if kind_of(cell) == "number":
                commas += "," in cell
                points += "." in cell
    return "," if commas > points else "."
