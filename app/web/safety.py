"""What stands before every request and around every answer: host, origin, safe headers."""

from urllib.parse import urlsplit

from starlette.datastructures import Headers, MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from app.web.access import SAFE
from app.web.headers import CAUTION_HEADER, HEADERS
from app.web.problems import refusal

HOSTS = frozenset({"127.0.0.1", "localhost", "[::1]"})


def host_name(host: str) -> str:
    """The name part of a Host header."""
    return host.rsplit(":", 1)[0] if not host.endswith("]") else host


def is_foreign(headers: Headers) -> bool:
    """Whether a browser says that another site sent this request.

    A browser sends Sec-Fetch-Site or Origin with every POST; a program that sends neither carries
    no cookie of anybody else's either.
    """
    site = headers.get("sec-fetch-site")
    if site is not None:
        return site not in ("same-origin", "none")
    origin = headers.get("origin")
    return origin is not None and urlsplit(origin).netloc != headers.get("host")


class Safety:
    """Refuses a foreign host and another site's POST; adds the safe headers to every answer."""

    def __init__(self, app: ASGIApp) -> None:
        self.app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """ASGI."""
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return

        async def send_safely(message: Message) -> None:
            if message["type"] == "http.response.start":
                headers = MutableHeaders(scope=message)
                for name, value in HEADERS.items():
                    headers.setdefault(name, value)
                headers.setdefault("Cache-Control", "no-store")
                if scope["path"].startswith("/api/"):
                    headers["Rillbook-Caution"] = CAUTION_HEADER
            await send(message)

        headers = Headers(scope=scope)
        if host_name(headers.get("host", "")) not in HOSTS:
            answer = refusal(scope, 421, "host", headers.get("host", ""))
            await answer(scope, receive, send_safely)
        elif scope["method"] not in SAFE and is_foreign(headers):
            answer = refusal(scope, 403, "origin", headers.get("origin") or "another site")
            await answer(scope, receive, send_safely)
        else:
            await self.app(scope, receive, send_safely)
