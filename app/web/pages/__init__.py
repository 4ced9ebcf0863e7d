"""The pages."""

from fastapi import APIRouter

from app.web.pages import (
    answers,
    decisions,
    enter,
    event_file,
    events,
    farm,
    fields,
    intake,
    letters,
    me,
    meters,
    methods,
    outturn,
    people,
    recipients,
    rounds,
    seasons,
    seen,
    sign_in,
    station_words,
    stations,
    supply,
    tokens,
    what_if,
    working,
)

PARTS = tuple(
    part.router
    for part in (
        sign_in,
        me,
        people,
        enter,
        farm,
        rounds,
        letters,
        recipients,
        answers,
        fields,
        decisions,
        seasons,
        events,
        seen,
        event_file,
        meters,
        supply,
        outturn,
        what_if,
        working,
        stations,
        station_words,
        tokens,
        intake,
        methods,
    )
)

router = APIRouter(include_in_schema=False)
for part in PARTS:
    router.include_router(part)
