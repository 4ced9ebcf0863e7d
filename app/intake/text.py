"""Bytes to lines of UTF-8: what is no text is refused here, encodings and line ends are settled."""

import codecs
from collections.abc import Iterator
from dataclasses import dataclass
from typing import BinaryIO

from app.intake.errors import IntakeError
from app.intake.model import Progress

HEAD_BYTES = 512 * 1024
BLOCK_BYTES = 4 * 1024 * 1024
LONGEST_LINE = 1024 * 1024

_SIGNATURES: tuple[tuple[bytes, str, str], ...] = (
    (b"PK\x03\x04", "a zip archive or a spreadsheet workbook",
     "Unpack it, or save the sheet as CSV, and send that."),
    (b"PK\x05\x06", "an empty zip archive", "Send the text file itself."),
    (b"\xd0\xcf\x11\xe0", "a spreadsheet workbook of an older kind", "Save the sheet as CSV."),
    (b"\x89PNG", "a picture", "Send the logger's text file."),
    (b"\xff\xd8\xff", "a picture", "Send the logger's text file."),
    (b"GIF8", "a picture", "Send the logger's text file."),
    (b"II*\x00", "a picture", "Send the logger's text file."),
    (b"MM\x00*", "a picture", "Send the logger's text file."),
    (b"BM", "a picture", "Send the logger's text file."),
    (b"%PDF", "a PDF document", "Send the table it shows as CSV."),
    (b"{\\rtf", "a word processor's document", "Save it as plain text."),
    (b"\x1f\x8b", "a gzip-compressed file", "Unpack it and send what is inside."),
    (b"BZh", "a bzip2-compressed file", "Unpack it and send what is inside."),
    (b"\xfd7zXZ", "an xz-compressed file", "Unpack it and send what is inside."),
    (b"7z\xbc\xaf", "a compressed archive", "Unpack it and send what is inside."),
    (b"Rar!", "a compressed archive", "Unpack it and send what is inside."),
    (b"SQLite format 3", "a database", "Export the table of readings as CSV."),
    (b"PAR1", "a column store file", "Export it as CSV."),
    (b"\x89HDF", "a binary data file (HDF5)", "Export it as CSV."),
    (b"CDF\x01", "a binary data file (netCDF)", "Export it as CSV."),
    (b"CDF\x02", "a binary data file (netCDF)", "Export it as CSV."),
    (b"\x7fELF", "a program", "Send the logger's text file."),
    (b"MZ\x90", "a program", "Send the logger's text file."),
)  # fmt: skip
_BOMS = (
    (codecs.BOM_UTF32_LE, "utf-32-le"),
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_MARKUP = (
    (("<!doctype html", "<html", "<head", "<body"), "a web page",
     "The site answered with a page, often a sign-in; download the data file itself."),
    (("<?xml", "<"), "a markup file (XML)", "Export the readings as CSV."),
    (("{", "[{"), "a JSON file", "Export the readings as CSV."),
)  # fmt: skip


@dataclass(frozen=True)
class Block:
    """Whole lines of the file as UTF-8 with `\\n` ends; `first_line` is 1-based.

    `ends_open`: the last line of the file is in this block and has no line end.
    """

    data: bytes
    first_line: int
    lines: int
    ends_open: bool = False


def refuse_what_is_no_text(head: bytes) -> None:
    """IntakeError, saying what the file is, unless its first bytes look like text."""
    if not head:
        raise IntakeError("The file is empty (0 bytes). Export it from the logger again.")
    for start, what, remedy in _SIGNATURES:
        if head.startswith(start) and not (start == b"BM" and _is_ascii(head[:200])):
            raise IntakeError(f"This is {what}, not a text table. {remedy}")
    text = head.decode(encoding_of(head), errors="replace").lstrip("\ufeff \t\r\n")
    if not text.strip("\x00 \t\r\n"):
        raise IntakeError("The file holds nothing but blanks. Export it from the logger again.")
    start_text = text[:200].lower()
    for starts, what, remedy in _MARKUP:
        if start_text.startswith(starts):
            raise IntakeError(f"This is {what}, not a text table. {remedy}")
    odd = sum(1 for c in text[:20000] if (c < " " and c not in "\t\r\n\x0c\x1a") or c == "\ufffd")
    if odd > 0.05 * min(len(text), 20000):
        raise IntakeError(
            "This is a binary file, not a text table. Export the readings as a text or CSV file."
        )
    if len(text) >= 20000 and "\n" not in text and "\r" not in text:
        raise IntakeError(
            f"The first {len(text)} characters hold no line end: this is one endless line, not a "
            "table. Export the readings with one row a line."
        )


def encoding_of(head: bytes) -> str:
    """Python's name of the encoding of a text that begins with `head`."""
    for bom, name in _BOMS:
        if head.startswith(bom):
            return name
    sample = head[: len(head) // 4 * 4]
    if sample and sample.count(0) > 0.2 * len(sample):
        even, odd = sample[0::2].count(0), sample[1::2].count(0)
        if odd > 4 * even:
            return "utf-16-le"
        if even > 4 * odd:
            return "utf-16-be"
    decoder = codecs.getincrementaldecoder("utf-8")()
    try:
        decoder.decode(head)
    except UnicodeDecodeError:
        return "cp1252"
    return "utf-8"


def read_head(source: BinaryIO) -> tuple[bytes, int]:
    """The first bytes of a file and its size; leaves the file at its start."""
    source.seek(0, 2)
    size = source.tell()
    source.seek(0)
    head = source.read(HEAD_BYTES)
    source.seek(0)
    return head, size


def sample_lines(source: BinaryIO, encoding: str, size: int) -> list[str]:
    """Whole lines from the middle and the end of a file that is larger than its head."""
    lines: list[str] = []
    for share in (0.33, 0.66, 1.0):
        at = max(int(size * share) - 65536, HEAD_BYTES) // 4 * 4
        if at >= size:
            continue
        source.seek(at)
        text = source.read(65536).decode(encoding, errors="replace")
        lines += text.replace("\r\n", "\n").replace("\r", "\n").split("\n")[1:-1]
    source.seek(0)
    return lines


def blocks(
    source: BinaryIO, encoding: str, progress: Progress | None = None, size: int | None = None
) -> Iterator[Block]:
    """The file from its start in blocks of whole lines; reports (bytes done, bytes in all)."""
    if size is None:
        source.seek(0, 2)
        size = source.tell()
    source.seek(0)
    decoder = None
    if encoding != "utf-8":
        decoder = codecs.getincrementaldecoder(encoding)(errors="replace")
    line, done, carry, newline = 1, 0, b"", b"\n"
    while raw := source.read(BLOCK_BYTES):
        data = raw if decoder is None else decoder.decode(raw).encode("utf-8", errors="replace")
        if done == 0:
            data = data.removeprefix(codecs.BOM_UTF8)
        done += len(raw)
        data = carry + data
        held = b""
        if data.endswith(b"\r"):
            data, held = data[:-1], b"\r"
        if b"\r" in data:
            data = data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
        cut = data.rfind(b"\n") + 1
        whole, carry = data[:cut], data[cut:] + held
        if len(carry) > LONGEST_LINE:
            raise IntakeError(
                f"Line {line + whole.count(newline)} is longer than {LONGEST_LINE} bytes: this "
                "is no table with one row a line. Export the readings again."
            )
        if whole:
            count = whole.count(b"\n")
            yield Block(whole, line, count)
            line += count
        if progress:
            progress(done, size)
    if decoder is not None:
        carry += decoder.decode(b"", final=True).encode()
    rest = carry.replace(b"\r", b"\n")
    if rest.strip(b"\n\x00\x1a"):
        ends_open = not rest.endswith(b"\n")
        yield Block(rest, line, rest.count(b"\n") + ends_open, ends_open)


def _is_ascii(data: bytes) -> bool:
    return data.isascii() and b"\x00" not in data
