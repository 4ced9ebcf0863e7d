"""A first look at a file: what it is made of and what its columns mean."""

from typing import BinaryIO

from app.intake.model import Clock, Mapping, Sniffed


def sniff(source: BinaryIO, clock: Clock, remembered: Mapping | None = None) -> Sniffed:
    """Guess the mapping of a file; what cannot be guessed safely comes back as questions.

    `source` is a seekable binary file. `remembered` is used where its header signature matches.
    Raises IntakeError when the file is no text table.
    """
    raise NotImplementedError


def answer(mapping: Mapping, answers: dict[str, str]) -> Mapping:
    """The mapping with questions answered: question field -> chosen value."""
    raise NotImplementedError
