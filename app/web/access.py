"""Who may do what: one table of routes, one viewer per request.

A viewer is found in this order: a token in the Authorization header (API only), the cookie of a
sign-in, in demo mode the cookie of a way in without one. Until an admin can sign in, whoever asks
from this machine is admin. What a viewer may do stands in MAY; what they may know of is the farms
of `Viewer.farms`, to which every statement keeps, so that the rest is 404, not 403.
"""

import re
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Annotated

from fastapi import Depends, HTTPException, Request
from fastapi.responses import RedirectResponse, Response
from sqlalchemy.orm import Session

from app.settings import LOOPBACK
from app.storage import people as store
from app.storage.scope import Farms
from app.storage.tables_people import Account
from app.workflows.sign_in import LASTS

COOKIE = "rillbook_way_in"
SIGN_IN = "rillbook_sign_in"
KEY = re.compile(r"[a-z0-9-]{1,80}")
SAFE = frozenset({"GET", "HEAD", "OPTIONS"})

ANYBODY: frozenset[str] = frozenset({"nobody", "station", "advisor", "grower", "admin"})
EVERY: frozenset[str] = frozenset({"advisor", "grower", "admin"})
STAFF: frozenset[str] = frozenset({"advisor", "admin"})
GROWER: frozenset[str] = frozenset({"grower"})
ADMIN: frozenset[str] = frozenset({"admin"})

