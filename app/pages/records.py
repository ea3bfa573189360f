"""Records: what the columns are, what a blank means, what is an outcome and what can be changed."""

from __future__ import annotations

from typing import Annotated
from urllib.parse import urlencode

from fastapi import APIRouter, Form, Request, Response
from fastapi.responses import RedirectResponse

from app.pages import records_form, records_view
from app.pages.records_view import SHOWS, Typed
from engine.records.units import LONGEST
from engine.refusal import Refusal

router = APIRouter()


@router.get("/study/{key}/records")
def show(request: Request, key: str, find: str = "", show: str = "look", open: int | None = None) -> Response:
    """The page. find, show: which cards.  open: the place of the card whose form stands open."""
    return _page(request, key, find, show, open)


@router.post("/study/{key}/records")
def save(
    request: Request,
    key: str,
    column: Annotated[int, Form()],
    mark: Annotated[str, Form()],
    kind: Annotated[str, Form()],
    blank: Annotated[str | None, Form()] = None,
    cuts: Annotated[str, Form()] = "",
    unit: Annotated[str, Form()] = "",
    grades: Annotated[str | None, Form()] = None,
    changeable: Annotated[bool, Form()] = False,
    direction: Annotated[str, Form()] = "",
    better: Annotated[list[int] | None, Form()] = None,
    move: Annotated[str, Form()] = "",
    find: Annotated[str, Form()] = "",
    show: Annotated[str, Form()] = "look",
) -> Response:
    """Save the form of one column; on refusal the page again with what was typed."""
    store = request.app.state.store
    study, table = store.study(key), store.table(key)
    names = tuple(table.columns)
    if not 0 <= column < len(names):
        raise Refusal("These records have no such column.", where=str(column), do="Open the Records page again.")
    there = table.columns[names[column]]
    before = records_view.saved(study, there)
    typed = Typed(
        kind=kind,
        blank=before.blank if blank is None else blank,
        cuts=cuts,
        unit=unit,
        grades=records_form.moved(before.grades if grades is None else grades, move),
        changeable=changeable,
        direction=direction,
        better=frozenset(better or ()),
    )
    try:
        if mark != records_view.mark(there):
            raise Refusal(
                f"“{there.name}” was changed meanwhile, in another tab perhaps.",
                where=there.name,
                do="Look at it again as it is now, and save what you still want.",
            )
        wanted = records_form.change(study, there, typed)
        store.save(key, choices=wanted.choices, plan=wanted.plan)
    except Refusal as refusal:
        return _page(request, key, find, show, column, {column: (typed, refusal)}, 422)
    query = {name: value for name, value in {"find": find, "show": show if show != "look" else ""}.items() if value}
    if move:
        query["open"] = str(column)
    address = f"/study/{key}/records" + (f"?{urlencode(query)}" if query else "")
    return RedirectResponse(f"{address}#column-{column}", status_code=303)


def _page(
    request: Request,
    key: str,
    find: str,
    show: str,
    opened: int | None,
    refused: dict[int, tuple[Typed, Refusal]] | None = None,
    status: int = 200,
) -> Response:
    store = request.app.state.store
    study, table = store.study(key), store.table(key)
    show = show if show in dict(SHOWS) else "look"
    context = {
        "page": "Records",
        "study": study,
        "table": table,
        "view": records_view.view(study, table, find, show, opened, refused),
        "kinds": records_view.KINDS,
        "shows": SHOWS,
        "longest_unit": LONGEST,
        "blank_kept": records_view.BLANK_KEPT,
        "refused": next(iter(refused.values()))[1] if refused else None,
    }
    page: Response = request.app.state.templates.TemplateResponse(request, "records.html", context, status)
    return page
