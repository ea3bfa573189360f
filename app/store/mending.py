"""The one place where a plan follows the columns: what is left out leaves it, what is brought back joins it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from app.store.values import Plan
from engine.order import Better, Direction
from engine.records.table import Column, Table
from engine.refusal import Refusal

FIRST_STAGE = "Everything"


def usable(table: Table) -> tuple[str, ...]:
    """The columns that a model can be learned from, in file order."""
    return tuple(name for name, column in table.columns.items() if column.used)


def first_plan(table: Table) -> Plan:
    """One stage with every usable column; nothing marked."""
    return Plan(stages=((FIRST_STAGE, usable(table)),))


def mend(plan: Plan, table: Table) -> tuple[Plan, tuple[str, ...]]:
    """`plan` made to fit the columns of `table`, and a sentence for everything that this changed."""
    holds = set(usable(table))
    said: list[str] = []
    stages = []
    for name, columns in plan.stages:
        stages.append((name, tuple(column for column in columns if column in holds)))
        said += [
            f"“{column}” is {_taken_as(table, column)} now, so it was taken out of the stage {name}."
            for column in columns
            if column not in holds
        ]
    joining = [column for column in usable(table) if column not in plan.columns]
    if joining:
        if not stages:
            stages = [(FIRST_STAGE, ())]
        last, columns = stages[-1]
        stages[-1] = (last, (*columns, *joining))
        said += [f"“{column}” was put into the stage {last}; move it where it belongs." for column in joining]
    insist, rule_out = (
        tuple(link for link in links if holds.issuperset(link)) for links in (plan.insist, plan.rule_out)
    )
    for kind, links, kept in (("insisted on", plan.insist, insist), ("ruled out", plan.rule_out, rule_out)):
        said += [f"The link you {kind} from “{a}” to “{b}” went with it." for a, b in links if (a, b) not in kept]
    changeable = tuple(name for name in plan.changeable if name in holds)
    said += [f"“{name}” is no longer marked as changeable." for name in plan.changeable if name not in holds]
    outcomes = _outcomes_that_fit(plan.outcomes, table)
    for name, wanted in plan.outcomes.items():
        if name not in outcomes:
            said.append(f"“{name}” is no longer marked as an outcome: what counted as better is gone.")
        elif outcomes[name] != wanted:
            said.append(f"Some levels of “{name}” that counted as better are gone; look at its mark again.")
    mended = replace(
        plan, stages=tuple(stages), insist=insist, rule_out=rule_out, changeable=changeable, outcomes=outcomes
    )
    return mended, tuple(said)


def check(plan: Plan, table: Table) -> None:
    """Raise Refusal unless `plan` is an order over exactly the usable columns of `table`."""
    names = [name for name, _ in plan.stages]
    for name in names:
        if not name.strip():
            raise Refusal("A stage has no name.", where="stages", do="Give every stage a name.")
        if names.count(name) > 1:
            raise Refusal(f"Two stages are called {name}.", where=name, do="Give each stage a name of its own.")
    for column in plan.columns:
        if column not in table.columns:
            raise Refusal(f"The records have no column “{column}”.", where=column, do="Take it out of the order.")
        if not table.columns[column].used:
            raise Refusal(
                f"The column “{column}” is {_taken_as(table, column)}, so no stage can hold it.",
                where=column,
                do="Choose another kind for it on the Records page first.",
            )
    missing = [column for column in usable(table) if column not in plan.columns]
    if missing:
        listed = ", ".join(f"“{column}”" for column in missing)
        raise Refusal(
            f"No stage holds {listed}.",
            where="stages",
            do="Put every column into a stage, or leave it out on the Records page.",
        )
    plan.order()
    fitting = _outcomes_that_fit(plan.outcomes, table)
    for name, wanted in plan.outcomes.items():
        if fitting.get(name) != wanted:
            raise Refusal(
                f"What counts as better for “{name}” does not fit its levels.",
                where=name,
                do=f"Choose among {', '.join(table.columns[name].levels)}.",
            )


def _taken_as(table: Table, name: str) -> str:
    """What a column is that no stage can hold."""
    kind = table.columns[name].kind if name in table.columns else "left out"
    return kind if kind == "left out" else f"the {kind}"


def _outcomes_that_fit(outcomes: Mapping[str, Better], table: Table) -> dict[str, Better]:
    fitting: dict[str, Better] = {}
    for name, wanted in outcomes.items():
        column = table.columns.get(name)
        if column is None or not column.used:
            continue
        kept = _better_that_fits(wanted, column)
        if kept is not None:
            fitting[name] = kept
    return fitting


def _better_that_fits(wanted: Better, column: Column) -> Better | None:
    if isinstance(wanted, Direction):
        return wanted if column.kind in ("number", "grade") else None
    return tuple(level for level in wanted if level in column.levels) or None
