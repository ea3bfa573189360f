"""One answer on paper: the same address as on Ask, with all that the answer rests on overleaf."""

from __future__ import annotations

from fastapi import APIRouter, Request, Response

from app.address import Misread, parse
from app.pages import answer_view, ask_view
from app.pages.asking import ask, spine_of
from app.question import query, url
from app.store import Study
from engine.doubting import STANDING, UNSEEN
from engine.model import Model

router = APIRouter()


@router.get("/study/{key}/answer")
def answer_page(request: Request, key: str) -> Response:
    """The printable page. Raises Refusal for an address that asks nothing, or nothing that can be answered."""
    store = request.app.state.store
    study: Study = store.study(key)
    model: Model = store.model(key)
    spine = spine_of(model)
    try:
        question = parse(request.query_params.multi_items(), spine.names).asked
    except Misread as misread:
        onward = ("Go to Ask", url(key, misread.rest, spine.names))
        return _refused(request, study, misread, onward)
    asked = ask(model, question, doubt=True)
    back = url(key, question, spine.names)
    if asked.refusal is not None:
        return _refused(request, study, asked.refusal, ("Back to the question", back))
    through, others = answer_view.links(asked)
    asked_query = query(question, spine.names)
    response: Response = request.app.state.templates.TemplateResponse(
        request,
        "answer/answer.html",
        {
            "page": "Ask",
            "study": study,
            "asked": asked,
            "view": answer_view,
            "top": ask_view,
            "through": through,
            "others": others,
            "data": answer_view.data(asked, study, store.table(key)),
            "back": back,
            "asked_address": f"ask?{asked_query}" if asked_query else "ask",
            "standing": STANDING,
            "unseen": UNSEEN,
        },
    )
    return response


@router.get("/study/{key}/answer.css")
def answer_foot(request: Request, key: str) -> Response:
    """The foot of the printed page, which only a stylesheet can write: study, kind, date, page of pages."""
    study: Study = request.app.state.store.study(key)
    words = _css_text(f"{study.name}, one answer, {answer_view.today()}")
    look = "font: 9pt sans-serif; color: #50555C"
    text = (
        f'@page answer {{ @bottom-left {{ content: "{words}"; {look}; }} '
        f'@bottom-right {{ content: counter(page) " of " counter(pages); {look}; }} }}\nbody {{ page: answer; }}\n'
    )
    return Response(text, media_type="text/css", headers={"Cache-Control": "no-store"})


def _css_text(text: str) -> str:
    """Text inside a CSS string: everything but plain letters and digits is written as its number, six digits long."""
    return "".join(each if each.isascii() and each.isalnum() else f"\\{ord(each):06x}" for each in text)


def _refused(request: Request, study: Study, refusal: object, onward: tuple[str, str]) -> Response:
    response: Response = request.app.state.templates.TemplateResponse(
        request,
        "refused.html",
        {"page": "Ask", "study": study, "refusal": refusal, "onward": onward},
        status_code=422,
    )
    return response
