"""What every request passes first and every response takes along: this machine only, same origin, nothing else."""

from __future__ import annotations

from collections.abc import Awaitable, Callable
from urllib.parse import urlsplit

from fastapi import Request, Response
from starlette.datastructures import Headers, MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from app.reading import TooLarge, too_large
from app.refusing import NotFromHere, refuse, refuse_fault
from app.settings import LOOPBACK, Settings
from engine.refusal import Refusal

POLICY = (
    "default-src 'self'; script-src 'self'; "
    # The hash is that of an empty style element: the plots add one.
    "style-src 'self' 'sha256-47DEQpj8HBSa+/TImW+5JCeuQeRkm5NMpJWZG3hSuFU='; "
    "img-src 'self' data: blob:; frame-ancestors 'none'; form-action 'self'; base-uri 'none'"
)
HEADERS = {
    "Content-Security-Policy": POLICY,
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "same-origin",
    "Cross-Origin-Opener-Policy": "same-origin",
    "Cross-Origin-Resource-Policy": "same-origin",
}
SAFE_METHODS = frozenset({"GET", "HEAD", "OPTIONS"})
UPLOADS = "/bring"  # the one address that takes a file
FORM_LIMIT = 4_000_000  # bytes of any other form
DRAINED = 4_000_000_000  # bytes read and thrown away so that the browser gets to see why


class Guard:
    """The outermost layer of the app: checks, the cap on bodies, headers, and a page for errors of the program."""

    def __init__(self, app: ASGIApp, settings: Settings) -> None:
        self._app = app
        self._settings = settings
        self._hosts = _hosts(settings)

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return
        sent = _Sent(send)
        capped = _Capped(receive, self._limit(scope), self._too_large(scope))
        try:
            self._check(scope)
            await capped.check_announced(Headers(scope=scope))
            await self._app(scope, capped.receive, sent.send)
        except Exception as error:
            if sent.started:
                raise
            say: Callable[[Request, Exception], Response] = refuse if isinstance(error, Refusal) else refuse_fault
            await say(Request(scope), error)(scope, receive, sent.send)

    def _check(self, scope: Scope) -> None:
        headers = Headers(scope=scope)
        host = headers.get("host", "").lower()
        if host not in self._hosts:
            raise NotFromHere(
                f"“{host}” is not the address of this Steelyard.", do=f"Open {self._settings.address} instead."
            )
        if scope["method"] not in SAFE_METHODS and not _same_origin(headers, host):
            raise NotFromHere(
                "This form was not sent from a page of Steelyard.", do=f"Open {self._settings.address} and try there."
            )

    def _limit(self, scope: Scope) -> int:
        return self._settings.upload_bytes + FORM_LIMIT if scope["path"] == UPLOADS else FORM_LIMIT

    def _too_large(self, scope: Scope) -> TooLarge:
        if scope["path"] == UPLOADS:
            return too_large(self._settings)
        return TooLarge("The form is too large.", do="Go back and change fewer things at once.")


class _Capped:
    """Reads a body up to a limit, then throws the rest away and raises."""

    def __init__(self, receive: Receive, limit: int, refusal: TooLarge) -> None:
        self._receive = receive
        self._limit = limit
        self._refusal = refusal
        self._size = 0

    async def check_announced(self, headers: Headers) -> None:
        announced = headers.get("content-length", "")
        if announced.isascii() and announced.isdigit() and int(announced) > self._limit:
            await self._drain()
            raise self._refusal

    async def receive(self) -> Message:
        message = await self._receive()
        self._size += len(message.get("body", b""))
        if self._size > self._limit:
            if message.get("more_body"):
                await self._drain()
            raise self._refusal
        return message

    async def _drain(self) -> None:
        size = 0
        while size < DRAINED:
            message = await self._receive()
            size += len(message.get("body", b""))
            if message["type"] == "http.disconnect" or not message.get("more_body"):
                return


class _Sent:
    """Adds the headers to a response, and knows whether it has begun."""

    def __init__(self, send: Callable[[Message], Awaitable[None]]) -> None:
        self._send = send
        self.started = False

    async def send(self, message: Message) -> None:
        if message["type"] == "http.response.start":
            self.started = True
            headers = MutableHeaders(scope=message)
            for name, value in HEADERS.items():
                headers[name] = value
            headers.setdefault("Cache-Control", "private, no-cache")
        await self._send(message)


def _hosts(settings: Settings) -> frozenset[str]:
    names = [f"[{name}]" if ":" in name else name for name in LOOPBACK]
    hosts = {f"{name}:{settings.port}" for name in names}
    return frozenset(hosts | set(names)) if settings.port == 80 else frozenset(hosts)


def _same_origin(headers: Headers, host: str) -> bool:
    """Whether the browser vouches that a page of ours sent this; one that does not say is asked for its Origin."""
    site = headers.get("sec-fetch-site")
    if site is not None:
        return site in ("same-origin", "none")
    origin = urlsplit(headers.get("origin", ""))
    return origin.scheme == "http" and origin.netloc.lower() == host
