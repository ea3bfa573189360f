"""What the Order page shows: lanes, rules, and what the order allows in words and counts."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

from app.pages import order_text
from app.store import Plan, Study
from app.wording.amounts import count, listing, plural, small_word
from engine.learning.search import check_widths
from engine.order import Order
from engine.records.spikes import own_reason
from engine.records.table import Column, Table
from engine.refusal import Refusal


@dataclass(frozen=True)
class Row:
    """A column in its lane. place: in the records' file order.  earlier, later: stages the buttons move it to."""

    place: int
    name: str
    told: str
    changeable: bool
    outcome: bool
    earlier: int | None
    later: int | None
    makes_stage: bool


@dataclass(frozen=True)
class Lane:
    """A stage. place: 0 the earliest.  allowed: links that may lead into it."""

    place: int
    name: str
    told: str
    rows: tuple[Row, ...]
    allowed: int


@dataclass(frozen=True)
class Rule:
    """A link insisted on or ruled out, as the page lists it. rule: "must" or "must not"."""

    rule: str
    place: int
    source: str
    target: str


@dataclass(frozen=True)
class OrderView:
    """The whole page. possible, allowed: counts of links.  too_wide: why search cannot be exact, or None."""

    lanes: tuple[Lane, ...]
    rules: tuple[Rule, ...]
    columns: tuple[tuple[int, str], ...]
    possible: str
    allowed: str
    ruled_out: str
    widest: int
    too_wide: Refusal | None
    text: str
    total: int
    outcomes: str
    changeable: str


def view(study: Study, table: Table) -> OrderView:
    """The page for `study`, whose plan is an order."""
    plan, order = study.plan, study.plan.order()
    pairs = [(source, target) for source in order.columns for target in order.columns if source != target]
    targets = [target for source, target in pairs if order.may_lead(source, target)]
    into = Counter(order.stage_of(target) for target in targets)
    places = {name: place for place, name in enumerate(table.columns)}
    lanes = tuple(_lane(plan, table, places, stage, into[stage]) for stage in range(len(plan.stages)))
    widest = max((len(columns) for _, columns in plan.stages), default=0)
    return OrderView(
        lanes=lanes,
        rules=_rules(plan),
        columns=tuple((places[name], name) for name in plan.columns),
        possible=count(len(pairs)),
        allowed=count(len(targets)),
        ruled_out=_ruled_out(order),
        widest=widest,
        too_wide=_too_wide(plan),
        text=order_text.write(plan.stages),
        total=len(plan.columns),
        outcomes=listing(tuple(plan.outcomes)),
        changeable=listing(plan.changeable),
    )


def next_step(study: Study) -> str:
    """What the page should offer: "learn" once there is an order, else "order"."""
    return "learn" if len([columns for _, columns in study.plan.stages if columns]) > 1 else "order"


def _lane(plan: Plan, table: Table, places: dict[str, int], stage: int, allowed: int) -> Lane:
    name, columns = plan.stages[stage]
    last = len(plan.stages) - 1
    rows = tuple(
        Row(
            place=places[column],
            name=column,
            told=_told(table.columns[column]),
            changeable=column in plan.changeable,
            outcome=column in plan.outcomes,
            earlier=stage - 1 if stage else None,
            later=stage + 1 if stage < last or len(columns) > 1 else None,
            makes_stage=stage == last,
        )
        for column in columns
    )
    return Lane(stage, name, _may_come_from(stage, last), rows, allowed)


def _may_come_from(stage: int, last: int) -> str:
    if last == 0 or stage == last:
        return "may come from any stage"
    if stage == 0:
        return "may come from its own stage"
    return "may come from 1 and 2" if stage == 1 else f"may come from 1 to {stage + 1}"


def _told(column: Column) -> str:
    levels = len(column.levels)
    if column.kind == "number":
        return "number" if own_reason(column) is None else f"number as {levels} {plural(levels, 'band')}"
    words = ", ".join(column.levels)
    if column.kind == "category" and len(words) <= 18:
        return words
    return f"grade, {levels} levels" if column.kind == "grade" else f"{levels} levels"


def _rules(plan: Plan) -> tuple[Rule, ...]:
    insisted = [Rule("must", place, *link) for place, link in enumerate(plan.insist)]
    return (*insisted, *(Rule("must not", place, *link) for place, link in enumerate(plan.rule_out)))


def _ruled_out(order: Order) -> str:
    """The second sentence of the headline: what is not allowed, and why."""
    backward = word = circle = 0
    for source in order.columns:
        for target in order.columns:
            if source == target or order.may_lead(source, target):
                continue
            if order.stage_of(source) > order.stage_of(target):
                backward += 1
            elif (source, target) in order.rule_out:
                word += 1
            else:
                circle += 1
    parts = []
    if backward:
        parts.append(f"{count(backward)} that would run backwards")
    if word:
        parts.append(f"{small_word(word)} by your word")
    if circle:
        parts.append(f"{small_word(circle)} that would close a circle")
    return f"It rules out {listing(parts)}." if parts else "It rules out none."


def _too_wide(plan: Plan) -> Refusal | None:
    try:
        check_widths([(name, len(columns)) for name, columns in plan.stages])
    except Refusal as refusal:
        return refusal
    return None
