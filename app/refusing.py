"""From a Refusal to a page: the one place that gives each kind of refusal its status."""

from __future__ import annotations

import html
import logging
from collections.abc import Mapping

from fastapi import Request, Response
from fastapi.exceptions import RequestValidationError
from fastapi.responses import HTMLResponse
from starlette.exceptions import HTTPException

from app.reading import TooLarge
from app.store import ModelUnreadable, NoModelYet, NoSuchStudy, Study
from engine.refusal import Refusal

log = logging.getLogger("steelyard")


class NotFromHere(Refusal):
    """A request that some other site, or some other name for this machine, made."""


STATUSES: tuple[tuple[type[Refusal], int], ...] = (
    (NoSuchStudy, 404),
    (NoModelYet, 409),
    (ModelUnreadable, 409),
    (TooLarge, 413),
    (NotFromHere, 403),
    (Refusal, 422),
)


def refuse(request: Request, error: Exception) -> Response:
    """The page that says a Refusal, with its status."""
    assert isinstance(error, Refusal)
    status = next(status for kind, status in STATUSES if isinstance(error, kind))
    return refused_page(request, error, status)


def refuse_address(request: Request, error: Exception) -> Response:
    """The page for an address that leads nowhere, or that cannot be used in this way."""
    assert isinstance(error, HTTPException)
    if isinstance(error.__cause__, Refusal):  # raised while a form was read, and wrapped by its reader
        return refuse(request, error.__cause__)
    shelf = "Go back, or pick a study on the Shelf."
    match error.status_code:
        case 404:
            refusal = Refusal("There is no page at this address.", where=request.url.path, do=shelf)
        case 405:
            refusal = Refusal("This address cannot be opened in this way.", where=request.url.path, do=shelf)
        case 400:
            refusal = Refusal(f"The form could not be read: {error.detail}", where=request.url.path, do=shelf)
        case _:
            refusal = Refusal(f"The request was refused: {error.detail}", where=request.url.path, do=shelf)
    return refused_page(request, refusal, error.status_code, error.headers)


def refuse_values(request: Request, error: Exception) -> Response:
    """The page for a form or an address whose parts are missing or of the wrong kind."""
    assert isinstance(error, RequestValidationError)
    first = error.errors()[0]
    place = ".".join(str(part) for part in first["loc"][1:]) or request.url.path
    given = first.get("input")
    what = f"is “{given[:40]}”" if isinstance(given, str) else "is missing"
    refusal = Refusal(
        f"A part of the address or form cannot be used: “{place}” {what}.",
        where=place,
        do="Go back and choose again on the page.",
    )
    return refused_page(request, refusal, 422)


def refuse_fault(request: Request, error: Exception) -> Response:
    """The page for an error of the program itself: a sentence, no trace; the trace goes to the console."""
    log.error("An error of the program at %s", request.url.path, exc_info=error)
    refusal = Refusal(
        "Steelyard met an error of its own and could not finish this.",
        where=request.url.path,
        do="What was saved is intact. Go back and try again; the window that Steelyard was started in shows the error.",
    )
    return refused_page(request, refusal, 500)


def refused_page(request: Request, refusal: Refusal, status: int, headers: Mapping[str, str] | None = None) -> Response:
    """templates/refused.html with `refusal`, `status` and the study of the address, if there is one."""
    study = _study(request)
    to_model = isinstance(refusal, NoModelYet | ModelUnreadable) and study is not None
    onward = ("Go to the model", f"/study/{study.key}/model") if to_model and study is not None else None
    context = {"refusal": refusal, "status": status, "study": study, "onward": onward}
    try:
        page: Response = request.app.state.templates.TemplateResponse(request, "refused.html", context, status)
    except Exception as error:  # the page that says what went wrong must not go wrong itself
        log.error("The page of a refusal could not be made", exc_info=error)
        title, words = html.escape(refusal.message), html.escape(refusal.do or "")
        page = HTMLResponse(
            f'<!doctype html><html lang="en"><title>{title}</title><h1>{title}</h1><p>{words}</p>', status
        )
    page.headers.update(headers or {})
    return page


def _study(request: Request) -> Study | None:
    key = request.path_params.get("key")
    if key is None:
        return None
    try:
        study: Study = request.app.state.store.study(key)
    except Refusal:
        return None
    return study
