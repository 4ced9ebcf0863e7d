"""Statements for intakes: the file's bytes, its problems, what it contributed."""

import hashlib
import tempfile
import zlib
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from datetime import date
from itertools import islice
from typing import Any, BinaryIO, cast

from sqlalchemy import delete, func, insert, select
from sqlalchemy.orm import Session

from app.storage.tables import (
    Contribution,
    Field,
    Intake,
    IntakeFile,
    IntakeProblem,
    Source,
    StationMapping,
)

PIECE = 4 * 1024 * 1024
IN_MEMORY = 16 * 1024 * 1024
PROBLEMS_KEPT = 1000
PUSHED = "push-"
"""How the file name of a push begins."""


def compress(source: BinaryIO) -> tuple[str, list[bytes]]:
    """SHA-256 of a file, and its bytes in compressed pieces."""
    digest, pieces = hashlib.sha256(), []
    source.seek(0)
    while piece := source.read(PIECE):
        digest.update(piece)
        pieces.append(zlib.compress(piece, 3))
    return digest.hexdigest(), pieces


def keep_file(session: Session, intake: int, pieces: Sequence[bytes]) -> None:
    """Keep the bytes of an intake's file."""
    for number, piece in enumerate(pieces):
        session.execute(insert(IntakeFile).values(intake_id=intake, piece=number, data=piece))


@contextmanager
def open_file(session: Session, intake: int) -> Iterator[BinaryIO]:
    """The bytes of an intake's file again, on disk where they are many."""
    numbers = session.scalars(
        select(IntakeFile.piece).where(IntakeFile.intake_id == intake).order_by(IntakeFile.piece)
    ).all()
    with tempfile.SpooledTemporaryFile(max_size=IN_MEMORY) as file:
        for number in numbers:
            data = session.scalar(
                select(IntakeFile.data).where(
                    IntakeFile.intake_id == intake, IntakeFile.piece == number
                )
            )
            assert data is not None
            file.write(zlib.decompress(data))
        file.seek(0)
        yield cast(BinaryIO, file)


def replace_problems(session: Session, intake: int, problems: Iterable[dict[str, Any]]) -> None:
    """Keep the problems of an intake in place of those of an earlier preview."""
    session.execute(delete(IntakeProblem).where(IntakeProblem.intake_id == intake))
    kept = islice(problems, PROBLEMS_KEPT)
    rows = [{"intake_id": intake, **storable(problem)} for problem in kept]
    if rows:
        session.execute(insert(IntakeProblem), rows)


def contribute(session: Session, intake: Intake, packs: Iterable[tuple[date, int, bytes]]) -> None:
    """Keep the packed days (day, rows, blob) of an intake."""
    rows = [
        {
            "intake_id": intake.id,
            "day": day,
            "station_id": intake.station_id,
            "rows": count,
            "data": blob,
        }
        for day, count, blob in packs
    ]
    if rows:
        session.execute(insert(Contribution), rows)


def storable(value: Any) -> Any:
    """A JSON value, or a text, with what PostgreSQL takes in no text: NUL shown as its symbol."""
    if isinstance(value, str):
        return value.replace("\0", "\u2400").encode("utf-8", "replace").decode()
    if isinstance(value, dict):
        return {name: storable(item) for name, item in value.items()}
    return [storable(item) for item in value] if isinstance(value, list | tuple) else value


def forget(session: Session, intake: Intake) -> None:
    """Delete an intake that was never applied, with its bytes and problems."""
    for table in (IntakeProblem, IntakeFile):
        session.execute(delete(table).where(table.intake_id == intake.id))
    session.delete(intake)


def applied_with_bytes(session: Session, station: int, sha256: str) -> int | None:
    """The last applied intake of a station with these bytes."""
    return session.scalar(
        select(func.max(Intake.id)).where(
            Intake.station_id == station, Intake.sha256 == sha256, Intake.state == "applied"
        )
    )


def next_order(session: Session) -> int:
    """The place of the next applied intake in the order of all."""
    return (session.scalar(select(func.max(Intake.applied_order))) or 0) + 1


def remembered(session: Session, station: int, signature: str) -> dict[str, Any] | None:
    """How a header was read last time at a station."""
    return session.scalar(
        select(StationMapping.mapping).where(
            StationMapping.station_id == station, StationMapping.signature == signature
        )
    )


def remember(session: Session, station: int, signature: str, mapping: dict[str, Any]) -> None:
    """Keep how a header is read at a station."""
    row = session.scalar(
        select(StationMapping).where(
            StationMapping.station_id == station, StationMapping.signature == signature
        )
    )
    if row is None:
        row = StationMapping(station_id=station, signature=signature)
        session.add(row)
    row.mapping = mapping


def fields_fed(session: Session, station: int) -> int:
    """How many fields take a variable from a station."""
    return (
        session.scalar(
            select(func.count(func.distinct(Source.field_id)))
            .select_from(Source)
            .join(Field, Field.id == Source.field_id)
            .where(Source.station_id == station)
        )
        or 0
    )
