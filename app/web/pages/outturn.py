"""How past advice turned out: what was done, and how near the foretold depletion came."""

from typing import Annotated

from fastapi import APIRouter, Query, Request, Response

from app.storage import pages as store
from app.web.access import AsViewer
from app.web.needs import AsDatabase, AsToday, Clean
from app.web.outturn_view import OUTCOMES, skill_rows, told
from app.web.render import page
from app.workflows.outturn import outturns

router = APIRouter()
MORNINGS = 30
SHOWN = 60


@router.get("/outturn")
def outturn(
    request: Request,
    db: AsDatabase,
    viewer: AsViewer,
    today: AsToday,
    farm: Annotated[Clean, Query(max_length=80)] = "",
) -> Response:
    """Seven days on: each advice, and the skill of all of them together."""
    with db.read() as session:
        farms = store.farms(session, viewer.farms)
        chosen = farm if farm in {key for key, _ in farms} else None
        found = outturns(session, today, MORNINGS, viewer.farms, chosen)
    return page(
        request,
        "pages/outturn.html",
        farms=sorted(farms, key=lambda one: one[1]),
        farm=chosen or "",
        mornings=MORNINGS,
        counts=[(words, found.count(what)) for what, words in OUTCOMES.items()],
        skill=skill_rows(found.skill),
        each=[told(one) for one in reversed(found.each)][:SHOWN],
        total=len(found.each),
        late=sum(one.late_days > 0 for one in found.each),
    )
