"""What stands before every request and around every answer: host, origin, size, safe headers."""

from urllib.parse import urlsplit

from starlette.datastructures import Headers, MutableHeaders
from starlette.exceptions import HTTPException
from starlette.requests import cookie_parser
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from app.web.access import SAFE, cookie_name, is_https
from app.web.headers import CAUTION_HEADER, HEADERS, HTTPS_HEADERS
from app.web.problems import REFUSED, refusal

HOSTS = frozenset({"127.0.0.1", "localhost", "[::1]"})
MEGABYTE = 1_000_000
LARGEST_FILE = 300 * MEGABYTE
"""A year of one-minute rows of thirty quantities takes about 100 MB."""
LARGEST_FORM = 8 * MEGABYTE


def host_name(host: str) -> str:
    """The name part of a Host header."""
    return host.rsplit(":", 1)[0] if not host.endswith("]") else host


def is_foreign(headers: Headers, host: str, cookie: str) -> bool:
    """Whether another site sent this request, or may have.

    A browser sends Sec-Fetch-Site or Origin with every POST. What sends neither is no browser of
    today: it is let through only without the cookie of a sign-in. `host` is that of the pages.
    """
    site = headers.get("sec-fetch-site")
    if site is not None:
        return site not in ("same-origin", "none")
    origin = headers.get("origin")
    try:
        if origin is None:
            return cookie in cookie_parser(headers.get("cookie", ""))
        return urlsplit(origin).netloc not in (headers.get("host"), host)
    except ValueError:
        return True


def most_bytes(scope: Scope) -> int:
    """The largest body a request may have: a station's file, or a form."""
    return LARGEST_FILE if scope["path"] in ("/intake", "/api/v1/intakes") else LARGEST_FORM


def counted(receive: Receive, most: int) -> Receive:
    """The same `receive`, which refuses to go on when more than `most` bytes have come."""
    had = 0

    async def receive_counted() -> Message:
        nonlocal had
        message = await receive()
        had += len(message.get("body", b""))
        if had > most:
            raise HTTPException(413, REFUSED["size"].format(value=in_words(most)))
        return message

    return receive_counted


def in_words(size: int) -> str:
    """A size in megabytes."""
    return f"{size // MEGABYTE} MB"


def announced(headers: Headers) -> int:
    """The length of the body as the request announces it; 0 when it does not."""
    length = headers.get("content-length", "")
    return int(length) if length.isascii() and length.isdecimal() and len(length) < 20 else 0


class Safety:
    """Refuses a foreign host, another site's POST and too large a body; adds the safe headers."""

    def __init__(self, app: ASGIApp, base_url: str) -> None:
        self.app = app
        self.host = urlsplit(base_url).netloc
        self.hosts = HOSTS | {host_name(self.host)}
        self.cookie = cookie_name(base_url)
        self.headers = {**HEADERS, **(HTTPS_HEADERS if is_https(base_url) else {})}

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """ASGI."""
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return

        async def send_safely(message: Message) -> None:
            if message["type"] == "http.response.start":
                headers = MutableHeaders(scope=message)
                for name, value in self.headers.items():
                    headers.setdefault(name, value)
                headers.setdefault("Cache-Control", "no-store")
                if scope["path"].startswith("/api/"):
                    headers["Rillbook-Caution"] = CAUTION_HEADER
            await send(message)

        headers = Headers(scope=scope)
        if host_name(headers.get("host", "")) not in self.hosts:
            answer = refusal(scope, 421, "host", headers.get("host", ""))
            await answer(scope, receive, send_safely)
        elif scope["method"] not in SAFE and is_foreign(headers, self.host, self.cookie):
            answer = refusal(scope, 403, "origin", headers.get("origin") or "another site")
            await answer(scope, receive, send_safely)
        elif announced(headers) > (most := most_bytes(scope)):
            answer = refusal(scope, 413, "size", in_words(most))
            await answer(scope, receive, send_safely)
        else:
            await self.app(scope, counted(receive, most), send_safely)
