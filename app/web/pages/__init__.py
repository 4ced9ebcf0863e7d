"""The pages."""

from fastapi import APIRouter

from app.web.pages import enter, fields, intake, methods, rounds, seen, station_words, stations

PARTS = tuple(
    part.router for part in (enter, rounds, fields, seen, stations, station_words, intake, methods)
)

router = APIRouter(include_in_schema=False)
for part in PARTS:
    router.include_router(part)
