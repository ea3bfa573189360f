"""A column at a value, in words: shift work = nights or mixed; travel time 20 to under 45."""

from __future__ import annotations

from collections.abc import Sequence

from app.wording.parts import Clause, Part, name
from engine.network.nodes import Node
from engine.order import Better, better_levels

Words = list[Part | Clause]
YES = ("yes",)


def value(node: Node, levels: Sequence[str]) -> Words:
    """The column at these levels."""
    if _is_range(node, levels):
        return [name(node.name), Part(f" {either(levels)}")]
    return [name(f"{node.name} = {either(levels)}")]


def is_at(node: Node, levels: Sequence[str], verb: str = "is") -> Words:
    """The column is at these levels, as the verb of a sentence."""
    words = Part(either(levels)) if _is_range(node, levels) else name(either(levels))
    return [name(node.name), Part(f" {verb} "), words]


def subject(node: Node, levels: Sequence[str]) -> Words:
    """What moves: the bare column where a share of it can only be its yes, else the column at these levels."""
    return [name(node.name)] if is_yes(levels) else value(node, levels)


def is_yes(levels: Sequence[str]) -> bool:
    return tuple(level.casefold() for level in levels) == YES


def either(levels: Sequence[str]) -> str:
    """Levels one of which is held: nights or mixed."""
    return levels[0] if len(levels) == 1 else f"{', '.join(levels[:-1])} or {levels[-1]}"


def in_question(node: Node, better: Better | None, recorded: Sequence[float]) -> tuple[str, ...]:
    """The levels whose share answers the question.

    The better levels of an outcome; else yes, where the column has it; else the level most often recorded.
    better: of the outcome, None for another column.  recorded: (levels,) shares as recorded.
    """
    if found := better_levels(better, node.levels, node.has_blank):
        return found
    yes = yes_level(node)
    return (node.levels[max(range(len(recorded)), key=lambda place: recorded[place])] if yes is None else yes,)


def yes_level(node: Node) -> str | None:
    """The yes of a column that holds yes and no, and at most a blank besides."""
    real = node.levels[:-1] if node.has_blank else node.levels
    folded = {level.casefold(): level for level in real}
    return folded["yes"] if set(folded) == {"yes", "no"} else None


def _is_range(node: Node, levels: Sequence[str]) -> bool:
    blank = node.levels[-1] if node.has_blank else None
    return node.kind == "number" and blank not in levels
