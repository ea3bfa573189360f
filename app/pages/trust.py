"""Trust: judge the model, watch it, read whether to believe it."""

from __future__ import annotations

from fastapi import APIRouter, Request, Response
from fastapi.responses import RedirectResponse

from app.pages import trust_view
from app.store import Study
from app.store.judgements import Judgements

router = APIRouter()


@router.get("/study/{key}/trust")
def show(request: Request, key: str, column: str | None = None) -> Response:
    """The page. column: whose reliability is shown, else the first outcome's."""
    return _page(request, key, "trust.html", column)


@router.get("/study/{key}/judge")
def progress(request: Request, key: str) -> Response:
    """The part of the page that follows the judging; once it has ended, the judgement."""
    return _page(request, key, "trust_part.html", None)


@router.post("/study/{key}/judge")
def judge(request: Request, key: str) -> Response:
    request.app.state.judging.start(key)
    return RedirectResponse(f"/study/{key}/trust", status_code=303)


@router.post("/study/{key}/judge/cancel")
def cancel(request: Request, key: str) -> Response:
    request.app.state.store.study(key)
    request.app.state.judging.cancel(key)
    return RedirectResponse(f"/study/{key}/trust", status_code=303)


@router.post("/study/{key}/judge/forget")
def forget(request: Request, key: str) -> Response:
    """Say no more of a job that ended without a judgement."""
    request.app.state.store.study(key)
    request.app.state.judging.forget(key)
    return RedirectResponse(f"/study/{key}/trust", status_code=303)


def _page(request: Request, key: str, template: str, column: str | None) -> Response:
    store = request.app.state.store
    study: Study = store.study(key)
    state = request.app.state.judging.state(key)
    running = state is not None and state.state == "running"
    kept = None if running else Judgements(store.database).of(study)
    context = {
        "page": "Trust",
        "study": study,
        "judging": trust_view.judging(state) if state is not None and running else None,
        "ended": trust_view.ended(state),
        "view": None if kept is None else trust_view.view(kept, column),
    }
    page: Response = request.app.state.templates.TemplateResponse(request, template, context)
    return page
