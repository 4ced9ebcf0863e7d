"""Of which stations a viewer may see and take in files."""

from typing import Annotated

from fastapi import Depends, HTTPException, Request

from app.storage import pages_station as store
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsToday
from app.web.pages.stations import own_stations

NO_STATION = "There is no such station, or it feeds none of your fields."


def stations_within_reach(
    request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday
) -> frozenset[str] | None:
    """Keys of the viewer's stations, None for every one; 404 for an address of another's file."""
    if viewer.farms is None:
        return None
    own = frozenset(station.key for station in own_stations(db, viewer, today))
    number = request.path_params.get("intake_id", "")
    if str(number).isdecimal() and len(str(number)) < 10:
        with db.read() as session:
            if store.station_of(session, int(number)) not in own:
                raise HTTPException(404, f"There is no intake {number}.")
    if request.path_params.get("station", None) not in own | {None}:
        raise HTTPException(404, NO_STATION)
    return own


AsOwnStations = Annotated[frozenset[str] | None, Depends(stations_within_reach)]
