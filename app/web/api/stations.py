"""Stations and their days."""

from datetime import date, timedelta
from typing import Annotated

import numpy as np
from fastapi import APIRouter, Query

from app import wording
from app.storage import pages as store
from app.storage import pages_field as store_field
from app.storage import pages_station as store_station
from app.storage.database import Database
from app.web.access import AsViewer
from app.web.api.schemas import StationOut
from app.web.api.station_day import StationDaysOut, day_out
from app.web.balance_view import et_by_residual
from app.web.needs import AsDatabase, AsKey, AsToday
from app.web.pages.stations import own_station, own_stations
from app.web.trouble import troubles

router = APIRouter(prefix="/api/v1", tags=["stations"])


@router.get("/stations")
def stations(db: AsDatabase, viewer: AsViewer, today: AsToday) -> list[StationOut]:
    """Every station with its last data and its trouble."""
    return _worded(db, own_stations(db, viewer, today), today)


@router.get("/stations/{key}")
def station(db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey) -> StationOut:
    """One station."""
    return _worded(db, [own_station(db, viewer, today, key)], today)[0]


def _worded(db: Database, rows: list[store.StationRow], today: date) -> list[StationOut]:
    with db.read() as session:
        spans = store_station.spans(session)
        last = store.last_days(session)
        recent = store.recent_days(session, today)
    trouble = {item.key: item.says for item in troubles(rows, recent, last, {}, today)}
    return [
        StationOut(
            key=row.key,
            name=row.name,
            first_day=spans[row.id].first if row.id in spans else None,
            last_day=last.get(row.id),
            details=row.details,
            trouble=list(trouble.get(row.key, ())),
        )
        for row in rows
    ]


@router.get("/stations/{key}/days")
def days(
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    first: Annotated[date | None, Query(description="30 days back when not given")] = None,
    last: Annotated[date | None, Query(description="yesterday when not given")] = None,
) -> StationDaysOut:
    """Days of a station: measured quantities, rung and why no better one, reference ET."""
    found = own_station(db, viewer, today, key)
    with db.read() as session:
        rows = store_field.station_days(
            session,
            [found.id],
            first or today - timedelta(days=30),
            last or today - timedelta(days=1),
        )
    return StationDaysOut(
        station=key,
        caution=wording.CAUTION,
        days=[
            day_out(row, None if np.isnan(et) else et)
            for row, et in zip(rows, et_by_residual(rows).tolist(), strict=True)
        ],
    )
