"""A thousand malformed files from a fixed seed: none crashes, and what is read is consistent."""

import io

import numpy as np
import pytest

from app.intake import IntakeError, answer, fold, pack, read, sniff, unpack
from app.science.quantities import QUANTITIES
from tests.intake.helpers import CLOCK, DATA

FILES = sorted(path for path in DATA.iterdir() if path.suffix in (".csv", ".txt", ".dat"))
SEED = 20_250_513
RUNS, BATCHES = 1_000, 10


def _flip_bytes(data: bytes, rng: np.random.Generator) -> bytes:
    raw = np.frombuffer(data, np.uint8).copy()
    at = rng.integers(0, raw.size, rng.integers(1, 30))
    raw[at] = rng.integers(0, 256, at.size)
    return raw.tobytes()


def _cut(data: bytes, rng: np.random.Generator) -> bytes:
    a, b = sorted(rng.integers(0, len(data), 2).tolist())
    return data[:b] if rng.random() < 0.5 else data[a:]


def _drop_lines(data: bytes, rng: np.random.Generator) -> bytes:
    lines = data.split(b"\n")
    return b"\n".join(line for line in lines if rng.random() < 0.7)


def _shuffle_lines(data: bytes, rng: np.random.Generator) -> bytes:
    lines = data.split(b"\n")
    rng.shuffle(lines)
    return b"\n".join(lines)


def _repeat_lines(data: bytes, rng: np.random.Generator) -> bytes:
    return b"\n".join(line for line in data.split(b"\n") for _ in range(rng.integers(1, 4)))


def _swap_columns(data: bytes, rng: np.random.Generator) -> bytes:
    mark = max((b",", b";", b"|", b"\t"), key=data.count)
    rows = [line.split(mark) for line in data.split(b"\n")]
    width = max(map(len, rows))
    order = rng.permutation(width)
    return b"\n".join(mark.join(row[i] for i in order if i < len(row)) for row in rows)


def _other_delimiters(data: bytes, rng: np.random.Generator) -> bytes:
    marks = [b",", b";", b"|", b"\t", b" ", b":", b"."]
    a, b = rng.choice(len(marks), 2, replace=False)
    return data.replace(marks[a], marks[b])


def _garbage_lines(data: bytes, rng: np.random.Generator) -> bytes:
    lines = data.split(b"\n")
    for _ in range(rng.integers(1, 12)):
        garbage = rng.integers(1, 256, rng.integers(0, 200), np.uint8).tobytes()
        lines.insert(int(rng.integers(0, len(lines))), garbage)
    return b"\n".join(lines)


def _other_encoding(data: bytes, rng: np.random.Generator) -> bytes:
    text = data.decode("cp1252", errors="replace")
    name = rng.choice(["utf-16", "utf-16-le", "utf-16-be", "utf-32", "latin-1", "utf-8-sig"])
    return text.encode(str(name), errors="replace")


def _odd_cells(data: bytes, rng: np.random.Generator) -> bytes:
    odd = [b"NAN", b"", b"1e999", b"-inf", b"0x1F", b"1,5", b"1.5.2", b'"', b"''", b"\x00",
           b"True", b"99999999999999999999", b"-", b"12:61", b"31/02/2025", b"1_000",
           b"\xf0\x9f\x8c\xbe"]  # fmt: skip
    mark = max((b",", b";", b"|", b"\t"), key=data.count)
    cells = data.split(mark)
    for _ in range(rng.integers(1, 40)):
        cells[int(rng.integers(0, len(cells)))] = odd[int(rng.integers(0, len(odd)))]
    return mark.join(cells)


def _quotes(data: bytes, rng: np.random.Generator) -> bytes:
    raw = bytearray(data)
    for at in rng.integers(0, len(raw), rng.integers(1, 9)):
        raw[at:at] = b'"'
    return bytes(raw)


def _line_ends(data: bytes, rng: np.random.Generator) -> bytes:
    ends = [b"\r", b"\r\n", b"\n\n", b"\n\r", b"", b"\x0c\n"]
    return data.replace(b"\n", ends[int(rng.integers(0, len(ends)))])


