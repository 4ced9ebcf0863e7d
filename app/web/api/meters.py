"""Water meters: readings, and metered against logged."""

import math
from datetime import date
from typing import Annotated

from fastapi import APIRouter, Query, Response
from pydantic import BaseModel, Field

from app.storage import meters as store
from app.web.access import AsViewer
from app.web.api.events import refused
from app.web.api.schemas import Given, Logged, Number
from app.web.needs import AsDatabase, AsKey, AsNumber, AsToday, Clean
from app.web.pages.meters import own_meter
from app.workflows import meters
from app.workflows.once import EntryError

router = APIRouter(prefix="/api/v1", tags=["meters"])
Token = Annotated[Clean, Field(min_length=4, max_length=80)]
AsToken = Annotated[Clean, Query(min_length=4, max_length=80)]


class MeterOut(BaseModel):
    """A meter: m3 = register x multiplier x what its unit holds."""

    key: str
    name: str
    farm: str
    unit: str
    multiplier: float
    rolls_over_at: Number
    fields: list[str]


class IntervalOut(BaseModel):
    """A reading, and the time since the one before it; null where it tells nothing of that."""

    reading: int
    first: date | None
    last: date
    register_shows: float
    restarts: bool
    metered_m3: Number
    logged_m3: float
    irrigations: int
    shared: bool
    note: str
    who: str


class ReadingIn(Given):
    """What the register showed at the end of a day; the same `token` twice changes nothing."""

    day: date
    register_shows: Annotated[float, Field(ge=0)]
    restarts: bool = Field(False, description="the meter was changed or set anew before it")
    note: Annotated[Clean, Field(max_length=400)] = ""
    token: Token


class SharedOut(BaseModel):
    """How many irrigations count as metered now."""

    irrigations: int


@router.get("/meters")
def meter_list(db: AsDatabase, viewer: AsViewer) -> list[MeterOut]:
    """Every meter of the viewer's farms."""
    with db.read() as session:
        return [
            MeterOut(
                key=meter.key,
                name=meter.name,
                farm=farm,
                unit=meter.unit,
                multiplier=meter.multiplier,
                rolls_over_at=meter.rolls_over_at,
                fields=sorted({one.field_key for one in store.fed_blocks(session, meter.id)}),
            )
            for meter, farm in store.meters(session, viewer.farms)
        ]


@router.get("/meters/{key}/readings")
def readings(db: AsDatabase, viewer: AsViewer, key: AsKey) -> list[IntervalOut]:
    """Readings by day, with what was metered and logged since the one before."""
    meter = own_meter(db, viewer, key)
    with db.read() as session:
        told = meters.intervals(session, meter)
    return [
        IntervalOut(
            reading=one.reading,
            first=one.first,
            last=one.last,
            register_shows=one.register,
            restarts=one.restarts,
            metered_m3=None if math.isnan(one.metered_m3) else one.metered_m3,
            logged_m3=one.logged_m3,
            irrigations=one.irrigations,
            shared=one.shared,
            note=one.note,
            who=one.who,
        )
        for one in told
    ]


@router.post("/meters/{key}/readings", status_code=201)
def read(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, given: ReadingIn) -> Logged:
    """Keep a reading; a second one on a day takes the place of the first."""
    own_meter(db, viewer, key)
    try:
        number = meters.read_meter(
            db, key, given.day, given.register_shows, viewer.who, given.token, today,
            viewer.farms, restarts=given.restarts, note=given.note,
        )  # fmt: skip
    except EntryError as error:
        raise refused(error) from None
    return Logged(id=number)


@router.delete("/meters/{key}/readings/{number}", status_code=204)
def delete(
    db: AsDatabase, viewer: AsViewer, key: AsKey, number: AsNumber, token: AsToken
) -> Response:
    """Delete a reading: it no longer counts, and stays in the record."""
    own_meter(db, viewer, key)
    try:
        meters.void_reading(db, key, number, viewer.who, token, viewer.farms)
    except EntryError as error:
        raise refused(error) from None
    return Response(status_code=204)


@router.post("/meters/{key}/readings/{number}/share")
def share(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, number: AsNumber, token: AsToken
) -> SharedOut:
    """Share what passed since the reading before over the irrigations logged meanwhile."""
    own_meter(db, viewer, key)
    try:
        count = meters.share_out(db, key, number, viewer.who, token, today, viewer.farms)
    except EntryError as error:
        raise refused(error) from None
    return SharedOut(irrigations=count)
