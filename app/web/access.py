"""Who may do what: one table of routes, one viewer per request.

There are no accounts yet. Outside demo mode whoever reaches the server (on loopback only, the
command line sees to that) is advisor and admin in one. In demo mode three ways in, without a
sign-in, set a cookie; a grower's cookie carries the one farm that every page and answer keeps to.
"""

import re
from dataclasses import dataclass
from typing import Annotated, Literal

from fastapi import Depends, HTTPException, Request
from fastapi.responses import RedirectResponse

from app.storage.scope import Farms

Role = Literal["advisor", "grower", "admin"]
COOKIE = "rillbook_way_in"
KEY = re.compile(r"[a-z0-9-]{1,80}")
SAFE = frozenset({"GET", "HEAD", "OPTIONS"})

ANYBODY: frozenset[str] = frozenset({"nobody", "advisor", "grower", "admin"})
EVERY: frozenset[str] = frozenset({"advisor", "grower", "admin"})
STAFF: frozenset[str] = frozenset({"advisor", "admin"})
GROWER: frozenset[str] = frozenset({"grower"})

MAY: dict[tuple[str, str], frozenset[str]] = {
    ("GET", "/static/{path:path}"): ANYBODY,
    ("GET", "/enter"): ANYBODY,
    ("GET", "/enter/{role}"): ANYBODY,
    ("GET", "/"): EVERY,
    ("POST", "/rounds/log"): EVERY,
    ("POST", "/rounds/up-to-date"): STAFF,
    ("GET", "/fields/{key}"): EVERY,
    ("GET", "/fields/{key}/days/{day}"): EVERY,
    ("GET", "/fields/{key}/ledger.csv"): EVERY,
    ("POST", "/fields/{key}/events"): EVERY,
    ("POST", "/fields/{key}/seen"): EVERY,
    ("POST", "/fields/{key}/events/{event_id}"): EVERY,
    ("POST", "/fields/{key}/events/{event_id}/delete"): EVERY,
    ("GET", "/advice.csv"): STAFF,
    ("GET", "/stations"): EVERY,
    ("GET", "/stations/{key}"): EVERY,
    ("GET", "/stations/{key}/days/{day}"): EVERY,
    ("GET", "/stations/{key}/days.csv"): EVERY,
    ("POST", "/stations/{key}/marks"): STAFF,
    ("POST", "/stations/{key}/marks/{number}/take-back"): STAFF,
    ("POST", "/stations/{key}/log"): STAFF,
    ("POST", "/stations/{key}/log/{number}/take-back"): STAFF,
    ("GET", "/intake"): STAFF,
    ("POST", "/intake"): STAFF,
    ("GET", "/intake/{intake_id}"): STAFF,
    ("GET", "/intake/pushes/{station}/{day}"): STAFF,
    ("POST", "/intake/{intake_id}/mapping"): STAFF,
    ("POST", "/intake/{intake_id}/apply"): STAFF,
    ("POST", "/intake/{intake_id}/undo"): STAFF,
    ("POST", "/intake/{intake_id}/discard"): STAFF,
    ("GET", "/letters"): STAFF,
    ("POST", "/letters/release"): STAFF,
    ("GET", "/letters/{number}"): STAFF,
    ("GET", "/letters/{number}/html"): STAFF,
    ("GET", "/letters/{number}/letter.eml"): STAFF,
    ("POST", "/letters/{number}/note"): STAFF,
    ("POST", "/letters/{number}/{deed}"): STAFF,
    ("GET", "/recipients"): STAFF,
    ("POST", "/recipients"): STAFF,
    ("POST", "/recipients/{number}"): STAFF,
    ("POST", "/covers"): STAFF,
    ("POST", "/covers/{number}/end"): STAFF,
    ("GET", "/farm"): GROWER,
    ("GET", "/farm/{key}"): EVERY,
    ("POST", "/farm/{key}/log"): EVERY,
    ("POST", "/farm/{key}/recipients/{number}"): EVERY,
    ("GET", "/farm/{key}/letters/{number}"): EVERY,
    # what a signed link opens
    ("GET", "/answer/{token}"): ANYBODY,
    ("POST", "/answer/{token}"): ANYBODY,
    ("GET", "/stop/{token}"): ANYBODY,
    ("POST", "/stop/{token}"): ANYBODY,
    ("GET", "/calendar/{token}.ics"): ANYBODY,
    ("GET", "/methods"): EVERY,
    ("GET", "/api/v1/openapi.json"): EVERY,
    ("GET", "/api/v1/rounds"): EVERY,
    ("GET", "/api/v1/fields"): EVERY,
    ("GET", "/api/v1/fields/{key}"): EVERY,
    ("GET", "/api/v1/fields/{key}/ledger"): EVERY,
    ("GET", "/api/v1/fields/{key}/advice"): EVERY,
    ("GET", "/api/v1/fields/{key}/events"): EVERY,
    ("GET", "/api/v1/fields/{key}/seen"): EVERY,
    ("POST", "/api/v1/fields/{key}/seen"): EVERY,
    ("POST", "/api/v1/fields/{key}/events"): EVERY,
    ("PUT", "/api/v1/fields/{key}/events/{event_id}"): EVERY,
    ("DELETE", "/api/v1/fields/{key}/events/{event_id}"): EVERY,
    ("GET", "/api/v1/stations"): EVERY,
    ("GET", "/api/v1/stations/{key}"): EVERY,
    ("GET", "/api/v1/stations/{key}/days"): EVERY,
    ("POST", "/api/v1/stations/{key}/readings"): STAFF,
    ("GET", "/api/v1/stations/{key}/marks"): EVERY,
    ("POST", "/api/v1/stations/{key}/marks"): STAFF,
    ("DELETE", "/api/v1/stations/{key}/marks/{number}"): STAFF,
    ("GET", "/api/v1/stations/{key}/log"): EVERY,
    ("POST", "/api/v1/stations/{key}/log"): STAFF,
    ("DELETE", "/api/v1/stations/{key}/log/{number}"): STAFF,
    ("GET", "/api/v1/intakes"): STAFF,
    ("POST", "/api/v1/intakes"): STAFF,
    ("GET", "/api/v1/intakes/{intake_id}"): STAFF,
    ("PUT", "/api/v1/intakes/{intake_id}/mapping"): STAFF,
    ("POST", "/api/v1/intakes/{intake_id}/apply"): STAFF,
    ("POST", "/api/v1/intakes/{intake_id}/undo"): STAFF,
    ("DELETE", "/api/v1/intakes/{intake_id}"): STAFF,
}


