"""The pages."""

from fastapi import APIRouter

from app.web.pages import enter, fields, intake, methods, rounds, stations

PARTS = tuple(part.router for part in (enter, rounds, fields, stations, intake, methods))

router = APIRouter(include_in_schema=False)
for part in PARTS:
    router.include_router(part)
