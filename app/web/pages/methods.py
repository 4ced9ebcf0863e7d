"""Methods: how each number is computed, and the limits of use."""

from fastapi import APIRouter, Request, Response

from app.web import methods_view
from app.web.render import page

router = APIRouter()


@router.get("/methods")
def methods(request: Request) -> Response:
    """The methods, their sources, the conventions decided, the working values."""
    return page(
        request,
        "pages/methods.html",
        rungs=methods_view.rungs(),
        working=methods_view.working_values(),
    )
