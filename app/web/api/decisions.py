"""The advisor's decision on an advice."""

from datetime import date
from typing import Annotated, Literal

from fastapi import APIRouter
from pydantic import ConfigDict, Field

from app.web.access import AsViewer
from app.web.api.events import refused
from app.web.api.schemas import Given, Logged
from app.web.needs import AsDatabase, AsKey, AsToday, Clean
from app.web.pages.fields import choose, own_blocks
from app.workflows.once import EntryError

router = APIRouter(prefix="/api/v1")


class DecisionIn(Given):
    """What is decided on the advice that stands; the same `token` sent twice changes nothing."""

    model_config = ConfigDict(
        extra="forbid",
        allow_inf_nan=False,
        json_schema_extra={
            "examples": [{"verdict": "change", "day": "2026-07-16", "hours": 6, "token": "d1e2"}]
        },
    )
    verdict: Literal["accept", "change", "withhold", "take_back"]
    day: date | None = Field(
        None, description="change: to water on, as advised when not given; withhold: through it"
    )
    hours: float | None = Field(
        None, gt=0, le=1000, description="change: as advised when not given"
    )
    block: Clean | None = None
    note: Annotated[Clean, Field(max_length=400)] = ""
    token: Annotated[Clean, Field(min_length=4, max_length=80)]


@router.post("/fields/{key}/decision", status_code=201, tags=["fields"])
def decide(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, decision: DecisionIn
) -> Logged:
    """Accept, change or withhold the advice that stands, or take that back."""
    from app.workflows.decide_on_advice import decide_on_advice

    blocks = own_blocks(db, viewer, key)
    chosen = choose(blocks, decision.block or blocks[0].key)
    try:
        number = decide_on_advice(
            db, key, chosen.key, decision.verdict, viewer.who, decision.token, today,
            day=decision.day, hours=decision.hours, note=decision.note,
        )  # fmt: skip
    except EntryError as error:
        raise refused(error) from None
    return Logged(id=number)
