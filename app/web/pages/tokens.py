"""A station's tokens, with which its logger pushes readings."""

from typing import Annotated

from fastapi import APIRouter, Form, HTTPException, Request, Response
from fastapi.responses import RedirectResponse

from app.storage import people as store
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsKey, AsNumber, AsToday, Clean
from app.web.pages.stations import own_station
from app.web.render import page
from app.workflows import tokens

router = APIRouter()


@router.get("/stations/{key}/tokens")
def held(
    request: Request, db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey
) -> Response:
    """The tokens that stand."""
    station = own_station(db, viewer, today, key)
    with db.read() as session:
        rows = store.tokens(session, station=key)
    base = request.app.state.settings.mail.base_url
    return page(request, "pages/tokens.html", station=station, tokens=rows, shown="", base_url=base)


@router.post("/stations/{key}/tokens")
def make(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    key: AsKey,
    name: Annotated[Clean, Form(max_length=80)] = "",
) -> Response:
    """A new token; shown once."""
    station = own_station(db, viewer, today, key)
    with db.write() as session:
        secret = tokens.make_token(session, "push", name, viewer.who, station=key)
        rows = store.tokens(session, station=key)
    base = request.app.state.settings.mail.base_url
    return page(
        request, "pages/tokens.html", station=station, tokens=rows, shown=secret, base_url=base
    )


@router.post("/stations/{key}/tokens/{number}/revoke")
def revoke(
    db: AsDatabase, viewer: AsViewer, today: AsToday, key: AsKey, number: AsNumber
) -> Response:
    """A token no longer pushes."""
    own_station(db, viewer, today, key)
    with db.write() as session:
        if not tokens.revoke_token(session, number, viewer.who, station=key):
            raise HTTPException(404, "This station has no such token.")
    return RedirectResponse(f"/stations/{key}/tokens", status_code=303)