@dataclass(frozen=True)
class Viewer:
    """Who looks: role, the farms they may know of (None: every one), the name kept with entries."""

    role: str
    farms: Farms = None

    @property
    def who(self) -> str:
        """The name kept with what this viewer enters."""
        return f"{self.role} ({', '.join(sorted(self.farms))})" if self.farms else self.role

    def may(self, method: str, path: str) -> bool:
        """Whether this viewer may use a route, by its method and path pattern."""
        return self.role in MAY[method, path]


class NoWayInError(Exception):
    """Nobody has entered yet; pages lead to the door, the API answers 401."""


def viewer_of(request: Request) -> Viewer:
    """The viewer of a request."""
    if not request.app.state.settings.demo:
        return Viewer("admin")
    role, _, farm = request.cookies.get(COOKIE, "").partition(".")
    if role in STAFF and not farm:
        return Viewer(role)
    if role == "grower" and KEY.fullmatch(farm):
        return Viewer("grower", frozenset({farm}))
    return Viewer("nobody")


def admit(request: Request) -> Viewer:
    """Let the viewer through to the route that matched, or refuse; so is a route not in MAY."""
    viewer = viewer_of(request)
    method = "GET" if request.method == "HEAD" else request.method
    path = getattr(request.scope.get("route"), "path", None)
    allowed = MAY.get((method, path or ""), frozenset())
    if viewer.role in allowed:
        request.state.viewer = viewer
        return viewer
    if viewer.role == "nobody":
        raise NoWayInError
    raise HTTPException(403, "This page is not open to you; it is for the advisor and the admin.")


AsViewer = Annotated[Viewer, Depends(admit)]


def way_in(role: str, farm: str | None, to: str) -> RedirectResponse:
    """A redirect that carries the cookie of a way in (demo mode only)."""
    answer = RedirectResponse(to, status_code=303)
    value = f"{role}.{farm}" if farm else role
    answer.set_cookie(COOKIE, value, httponly=True, samesite="lax", path="/")
    return answer
