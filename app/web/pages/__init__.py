"""The pages."""

from fastapi import APIRouter

from app.web.pages import enter, fields, intake, rounds, stations

router = APIRouter(include_in_schema=False)
for part in (enter, rounds, fields, stations, intake):
    router.include_router(part.router)
