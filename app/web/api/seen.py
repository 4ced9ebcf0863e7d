"""What was seen on a field: stages, cover, cuttings, readings, keep-offs, notes."""

from datetime import date, timedelta
from typing import Annotated, Any, Literal

from fastapi import APIRouter, Query
from pydantic import BaseModel, ConfigDict, Field

from app.book.reading import ReadingPart
from app.storage.seen import seen_since
from app.web.access import AsViewer
from app.web.api.events import refused
from app.web.api.schemas import Given, Logged
from app.web.needs import AsDatabase, AsKey, AsToday, Clean
from app.web.pages.fields import own_blocks
from app.workflows.once import EntryError

router = APIRouter(prefix="/api/v1", tags=["seen"])
Kind = Literal["stage", "cover", "cutting", "reading", "keep_off", "note"]


class SeenIn(Given):
    """Something seen on a day; the same `token` sent twice changes nothing."""

    model_config = ConfigDict(
        extra="forbid",
        allow_inf_nan=False,
        json_schema_extra={
            "examples": [
                {
                    "kind": "reading",
                    "day": "2026-07-13",
                    "token": "e5f6",
                    "reading": {
                        "method": "volumetric",
                        "depths": [{"depth_m": 0.3, "value": 0.21}],
                    },
                },
                {"kind": "stage", "day": "2026-07-01", "token": "g7h8", "stage": 3},
            ]
        },
    )
    kind: Kind
    day: date
    block: Clean | None = None
    stage: Annotated[int, Field(ge=1, le=4)] | None = None
    cover: Annotated[float, Field(ge=0, le=1)] | None = None
    height_m: Annotated[float, Field(gt=0, le=30)] | None = None
    last: date | None = Field(None, description="last day to keep off")
    reading: ReadingPart | None = None
    note: Annotated[Clean, Field(max_length=400)] | None = None
    token: Annotated[Clean, Field(min_length=4, max_length=80)]


class SeenOut(BaseModel):
    """Something seen; of a reading, how it was weighed [mm of depletion] and what it moved."""

    id: int
    block_key: str
    kind: str
    day: date
    amount: float
    details: dict[str, Any]
    note: str
    who: str
    correction_mm: float | None
    gain: float | None
    before_mm: float | None
    before_spread_mm: float | None
    reading_mm: float | None
    reading_spread_mm: float | None
    after_mm: float | None
    after_spread_mm: float | None
    why: str | None


@router.get("/fields/{key}/seen")
def seen(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    since: Annotated[date | None, Query(description="a year back when not given")] = None,
) -> list[SeenOut]:
    """What was seen, newest first; of a reading, how it was weighed and what it moved."""
    blocks = own_blocks(db, viewer, key)
    with db.read() as session:
        rows = seen_since(
            session, [block.id for block in blocks], since or today - timedelta(days=366)
        )
    return [SeenOut.model_validate(row._asdict()) for row in rows]


@router.post("/fields/{key}/seen", status_code=201)
def log(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, given: SeenIn) -> Logged:
    """Log something seen; delete it as any entry."""
    from app.workflows.log_seen import log_seen

    own_blocks(db, viewer, key)
    details = {"height_m": given.height_m, "last": given.last}
    if given.reading is not None:
        details = given.reading.model_dump(mode="json")
    try:
        number = log_seen(
            db,
            key,
            given.block,
            given.kind,
            given.day,
            viewer.who,
            given.token,
            today,
            amount=float(given.stage or given.cover or 0.0),
            details=details,
            note=given.note,
        )
    except EntryError as error:
        raise refused(error) from None
    return Logged(id=number)
