"""Templates: one environment, one way to answer with a page."""

from typing import Any

from fastapi import Request
from fastapi.responses import HTMLResponse
from jinja2 import Environment, FileSystemLoader, StrictUndefined
from sqlalchemy.exc import DBAPIError

from app import wording
from app.resources import resource
from app.storage.database import DatabaseError
from app.web.access import NOBODY, Viewer, viewer_of
from app.wording.reader import Reader

PAGES = (
    ("farm", "/farm", "/farm"),
    ("rounds", "/", "/"),
    ("letters", "/letters", "/letters"),
    ("stations", "/stations", "/stations"),
    ("intake", "/intake", "/intake"),
    ("people", "/people", "/people"),
    ("methods", "/methods", "/methods"),
)
"""Key of its name in the catalogue, address, and how the addresses below it begin."""


def make_environment() -> Environment:
    """The template environment: everything escaped, an unknown name is an error."""
    environment = Environment(
        loader=FileSystemLoader(resource("templates")),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        auto_reload=False,
    )
    environment.filters.update(
        number=wording.number,
        blank=wording.blank,
        depth=wording.depth,
        signed=wording.signed,
        volume=wording.volume,
        share=wording.share,
        plain=wording.plain,
        long_day=wording.long_day,
        short_day=wording.short_day,
        plain_day=wording.plain_day,
        full_day=wording.full_day,
        rung=wording.rung,
    )
    return environment


def page(request: Request, template: str, status: int = 200, /, **context: Any) -> HTMLResponse:
    """An answer from a template; every page knows its viewer, its reader and where it is."""
    viewer = _viewer(request)
    reader: Reader = context.setdefault("reader", Reader())
    text = request.app.state.templates.get_template(template).render(
        context,
        viewer=viewer,
        demo=request.app.state.settings.demo,
        asset=request.app.state.assets.address,
        pages=[
            (reader.say("pages", key), path, current_page(request.url.path, start))
            for key, path, start in PAGES
            if viewer.may("GET", path)
        ],
    )
    return HTMLResponse(text, status_code=status)


def _viewer(request: Request) -> Viewer:
    """The viewer, nobody where the database cannot say: the page then tells of that."""
    try:
        return viewer_of(request)
    except (DatabaseError, DBAPIError):
        return NOBODY


def current_page(path: str, start: str) -> bool:
    """Whether a path belongs to a page of the menu; fields belong to Rounds."""
    if start == "/people" and path == "/audit":
        return True
    if start == "/":
        return path == "/" or path.startswith(
            ("/fields", "/rounds", "/events", "/meters", "/supply")
        )
    return path == start or path.startswith(start + "/")
