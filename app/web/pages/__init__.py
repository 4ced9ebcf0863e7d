"""The pages."""

from fastapi import APIRouter

from app.web.pages import (
    answers,
    enter,
    farm,
    fields,
    intake,
    letters,
    methods,
    recipients,
    rounds,
    seen,
    station_words,
    stations,
)

PARTS = tuple(
    part.router
    for part in (
        enter,
        farm,
        rounds,
        letters,
        recipients,
        answers,
        fields,
        seen,
        stations,
        station_words,
        intake,
        methods,
    )
)

router = APIRouter(include_in_schema=False)
for part in PARTS:
    router.include_router(part)
