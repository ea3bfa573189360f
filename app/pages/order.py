"""Order: the stages, what may influence what, stated without dragging."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Annotated

from fastapi import APIRouter, Form, Request, Response
from fastapi.responses import RedirectResponse

from app.pages import order_form, order_text, order_view
from engine.records.table import Table
from engine.refusal import Refusal

router = APIRouter()


@dataclass(frozen=True)
class Typed:
    """What was typed into the forms, kept when it is refused. Columns are places in file order."""

    names: tuple[str, ...] = ()
    text: str = ""
    rule: str = "must not"
    source: int = -1
    target: int = -1


@router.get("/study/{key}/order")
def show(request: Request, key: str) -> Response:
    return _page(request, key)


@router.post("/study/{key}/order")
def save(
    request: Request,
    key: str,
    do: Annotated[str, Form()],
    name: Annotated[list[str] | None, Form()] = None,
    column: Annotated[int, Form()] = -1,
    to: Annotated[int, Form()] = -1,
    text: Annotated[str, Form()] = "",
    rule: Annotated[str, Form()] = "must not",
    source: Annotated[int, Form()] = -1,
    target: Annotated[int, Form()] = -1,
) -> Response:
    """One button of the page; the names of the stages are saved with it.

    do: "names", "move" (column, to), "place COLUMN STAGE", "add", "remove STAGE", "type" (text), "rule" (rule, source,
    target) or "free must PLACE" and "free must-not PLACE".
    """
    store = request.app.state.store
    study, table = store.study(key), store.table(key)
    typed = Typed(tuple(name or ()), text, rule, source, target)
    try:
        plan = order_form.named(study.plan, typed.names)
        match do.split(" "):
            case ["names"]:
                pass
            case ["move"]:
                plan = order_form.moved(plan, _column(table, column), to)
            case ["place", moved, stage]:
                plan = order_form.moved(plan, _column(table, _whole(moved)), _whole(stage))
            case ["add"]:
                plan = order_form.stage_added(plan)
            case ["remove", stage]:
                plan = order_form.stage_taken_out(plan, _whole(stage))
            case ["type"]:
                out = [name for name in table.columns if not table.columns[name].used]
                plan = replace(plan, stages=order_text.read(text, study.plan.columns, out))
            case ["rule"]:
                plan = order_form.ruled(plan, rule, _column(table, source), _column(table, target))
            case ["free", which, place]:
                plan = order_form.rule_taken_out(plan, "must" if which == "must" else "must not", _whole(place))
            case _:
                raise Refusal("That button is not known.", where=do, do=order_form.AGAIN)
        store.save_plan(key, plan)
    except Refusal as refusal:
        return _page(request, key, typed, refusal, do, 422)
    return RedirectResponse(f"/study/{key}/order", status_code=303)


def _column(table: Table, place: int) -> str:
    names = tuple(table.columns)
    if not 0 <= place < len(names):
        raise Refusal("No column was chosen.", where="column", do="Choose a column.")
    return names[place]


def _whole(text: str) -> int:
    return int(text) if text.isascii() and text.isdigit() and len(text) < 10 else -1


def _page(
    request: Request,
    key: str,
    typed: Typed | None = None,
    refusal: Refusal | None = None,
    do: str = "",
    status: int = 200,
) -> Response:
    store = request.app.state.store
    study, table = store.study(key), store.table(key)
    view = order_view.view(study, table)
    typed = typed or Typed()
    context = {
        "page": "Order",
        "study": study,
        "view": view,
        "names": typed.names if len(typed.names) == len(view.lanes) else tuple(lane.name for lane in view.lanes),
        "text": typed.text or view.text,
        "typed": typed,
        "refusal": refusal,
        "refused_text": refusal is not None and do == "type",
        "next_step": order_view.next_step(study),
        "running": _running(request, key),
    }
    page: Response = request.app.state.templates.TemplateResponse(request, "order.html", context, status)
    return page


def _running(request: Request, key: str) -> bool:
    state = request.app.state.jobs.state(key)
    return state is not None and state.state == "running"
