"""Model: start learning, watch it, choose a size, read the links."""

from __future__ import annotations

import re
from typing import Annotated

from fastapi import APIRouter, Form, Request, Response
from fastapi.responses import RedirectResponse

from app.pages import learning_view, model_view
from app.store import ModelUnreadable, Study
from engine.learning.checks import MOST_PARENTS
from engine.refusal import Refusal

router = APIRouter()


@router.get("/study/{key}/model")
def show(request: Request, key: str, links: str = "", column: str | None = None) -> Response:
    """The page. links: the budget to show, else the accepted one.  column: the column picked out."""
    return _page(request, key, "model.html", links, column)


@router.get("/study/{key}/model.py")
def program(request: Request, key: str, links: str = "") -> Response:
    """The model as a program to keep and run. links: its size, else the one in use."""
    store = request.app.state.store
    learned, size = store.learned(key), _size(links)
    if learned is None or not links:
        model = store.model(key)
    elif size is None:
        raise Refusal(f"“{links}” is no number of links.", where="links", do="Give a number, or leave it out.")
    else:
        model = learned.model(size)
    name = re.sub(r"[^a-z0-9-]", "", key) or "model"
    held = {"Content-Disposition": f'attachment; filename="{name}-{len(model.links)}-links.py"'}
    return Response(model.program(), media_type="text/x-python", headers=held)


@router.get("/study/{key}/learn")
def progress(request: Request, key: str) -> Response:
    """The part of the page that follows the learning; once it has ended, the model."""
    return _page(request, key, "model_part.html", "", None)


@router.post("/study/{key}/learn")
def learn(request: Request, key: str, max_parents: Annotated[int | None, Form()] = None) -> Response:
    """Start learning. max_parents: the most that a column may have from now on; None: as before."""
    if max_parents is not None:
        request.app.state.store.limit_parents(key, max_parents)
    request.app.state.jobs.start(key)
    return RedirectResponse(f"/study/{key}/model", status_code=303)


@router.post("/study/{key}/learn/cancel")
def cancel(request: Request, key: str) -> Response:
    request.app.state.store.study(key)
    request.app.state.jobs.cancel(key)
    return RedirectResponse(f"/study/{key}/model", status_code=303)


@router.post("/study/{key}/learn/forget")
def forget(request: Request, key: str) -> Response:
    """Say no more of a job that ended without a model."""
    request.app.state.store.study(key)
    request.app.state.jobs.forget(key)
    return RedirectResponse(f"/study/{key}/model", status_code=303)


@router.post("/study/{key}/budget")
def accept(request: Request, key: str, links: Annotated[int, Form()]) -> Response:
    """Accept the model with this many links; questions are answered by it from now on."""
    request.app.state.store.accept(key, links)
    return RedirectResponse(f"/study/{key}/model", status_code=303)


def _page(request: Request, key: str, template: str, links: str, column: str | None) -> Response:
    store, jobs = request.app.state.store, request.app.state.jobs
    study: Study = store.study(key)
    state = jobs.state(key)
    learning = ended = view = way_on = None
    wanted = _size(links)
    if state is not None and state.state == "running":
        learning = learning_view.view(state)
    else:
        if state is not None and not learning_view.mended(state, store.table(key), study):
            ended, way_on = learning_view.ended(state), learning_view.way_on(state, store.table(key), study)
        try:
            learned = store.learned(key)
        except ModelUnreadable as refusal:
            learned, ended = None, (refusal.message, refusal.do or "")
        if learned is not None:
            view = model_view.view(study, learned, wanted, column)
    no_size = links if view is not None and links and view.links != wanted else None
    no_column = column if view is not None and column is not None and view.picked is None else None
    context = {
        "page": "Model",
        "study": study,
        "state": state,
        "learning": learning,
        "ended": ended,
        "way_on": way_on,
        "most_parents": MOST_PARENTS,
        "view": view,
        "headline": model_view.headline(view) if view else None,
        "deck": model_view.deck(view) if view else None,
        "one_stage": sum(bool(columns) for _, columns in study.plan.stages) < 2,
        "no_size": no_size,
        "no_column": no_column,
    }
    status = 200 if no_size is None and no_column is None else 422
    page: Response = request.app.state.templates.TemplateResponse(request, template, context, status)
    return page


def _size(links: str) -> int | None:
    return int(links) if links.isascii() and links.isdigit() and len(links) < 10 else None
