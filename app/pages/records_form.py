"""From the form of one column to choices and a plan."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TypeVar

from app.pages.records_view import KINDS, Typed, grade_levels, saved
from app.store import Choices, Plan, Study
from engine.order import Better, Direction
from engine.records.bands import checked_cuts
from engine.records.table import Column
from engine.records.units import checked_unit
from engine.refusal import Refusal

Kept = TypeVar("Kept")


@dataclass(frozen=True)
class Change:
    """What a form asks for."""

    choices: Choices
    plan: Plan


def change(study: Study, column: Column, typed: Typed) -> Change:
    """The study's choices and plan with what was typed for `column`.

    What still reads as before stays guessed. Raises Refusal for cuts that are no numbers, a unit that is no short text
    and grades that are no order.
    """
    before = saved(study, column)
    choices = study.choices
    if typed.kind not in KINDS:
        raise Refusal(
            f"“{typed.kind}” is not a kind of column.", where=column.name, do=f"Choose among {', '.join(KINDS)}."
        )
    if typed.kind != before.kind:
        choices = replace(choices, kinds={**choices.kinds, column.name: typed.kind})
        choices = replace(choices, bands=_without(choices.bands, column.name))
        choices = replace(choices, grades=_without(choices.grades, column.name))
        choices = replace(choices, units=_without(choices.units, column.name))
    if typed.blank != before.blank:
        choices = replace(choices, blanks={**choices.blanks, column.name: typed.blank})
    if typed.kind == before.kind == "number" and _words(typed.cuts) != _words(before.cuts):
        choices = replace(choices, bands=_without(choices.bands, column.name))
        if cuts := read_cuts(typed.cuts, column.name):
            choices = replace(choices, bands={**choices.bands, column.name: cuts})
    if typed.kind == before.kind == "number":
        unit = checked_unit(column.name, typed.unit)
        stated = {column.name: unit} if unit else {}
        choices = replace(choices, units={**_without(choices.units, column.name), **stated})
    if typed.kind == before.kind == "grade" and _lines(typed.grades) != _lines(before.grades):
        grades = read_grades(typed.grades, column)
        choices = replace(choices, grades={**choices.grades, column.name: grades})
    return Change(choices, _marked(study.plan, column, typed))


def moved(grades: str, step: str) -> str:
    """The typed grades with one moved: `step` is "3 up" or "3 down"."""
    lines = _lines(grades)
    place, _, way = step.partition(" ")
    places = [str(each) for each in range(len(lines))]
    if place not in places or way not in ("up", "down"):
        return grades
    here = places.index(place)
    there = here + (-1 if way == "up" else 1)
    if 0 <= there < len(lines):
        lines[here], lines[there] = lines[there], lines[here]
    return "\n".join(lines)


def read_cuts(text: str, name: str) -> tuple[float, ...]:
    """Cuts as typed, between commas, semicolons or spaces. Raises Refusal for what is no number."""
    cuts = []
    for word in _words(text):
        try:
            cut = float(word.replace("−", "-"))
        except ValueError:
            cut = math.nan
        if not math.isfinite(cut):
            raise Refusal(
                f"“{word}” among the cuts of “{name}” is not a number.",
                where=name,
                do="Type the cuts as numbers with commas between them, such as 20, 45.",
            )
        cuts.append(cut)
    return checked_cuts(name, cuts)


def read_grades(text: str, column: Column) -> tuple[str, ...]:
    """Grades as typed, one a line, the lowest first. Raises Refusal unless they are the column's own levels."""
    own = {level.strip(): level for level in grade_levels(column)}
    lines = _lines(text)
    for line in lines:
        if line not in own:
            raise Refusal(
                f"“{line}” is not a level of “{column.name}”.",
                where=column.name,
                do=f"Type its levels one a line, the lowest first: {', '.join(own)}.",
            )
        if lines.count(line) > 1:
            raise Refusal(f"“{line}” stands there twice.", where=column.name, do="Type each level once.")
    if missing := [level for level in own if level not in lines]:
        raise Refusal(
            f"The order of “{column.name}” leaves out {', '.join(f'“{level}”' for level in missing)}.",
            where=column.name,
            do="Give every level its place.",
        )
    return tuple(own[line] for line in lines)


def _marked(plan: Plan, column: Column, typed: Typed) -> Plan:
    name = column.name
    changeable = tuple(each for each in plan.changeable if each != name)
    if typed.changeable:
        changeable = plan.changeable if name in plan.changeable else (*changeable, name)
    outcomes = dict(plan.outcomes)
    better = _better(column, typed)
    if better is None:
        outcomes.pop(name, None)
    else:
        outcomes[name] = better
    return replace(plan, changeable=changeable, outcomes=outcomes)


def _better(column: Column, typed: Typed) -> Better | None:
    if typed.direction:
        try:
            return Direction(typed.direction)
        except ValueError:
            raise Refusal(f"“{typed.direction}” is neither more nor less.", where=column.name) from None
    chosen = tuple(level for place, level in enumerate(column.levels) if place in typed.better)
    if chosen and len(chosen) == len(column.levels):
        raise Refusal(
            f"Every level of “{column.name}” is ticked as better, so nothing could be worse.",
            where=column.name,
            do="Leave at least one level unticked.",
        )
    return chosen or None


def _without(kept: Mapping[str, Kept], name: str) -> dict[str, Kept]:
    return {key: value for key, value in kept.items() if key != name}


def _words(text: str) -> list[str]:
    return [word for word in re.split(r"[,;\s]+", text) if word]


def _lines(text: str) -> list[str]:
    return [line.strip() for line in text.splitlines() if line.strip()]
