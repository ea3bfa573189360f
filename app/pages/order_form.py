"""What each button of the Order page does to a plan."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from app.store import Plan
from app.store.values import StagePlan
from engine.order import Link
from engine.refusal import Refusal

AGAIN = "Open the Order page again; it may have changed in another tab."


def named(plan: Plan, names: Sequence[str]) -> Plan:
    """The plan with its stages called `names`; as it was when there are more or fewer names than stages."""
    if len(names) != len(plan.stages):
        return plan
    stages = tuple((" ".join(typed.split()), columns) for typed, (_, columns) in zip(names, plan.stages, strict=True))
    return replace(plan, stages=stages)


def moved(plan: Plan, column: str, to: int) -> Plan:
    """The plan with `column` in the stage at `to`; one past the last makes a new stage."""
    if column not in plan.columns:
        raise Refusal(f"No stage holds the column “{column}”.", where=column, do=AGAIN)
    if not 0 <= to <= len(plan.stages):
        raise Refusal("There is no such stage.", where=str(to), do=AGAIN)
    stages = list(plan.stages) if to < len(plan.stages) else [*plan.stages, (free_name(plan.stages), ())]
    for place, (name, columns) in enumerate(stages):
        if place == to:
            if column not in columns:
                stages[place] = (name, (*columns, column))
        elif column in columns:
            stages[place] = (name, tuple(each for each in columns if each != column))
    return replace(plan, stages=tuple(stages))


def stage_added(plan: Plan) -> Plan:
    """The plan with an empty stage at the end."""
    return replace(plan, stages=(*plan.stages, (free_name(plan.stages), ())))


def stage_taken_out(plan: Plan, place: int) -> Plan:
    """The plan without its stage at `place`. Raises Refusal when columns stand in it."""
    if not 0 <= place < len(plan.stages):
        raise Refusal("There is no such stage.", where=str(place), do=AGAIN)
    name, columns = plan.stages[place]
    if columns:
        raise Refusal(f"The stage {name} still holds columns.", where=name, do="Move them out first.")
    return replace(plan, stages=(*plan.stages[:place], *plan.stages[place + 1 :]))


def ruled(plan: Plan, rule: str, source: str, target: str) -> Plan:
    """The plan with a link insisted on (rule "must") or ruled out ("must not"). The order judges it."""
    if source == target:
        raise Refusal(f"“{source}” cannot lead to itself.", where=source, do="Choose two columns.")
    if rule == "must":
        return replace(plan, insist=(*plan.insist, (source, target)))
    if rule == "must not":
        return replace(plan, rule_out=(*plan.rule_out, (source, target)))
    raise Refusal("A link must or must not be there.", where=rule, do=AGAIN)


def rule_taken_out(plan: Plan, rule: str, place: int) -> Plan:
    """The plan without the link at `place` among those insisted on or ruled out."""
    links = plan.insist if rule == "must" else plan.rule_out
    if not 0 <= place < len(links):
        raise Refusal("That link is not there any more.", where=str(place), do=AGAIN)
    left: tuple[Link, ...] = (*links[:place], *links[place + 1 :])
    return replace(plan, insist=left) if rule == "must" else replace(plan, rule_out=left)


def free_name(stages: Sequence[StagePlan]) -> str:
    """A name for one more stage that no other stage has."""
    taken = {name for name, _ in stages}
    number = len(stages) + 1
    while f"Stage {number}" in taken:
        number += 1
    return f"Stage {number}"
