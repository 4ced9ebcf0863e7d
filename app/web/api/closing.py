"""Closing water: the last applications that pay."""

from dataclasses import asdict
from datetime import date
from typing import Annotated

from fastapi import APIRouter, Query
from pydantic import BaseModel

from app import wording
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsKey, AsToday, Clean
from app.web.pages.fields import choose, own_blocks
from app.workflows.closing_water import closing_water

router = APIRouter(prefix="/api/v1")


class ApplicationOut(BaseModel):
    """An application: net and gross depth [mm], hours."""

    day: date
    net_mm: float
    gross_mm: float
    hours: float


class ClosingOut(BaseModel):
    """The applications to maturity, the last of them the last that pays; depletion [mm] at
    maturity with them, allowed (also as a share of TAW), and missing."""

    maturity: date
    applications: list[ApplicationOut]
    left_mm: float
    allowed_mm: float
    allowed_share: float
    short_mm: float
    caution: str


@router.get("/fields/{key}/closing-water", tags=["fields"])
def closing(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    block: Annotated[Clean | None, Query(max_length=80)] = None,
) -> ClosingOut | None:
    """The last applications that pay; null where nothing grows towards a maturity."""
    blocks = own_blocks(db, viewer, key)
    chosen = choose(blocks, block or blocks[0].key)
    with db.read() as session:
        found = closing_water(session, chosen.id, today)
    if found is None:
        return None
    return ClosingOut.model_validate(asdict(found) | {"caution": wording.CAUTION})
