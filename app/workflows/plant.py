"""Plant a field, or change one of its seasons, from the pages."""

from datetime import date
from typing import Any

from pydantic import ValidationError
from sqlalchemy import select
from sqlalchemy.orm import Session

from app.book.schema import BookError
from app.book.season import SeasonPart
from app.storage.database import Database
from app.storage.tables import Block, Field, Season
from app.workflows.bring_up_to_date import up_to_date
from app.workflows.load_book import put_season
from app.workflows.once import EntryError


def plant(
    db: Database,
    field_key: str,
    block_key: str | None,
    told: dict[str, Any],
    was: date | None,
    who: str,
    today: date,
) -> None:
    """Put a season on a field or one of its blocks; `was`: the planting of the one it changes.

    told: as a season of the book file; what it does not name stays as the changed season has it.
    Ledgers and advice follow. Raises EntryError, and changes nothing.
    """
    with db.write() as session:
        kept = _details(session, field_key, block_key, was) if was is not None else {}
        try:
            part = SeasonPart.model_validate(
                {**kept, **told, "field": field_key, "block": block_key}
            )
            put_season(session, part, was, who)
        except ValidationError as error:
            first = error.errors()[0]
            name = ".".join(map(str, first["loc"])) or "the season"
            raise EntryError(f"{name}: {first['msg'].removeprefix('Value error, ')}") from None
        except BookError as error:
            raise EntryError("; ".join(error.problems)) from None
        up_to_date(session, today)


def _details(session: Session, field_key: str, block_key: str | None, was: date) -> dict[str, Any]:
    wanted = (
        select(Season.details)
        .join(Block, Block.id == Season.block_id)
        .join(Field, Field.id == Block.field_id)
        .where(Field.key == field_key, Season.planting == was)
        .order_by(Block.id)
    )
    if block_key is not None:
        wanted = wanted.where(Block.key == block_key)
    found = session.scalars(wanted).first()
    if found is None:
        raise EntryError(f"nothing was planted on {was}; look at the field again")
    return dict(found)