def _glue(data: bytes, rng: np.random.Generator) -> bytes:
    return data + FILES[int(rng.integers(0, len(FILES)))].read_bytes()


MUTATIONS = (
    _flip_bytes, _cut, _drop_lines, _shuffle_lines, _repeat_lines, _swap_columns, _other_delimiters,
    _garbage_lines, _other_encoding, _odd_cells, _quotes, _line_ends, _glue,
)  # fmt: skip


@pytest.mark.parametrize("batch", range(BATCHES))
def test_mutated_files_are_read_or_refused(batch: int) -> None:
    taken = 0
    for run in range(batch, RUNS, BATCHES):
        rng = np.random.default_rng([SEED, run])
        data = FILES[run % len(FILES)].read_bytes()
        chosen = rng.choice(len(MUTATIONS), rng.integers(1, 3))
        for which in chosen:
            data = MUTATIONS[which](data, rng) if data else data
        names = [MUTATIONS[which].__name__ for which in chosen]
        try:
            taken += _check(data)
        except IntakeError as refused:
            assert len(str(refused)) > 30, names  # noqa: PT017
        except Exception as crash:
            raise AssertionError(f"run {run}, {names}: {crash!r}") from crash
    assert taken > RUNS / BATCHES / 4  # the test would be idle if nearly all were refused


def _check(data: bytes) -> bool:
    found = sniff(io.BytesIO(data), CLOCK)
    answers = {}
    for question in found.questions:
        if question.blocking:
            answers[question.field] = question.suggested or question.choices[0].value
    reading = read(io.BytesIO(data), answer(found.mapping, answers), CLOCK)
    rows = reading.rows
    assert np.all(np.diff(rows.instant) > 0)
    assert np.all(rows.line > 0)
    assert reading.counts.rows == len(rows)
    for name, values in rows.values.items():
        given = values[~np.isnan(values)]
        assert np.all((given >= QUANTITIES[name].low) & (given <= QUANTITIES[name].high))
    for problem in reading.problems:
        assert problem.line > 0
        assert problem.why
        assert problem.remedy
    back = fold([unpack(day.blob) for day in pack(rows, CLOCK)])
    np.testing.assert_array_equal(back.instant, rows.instant)
    for name, values in back.values.items():
        np.testing.assert_array_equal(values, rows.values[name])
    return len(rows) > 0


@pytest.mark.parametrize(
    "name",
    [
        "iso_comma.csv",
        "bar_three_header_lines.txt",
        "semicolon_spanish_latin1.txt",
        "aligned_columns.txt",
    ],
)
def test_rows_not_touched_are_read_unchanged(name: str) -> None:
    """Bytes are spoilt in a few data lines; every other line must give what it gave before."""
    whole = (DATA / name).read_bytes()
    mapping = sniff(io.BytesIO(whole), CLOCK).mapping
    before = read(io.BytesIO(whole), mapping, CLOCK).rows
    spoils = (b'"', b"junk", b",", b";", b"\x00", b"", b"|", b"-", b"\xff", b"  ", b"9.9.9")
    for run in range(60):
        rng = np.random.default_rng([SEED, 7, run])
        lines = whole.split(b"\n")
        touched = rng.choice(
            np.arange(mapping.first_data_line - 1, len(lines) - 1), 5, replace=False
        )
        for at in touched:
            raw = lines[at]
            a, b = sorted(rng.integers(0, len(raw), 2).tolist())
            lines[at] = raw[:a] + spoils[int(rng.integers(0, len(spoils)))] + raw[min(b, a + 6) :]
        after = read(io.BytesIO(b"\n".join(lines)), mapping, CLOCK).rows
        kept = ~np.isin(before.line, touched + 1)
        at = np.searchsorted(after.instant, before.instant[kept])
        np.testing.assert_array_equal(after.instant[at], before.instant[kept])
        same_line = after.line[at] == before.line[kept]  # else a spoilt date landed on this one
        assert np.count_nonzero(~same_line) <= len(touched)
        for quantity, values in before.values.items():
            np.testing.assert_array_equal(
                after.values[quantity][at][same_line], values[kept][same_line]
            )
