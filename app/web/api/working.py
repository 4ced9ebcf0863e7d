"""A day's working as data: the figures on the way, the equations, and the readings by line."""

import math
from dataclasses import asdict
from datetime import UTC, date, datetime
from typing import Annotated, Any

import numpy as np
from fastapi import APIRouter, Query
from pydantic import BaseModel, Field

from app import wording
from app.intake.pack import unpack
from app.storage import pages_field as store_field
from app.web.access import AsViewer
from app.web.api.schemas import Number
from app.web.needs import AsDatabase, AsDay, AsKey, AsToday, Clean
from app.web.pages.working import find

router = APIRouter(prefix="/api/v1")


class TermOut(BaseModel):
    """A figure as the page writes it: in words or symbols, and in figures where there are any."""

    section: str
    name: str
    value: str
    unit: str
    how: str
    sum: str
    source: str


class ReadingOut(BaseModel):
    """A row of a station's file: end of its interval (or its day), and its values in SI units."""

    station: str
    time: datetime
    intake: int
    file: str
    line: int
    values: dict[str, Number]


class WorkingOut(BaseModel):
    """One ledger day opened."""

    field: str
    block: str
    day: date
    caution: str
    figures: dict[str, float | bool | int | None] = Field(
        description="depths in mm, coefficients and fractions as such; null where unbounded"
    )
    ledger: dict[str, Any] = Field(description="the day as the ledger keeps it")
    terms: list[TermOut]
    readings: list[ReadingOut]


@router.get("/fields/{key}/days/{day}", tags=["fields"])
def days_working(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    day: AsDay,
    block: Annotated[Clean | None, Query(max_length=80)] = None,
) -> WorkingOut:
    """Every term of one ledger day, down to the readings and the lines they came from."""
    found = find(db, viewer, today, key, day, block or "")
    with db.read() as session:
        brought = {
            station: store_field.brought(session, number, day)
            for number, station in sorted(found.stations.items())
        }
    readings = [
        ReadingOut(
            station=station,
            time=datetime.fromtimestamp(int(rows.instant[n]), UTC),
            intake=item.intake_id,
            file=item.file_name,
            line=int(rows.line[n]),
            values={
                name: None if np.isnan(column[n]) else float(column[n])
                for name, column in rows.values.items()
            },
        )
        for station, items in brought.items()
        for item in items
        for rows in [unpack(item.data)]
        for n in range(len(rows))
    ]
    hidden = ("block_id", "season_id")
    return WorkingOut(
        field=key,
        block=found.block.key,
        day=day,
        caution=wording.CAUTION,
        figures={
            name: value if not isinstance(value, float) or math.isfinite(value) else None
            for name, value in asdict(found.opened.day).items()
        },
        ledger={name: value for name, value in found.row.items() if name not in hidden},
        terms=[
            TermOut(
                section=section.title, name=t.name, value=t.value, unit=t.unit, how=t.how,
                sum=t.sum, source=t.source,
            )
            for section in found.sections
            for t in section.terms
        ],
        readings=readings,
    )  # fmt: skip
