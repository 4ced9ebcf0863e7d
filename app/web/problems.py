"""Refusals and errors: a page in plain words, or problem details (RFC 9457) for the API."""

import logging
from collections.abc import Sequence
from math import isfinite
from typing import Any
from urllib.parse import urlencode

from fastapi import FastAPI, Request
from fastapi.exceptions import RequestValidationError
from fastapi.responses import JSONResponse, PlainTextResponse, RedirectResponse, Response
from sqlalchemy.exc import OperationalError
from starlette.exceptions import HTTPException
from starlette.types import Scope

from app.storage.database import DatabaseError
from app.web.access import NoWayInError
from app.web.headers import HEADERS
from app.web.render import page

PROBLEM = "application/problem+json"
TITLES = {
    400: "This cannot be read",
    401: "Nobody has entered yet",
    403: "Not open to you",
    404: "There is no such page",
    405: "This address does not take that",
    409: "Something stands in the way",
    413: "Too large",
    421: "Not served under this name",
    422: "Something has to be put right first",
    500: "Something went wrong on our side",
    503: "The database cannot be reached or written just now",
}
LOST_NOTHING = "Nothing was stored or changed."
REFUSED = {
    "host": "This server answers only under its own name, as RILLBOOK_URL says, or as 127.0.0.1 or "
    "localhost on its own machine; it was asked for as {value!r}.",
    "size": "What was sent is larger than {value}. Send a long record in parts, a year each.",
    "origin": "The form was sent from {value}, not from a page of this program. "
    "Open the page here and send it again.",
}


class RefusedError(Exception):
    """Input that cannot be used: field, value, what is wrong, and the remedy."""

    def __init__(
        self, says: str, field: str | None = None, value: str | None = None, remedy: str = ""
    ) -> None:
        super().__init__(says)
        self.says, self.field, self.value, self.remedy = says, field, value, remedy


def problem(status: int, detail: str, errors: Sequence[dict[str, Any]] = ()) -> JSONResponse:
    """Problem details; `errors` name each field, value and remedy."""
    content: dict[str, Any] = {
        "title": TITLES.get(status, "Refused"),
        "status": status,
        "detail": detail,
    }
    if errors:
        content["errors"] = list(errors)
    return JSONResponse(content, status_code=status, media_type=PROBLEM)


def refusal(scope: Scope, status: int, kind: str, value: str) -> Response:
    """An answer before any route has been looked up."""
    detail = REFUSED[kind].format(value=value[:100])
    if scope["path"].startswith("/api/"):
        return problem(status, detail)
    return PlainTextResponse(f"{TITLES[status]}. {detail} {LOST_NOTHING}\n", status_code=status)


def is_api(request: Request) -> bool:
    """Whether the request wants problem details rather than a page."""
    return request.url.path.startswith("/api/")


def error_page(request: Request, status: int, detail: str, lines: Sequence[str] = ()) -> Response:
    """A page that says what went wrong and leads back."""
    title = TITLES.get(status, "Refused")
    return page(request, "error.html", status, title=title, detail=detail, lines=lines)


def _http(request: Request, error: Exception) -> Response:
    assert isinstance(error, HTTPException)
    detail = str(error.detail)
    if error.status_code == 404 and detail == "Not Found":
        detail = f"Nothing is kept at {request.url.path[:120]}."
    if error.status_code == 405:
        detail = f"{request.method} is not taken at {request.url.path[:120]}."
    if is_api(request):
        return problem(error.status_code, detail)
    return error_page(request, error.status_code, detail)


def _validation(request: Request, error: Exception) -> Response:
    assert isinstance(error, RequestValidationError)
    found = [
        {
            "field": whole_text(".".join(map(str, item["loc"][1:])) or str(item["loc"][0])),
            "value": _shown(item.get("input")),
            "remedy": whole_text(str(item["msg"]).removeprefix("Value error, ")),
        }
        for item in error.errors()
    ]
    nowhere = f"Nothing is kept at {request.url.path[:120]}."
    in_path = any(item["loc"][0] == "path" for item in error.errors())
    if is_api(request):
        if in_path:
            return problem(404, nowhere, found)
        return problem(422, f"{LOST_NOTHING} See each of `errors`.", found)
    if in_path:
        return error_page(request, 404, nowhere)
    lines = [f"{item['field']} is {item['value']!r}: {item['remedy']}." for item in found]
    return error_page(request, 422, LOST_NOTHING, lines)


def _refused(request: Request, error: Exception) -> Response:
    assert isinstance(error, RefusedError)
    if is_api(request):
        item = {"field": error.field, "value": error.value, "remedy": error.remedy}
        return problem(422, error.says, [item] if error.field else [])
    lines = [error.remedy] if error.remedy else []
    return error_page(request, 422, f"{error.says} {LOST_NOTHING}", lines)


def _needs_way_in(request: Request, error: Exception) -> Response:
    if is_api(request):
        answer = problem(
            401, "Send a token that stands, as `Authorization: Bearer ...`, or sign in."
        )
        answer.headers["WWW-Authenticate"] = "Bearer"
        return answer
    if request.app.state.settings.demo:
        return RedirectResponse("/enter", status_code=303)
    to = request.url.path if request.method == "GET" else "/"
    return RedirectResponse(f"/sign-in?{urlencode({'to': to})}", status_code=303)


def _unforeseen(request: Request, error: Exception) -> Response:
    """The answer to an error of ours; it is made outside the other layers, so it brings its
    headers itself. The error goes on to the server's log."""
    detail = "The program met an error it does not know; it stands in the server's log."
    answer = problem(500, detail) if is_api(request) else error_page(request, 500, detail)
    answer.headers.update(HEADERS)
    return answer


def _no_database(request: Request, error: Exception) -> Response:
    """A database that is busy, full, read-only or gone: said without its name and path."""
    logging.getLogger("rillbook").error("%s", error)
    detail = f"{LOST_NOTHING} Try again in a minute; if it stays so, tell who runs this server."
    answer = problem(503, detail) if is_api(request) else error_page(request, 503, detail)
    answer.headers["Retry-After"] = "30"
    return answer


def _shown(value: Any) -> Any:
    """A refused value as an answer can carry it: short, and neither NaN nor half a character."""
    if value is None or isinstance(value, bool) or (isinstance(value, float) and isfinite(value)):
        return value
    if isinstance(value, int) and abs(value) < 2**63:
        return value
    return whole_text(value if isinstance(value, str) else repr(value)[:200])[:100]


def whole_text(text: str) -> str:
    """A text with each half of a surrogate pair, which no encoding takes, as a question mark."""
    return text.encode("utf-8", "replace").decode()


def install(app: FastAPI) -> None:
    """Give the app its handlers."""
    app.add_exception_handler(HTTPException, _http)
    app.add_exception_handler(RequestValidationError, _validation)
    app.add_exception_handler(RefusedError, _refused)
    app.add_exception_handler(NoWayInError, _needs_way_in)
    app.add_exception_handler(DatabaseError, _no_database)
    app.add_exception_handler(OperationalError, _no_database)
    app.add_exception_handler(Exception, _unforeseen)
