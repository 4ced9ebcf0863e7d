"""The ways in of demo mode, without a sign-in."""

from fastapi import APIRouter, HTTPException, Request, Response
from fastapi.responses import RedirectResponse

from app.storage import pages as store
from app.web.access import EVERY, way_in
from app.web.needs import AsDatabase
from app.web.render import page

router = APIRouter()


@router.get("/enter")
def door(request: Request, db: AsDatabase) -> Response:
    """The door: who do you want to be in the demo?"""
    if not request.app.state.settings.demo:
        return RedirectResponse("/", status_code=303)
    with db.read() as session:
        farms = store.farms(session)
    return page(request, "pages/enter.html", farms=farms)


@router.get("/enter/{role}")
def enter(request: Request, db: AsDatabase, role: str, farm: str | None = None) -> Response:
    """Enter as advisor, admin, or grower of one farm (the first by name unless given)."""
    if not request.app.state.settings.demo:
        return RedirectResponse("/", status_code=303)
    if role not in EVERY:
        raise HTTPException(404, "There are three ways in: advisor, grower, admin.")
    if role != "grower":
        return way_in(role, None, "/intake" if role == "admin" else "/")
    with db.read() as session:
        keys = [key for key, _ in store.farms(session)]
    if not keys or (farm is not None and farm not in keys):
        raise HTTPException(404, "There is no such farm to enter as its grower.")
    return way_in(role, farm or keys[0], "/farm")
