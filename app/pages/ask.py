"""Ask: one question, its answer as a sentence, and every column to pin, set or watch."""

from __future__ import annotations

from functools import partial

from fastapi import APIRouter, Request, Response
from fastapi.responses import RedirectResponse

from app.address import Misread, from_a_form, parse
from app.drawing.beam import progress
from app.pages import ask_lanes, ask_view
from app.pages.ask_examples import examples
from app.pages.asking import Asked, Spine, ask, spine_of
from app.question import Question, query, url
from app.store import Study
from app.wording.parts import plain
from engine.doubting import STANDING, UNSEEN
from engine.model import Model
from engine.refusal import Refusal

router = APIRouter()


@router.get("/study/{key}/ask")
def ask_page(request: Request, key: str) -> Response:
    """The question in the address, answered. Without a model: what is missing, or how far learning is.

    A click is answered at once within the model, and its page then fetches the doubt over sampled models; a page that
    is loaded whole waits for it.
    """
    return _asked(request, key, doubt="HX-Request" not in request.headers)


@router.get("/study/{key}/ask/doubt")
def doubted_page(request: Request, key: str) -> Response:
    """The same page with the doubt over sampled models."""
    return _asked(request, key, doubt=True)


def _asked(request: Request, key: str, doubt: bool) -> Response:
    store = request.app.state.store
    study: Study = store.study(key)
    job = request.app.state.jobs.state(key)
    if study.model == "none":
        drawn = "" if job is None else progress(job.fraction, job.words)
        return _page(request, "ask/unlearned.html", study=study, job=job, progress=drawn, status_code=200)
    model: Model = store.model(key)
    spine = spine_of(model)
    try:
        question = parse(request.query_params.multi_items(), spine.names)
    except Misread as misread:
        return _misread(request, study, spine, misread)
    canonical = url(key, question, spine.names)
    if from_a_form(request.query_params.multi_items()):
        return RedirectResponse(canonical, 303)  # a form's fields become the address that says the same
    asked = ask(model, question, doubt)
    if question.touched and asked.refusal is None:
        store.note_question(key, query(question.asked, spine.names), asked.said.text, asked.answer.cautions)
    return _answered(request, study, asked, job is not None and job.state == "running")


def _answered(request: Request, study: Study, asked: Asked, learning: bool) -> Response:
    names, question = asked.spine.names, asked.question
    address = partial(_address, study.key, asked.spine)
    return _page(
        request,
        "ask/ask.html",
        status_code=200 if asked.refusal is None else 422,
        study=study,
        asked=asked,
        question=question,
        address=address,
        view=ask_view,
        examples=[] if question.touched else examples(asked, study.sample, address),
        lanes=ask_lanes.lanes(asked, address),
        doubt_address=url(study.key, question, names, "ask/doubt"),
        print_address=url(study.key, question.asked, names, "answer"),
        learning=learning,
        standing=STANDING,
        unseen=UNSEEN,
    )


def _address(key: str, spine: Spine, question: Question) -> str:
    return url(key, question, spine.names)


def _misread(request: Request, study: Study, spine: Spine, misread: Misread) -> Response:
    """An address that is no question of this study: what is wrong with it, and what of it can be asked."""
    onward = url(study.key, misread.rest, spine.names)
    words = "Ask the rest of it" if misread.rest.touched else "Ask on the page"
    return _page(
        request,
        "refused.html",
        status_code=422,
        study=study,
        refusal=Refusal(misread.message, where=misread.where, do=misread.do),
        onward=(words, onward),
    )


def _page(request: Request, template: str, status_code: int, **context: object) -> Response:
    response: Response = request.app.state.templates.TemplateResponse(
        request, template, {"page": "Ask", "plain": plain, **context}, status_code=status_code
    )
    return response
