"""The JSON API, version 1: the same things as the pages."""

from typing import Any

from fastapi import APIRouter

from app.web.api import (
    closing,
    decisions,
    event_file,
    events,
    fields,
    intakes,
    meters,
    seen,
    station_words,
    stations,
    working,
)
from app.web.api.schemas import Problem
from app.wording import CAUTION, CAUTION_TITLE

DESCRIPTION = f"{CAUTION_TITLE} {CAUTION}"
PROBLEMS: dict[int | str, dict[str, Any]] = {
    status: {
        "model": Problem,
        "description": says,
        "content": {"application/problem+json": {}},
    }
    for status, says in {
        401: "No token that stands, and nobody signed in.",
        403: "Not open to this viewer, or sent from another site.",
        404: "There is no such thing, or it is not the viewer's.",
        422: "Something has to be put right first.",
    }.items()
}


PARTS = (
    fields.router,
    closing.router,
    working.router,
    decisions.router,
    events.router,
    event_file.router,
    meters.router,
    seen.router,
    stations.router,
    station_words.router,
    intakes.router,
)
"""Each carries the whole path of its routes, so that the table of access can name them."""

router = APIRouter(responses=PROBLEMS)
for part in PARTS:
    router.include_router(part)
