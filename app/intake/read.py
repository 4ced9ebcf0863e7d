"""The whole file, streamed, as rows and problems."""

from typing import BinaryIO

from app.intake.model import Clock, Mapping, Progress, Reading


def read(
    source: BinaryIO, mapping: Mapping, clock: Clock, progress: Progress | None = None
) -> Reading:
    """Read every row of a file by its mapping; IntakeError while a question is unanswered."""
    raise NotImplementedError
