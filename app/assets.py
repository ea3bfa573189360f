"""Templates and static files: what pages are made of."""

from __future__ import annotations

import hashlib
from functools import cache
from pathlib import Path
from urllib.parse import parse_qs, quote

import jinja2
from fastapi.templating import Jinja2Templates
from starlette.responses import Response
from starlette.staticfiles import StaticFiles
from starlette.types import Scope

from app.resources import resource

FOREVER = "public, max-age=31536000, immutable"


def templates() -> Jinja2Templates:
    """Templates that escape every name, and refuse one that was not given. `static("look.css")` is a file's address."""
    environment = jinja2.Environment(
        loader=jinja2.FileSystemLoader(resource("templates")),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.globals["static"] = static_address
    return Jinja2Templates(env=environment)


def static_address(name: str) -> str:
    """The address of a static file; it changes with the file, so that a browser may keep what it has."""
    path = resource("static") / name
    return f"/static/{quote(name)}?v={_digest(path, path.stat().st_mtime_ns)}"


@cache
def _digest(path: Path, changed: int) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()[:12]


class Static(StaticFiles):
    """The static folder. A file asked for by its full address is kept by the browser; else it asks each time."""

    def __init__(self) -> None:
        super().__init__(directory=resource("static"))

    async def get_response(self, path: str, scope: Scope) -> Response:
        response = await super().get_response(path, scope)
        version = parse_qs(scope["query_string"].decode("latin-1")).get("v", [""])[0]
        file = resource("static") / path
        if version and response.status_code in (200, 304) and version == _digest(file, file.stat().st_mtime_ns):
            response.headers["Cache-Control"] = FOREVER
        else:
            response.headers["Cache-Control"] = "no-cache"
        return response