MAY: dict[tuple[str, str], frozenset[str]] = {
    ("GET", "/static/{path:path}"): ANYBODY,
    ("GET", "/enter"): ANYBODY,
    ("GET", "/enter/{role}"): ANYBODY,
    ("GET", "/sign-in"): ANYBODY,
    ("POST", "/sign-in"): ANYBODY,
    ("POST", "/sign-out"): ANYBODY,
    ("GET", "/forgot"): ANYBODY,
    ("POST", "/forgot"): ANYBODY,
    ("GET", "/link/{secret}"): ANYBODY,
    ("POST", "/link/{secret}"): ANYBODY,
    ("GET", "/me"): EVERY,
    ("POST", "/me/password"): EVERY,
    ("POST", "/me/codes"): STAFF,
    ("POST", "/me/codes/on"): STAFF,
    ("POST", "/me/codes/off"): STAFF,
    ("POST", "/me/sign-ins/{number}/end"): EVERY,
    ("POST", "/me/tokens"): EVERY,
    ("POST", "/me/tokens/{number}/revoke"): EVERY,
    ("GET", "/people"): ADMIN,
    ("POST", "/people"): ADMIN,
    ("GET", "/people/{number}"): ADMIN,
    ("POST", "/people/{number}"): ADMIN,
    ("POST", "/people/{number}/link"): ADMIN,
    ("POST", "/people/{number}/stop"): ADMIN,
    ("POST", "/people/{number}/open"): ADMIN,
    ("GET", "/audit"): ADMIN,
    ("GET", "/"): EVERY,
    ("POST", "/rounds/log"): EVERY,
    ("POST", "/rounds/up-to-date"): STAFF,
    ("GET", "/fields/{key}"): EVERY,
    ("GET", "/fields/{key}/what-if"): EVERY,
    ("GET", "/fields/{key}/days/{day}"): EVERY,
    ("GET", "/fields/{key}/ledger.csv"): EVERY,
    ("POST", "/fields/{key}/decision"): STAFF,
    ("GET", "/fields/{key}/seasons"): STAFF,
    ("POST", "/fields/{key}/seasons"): STAFF,
    ("POST", "/fields/{key}/events"): EVERY,
    ("POST", "/fields/{key}/seen"): EVERY,
    ("POST", "/fields/{key}/events/{event_id}"): EVERY,
    ("POST", "/fields/{key}/events/{event_id}/delete"): EVERY,
    ("GET", "/events/file"): EVERY,
    ("POST", "/events/file"): EVERY,
    ("GET", "/supply"): STAFF,
    ("GET", "/supply/{key}"): STAFF,
    ("GET", "/meters"): EVERY,
    ("POST", "/meters"): STAFF,
    ("GET", "/meters/{key}"): EVERY,
    ("POST", "/meters/{key}"): STAFF,
    ("POST", "/meters/{key}/readings"): EVERY,
    ("POST", "/meters/{key}/readings/{number}/delete"): EVERY,
    ("POST", "/meters/{key}/readings/{number}/share"): EVERY,
    ("GET", "/advice.csv"): STAFF,
    ("GET", "/outturn"): STAFF,
    ("GET", "/stations"): EVERY,
    ("GET", "/stations/{key}"): EVERY,
    ("GET", "/stations/{key}/days/{day}"): EVERY,
    ("GET", "/stations/{key}/days.csv"): EVERY,
    ("POST", "/stations/{key}/marks"): STAFF,
    ("POST", "/stations/{key}/marks/{number}/take-back"): STAFF,
    ("POST", "/stations/{key}/log"): STAFF,
    ("POST", "/stations/{key}/log/{number}/take-back"): STAFF,
    ("GET", "/stations/{key}/tokens"): STAFF,
    ("POST", "/stations/{key}/tokens"): STAFF,
    ("POST", "/stations/{key}/tokens/{number}/revoke"): STAFF,
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
    ("GET", "/api/v1/openapi.json"): ANYBODY,
    ("GET", "/api/v1/rounds"): EVERY,
    ("GET", "/api/v1/fields"): EVERY,
    ("GET", "/api/v1/fields/{key}"): EVERY,
    ("GET", "/api/v1/fields/{key}/days/{day}"): EVERY,
    ("GET", "/api/v1/fields/{key}/ledger"): EVERY,
    ("GET", "/api/v1/fields/{key}/advice"): EVERY,
    ("GET", "/api/v1/fields/{key}/events"): EVERY,
    ("GET", "/api/v1/fields/{key}/seen"): EVERY,
    ("GET", "/api/v1/fields/{key}/what-if"): EVERY,
    ("GET", "/api/v1/fields/{key}/closing-water"): EVERY,
    ("POST", "/api/v1/fields/{key}/seen"): EVERY,
    ("POST", "/api/v1/fields/{key}/decision"): STAFF,
    ("POST", "/api/v1/fields/{key}/events"): EVERY,
    ("POST", "/api/v1/events/file"): EVERY,
    ("GET", "/api/v1/meters"): EVERY,
    ("GET", "/api/v1/meters/{key}/readings"): EVERY,
    ("POST", "/api/v1/meters/{key}/readings"): EVERY,
    ("DELETE", "/api/v1/meters/{key}/readings/{number}"): EVERY,
    ("POST", "/api/v1/meters/{key}/readings/{number}/share"): EVERY,
    ("PUT", "/api/v1/fields/{key}/events/{event_id}"): EVERY,
    ("DELETE", "/api/v1/fields/{key}/events/{event_id}"): EVERY,
    ("GET", "/api/v1/stations"): EVERY,
    ("GET", "/api/v1/stations/{key}"): EVERY,
    ("GET", "/api/v1/stations/{key}/days"): EVERY,
    ("POST", "/api/v1/stations/{key}/readings"): STAFF | {"station"},
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
    """Who looks: role, the farms they may know of (None: every one), the name kept with entries.

    account and sign_in are numbers, None without an account; station is the key that a logger's
    token is for.
    """

    role: str
    farms: Farms = None
    name: str = ""
    account: int | None = None
    sign_in: int | None = None
    station: str | None = None

    @property
    def who(self) -> str:
        """The name kept with what this viewer enters."""
        if self.name:
            return self.name
        return f"{self.role} ({', '.join(sorted(self.farms))})" if self.farms else self.role

    def may(self, method: str, path: str) -> bool:
        """Whether this viewer may use a route, by its method and path pattern."""
        return self.role in MAY[method, path]


NOBODY = Viewer("nobody", frozenset())


class NoWayInError(Exception):
    """Nobody has entered yet; pages lead to the door, the API answers 401."""


def viewer_of(request: Request) -> Viewer:
    """The viewer of a request, looked up once."""
    found: Viewer | None = getattr(request.state, "viewer", None)
    if found is None:
        with request.app.state.db.read() as session:
            found = request.state.viewer = _look_up(request, session)
    return found


def _look_up(request: Request, session: Session) -> Viewer:
    state = request.app.state
    scheme, _, secret = request.headers.get("authorization", "").partition(" ")
    if scheme:
        return _by_token(request, session, secret.strip()) if scheme == "Bearer" else NOBODY
    cookie = request.cookies.get(cookie_name(state.settings.mail.base_url))
    if cookie and (found := store.signed_in(session, cookie, datetime.now(UTC))):
        account, sign_in = found
        return _of_account(session, account, sign_in.id)
    if state.settings.demo:
        return _by_way_in(request)
    if not getattr(state, "guarded", False):
        state.guarded = store.is_guarded(session)
    return Viewer("admin") if not state.guarded and is_local(request) else NOBODY


def _of_account(session: Session, account: Account, sign_in: int | None) -> Viewer:
    farms = None if account.role == "admin" else store.farms_of(session, account.id)
    return Viewer(account.role, farms, account.name, account.id, sign_in)


def _by_token(request: Request, session: Session, secret: str) -> Viewer:
    """A station's token pushes, a person's token reads the API; neither opens a page."""
    found = store.bearer(session, secret) if request.url.path.startswith("/api/") else None
    if found is None:
        return NOBODY
    if found.token.kind == "push" and found.station is not None:
        who = f"{found.station}: {found.token.name}"
        return Viewer("station", frozenset(), who, station=found.station)
    if found.token.kind == "read" and found.account is not None and request.method in SAFE:
        return _of_account(session, found.account, None)
    return NOBODY


def _by_way_in(request: Request) -> Viewer:
    role, _, farm = request.cookies.get(COOKIE, "").partition(".")
    if role in STAFF and not farm:
        return Viewer(role)
    if role == "grower" and KEY.fullmatch(farm):
        return Viewer("grower", frozenset({farm}))
    return NOBODY


def is_local(request: Request) -> bool:
    """Whether the page was asked for by a name of this machine."""
    return (request.url.hostname or "") in LOOPBACK


def admit(request: Request) -> Viewer:
    """Let the viewer through to the route that matched, or refuse; so is a route not in MAY."""
    viewer = viewer_of(request)
    method = "GET" if request.method == "HEAD" else request.method
    path = getattr(request.scope.get("route"), "path", None)
    allowed = MAY.get((method, path or ""), frozenset())
    if viewer.role in allowed:
        return viewer
    if viewer.role == "nobody":
        raise NoWayInError
    raise HTTPException(403, "This page is not open to you.")


AsViewer = Annotated[Viewer, Depends(admit)]


def way_in(role: str, farm: str | None, to: str) -> RedirectResponse:
    """A redirect that carries the cookie of a way in (demo mode only)."""
    answer = RedirectResponse(to, status_code=303)
    value = f"{role}.{farm}" if farm else role
    answer.set_cookie(COOKIE, value, httponly=True, samesite="lax", path="/")
    return answer


def is_https(base_url: str) -> bool:
    """Whether the pages are reached by https, by the address set for links."""
    return base_url.startswith("https:")


def cookie_name(base_url: str) -> str:
    """The name of the sign-in's cookie; `__Host-` binds it to this host (RFC 6265bis 4.1.3)."""
    return f"__Host-{SIGN_IN}" if is_https(base_url) else SIGN_IN


def set_sign_in(answer: Response, secret: str | None, base_url: str) -> None:
    """Put the cookie of a sign-in on an answer, or take it away."""
    answer.set_cookie(
        cookie_name(base_url),
        secret or "",
        max_age=int(LASTS.total_seconds()) if secret else 0,
        httponly=True,
        samesite="lax",
        secure=is_https(base_url),
        path="/",
    )
