"""A column at a value, in words: shift work = nights or mixed; travel time 20 to under 45 minutes."""

from __future__ import annotations

from collections.abc import Sequence

from app.question import By, Pin, Setting, To, Within
from app.wording.parts import Clause, Part, name
from app.wording.units import apart, band, behind
from engine.network.nodes import Node, Number
from engine.order import Better, better_levels
from engine.records.wording import figure

Words = list[Part | Clause]
YES = ("yes",)


def value(node: Node, pin: Pin) -> Words:
    """The column at these levels, or in this range."""
    if pin.value is None if isinstance(pin, Within) else _is_range(node, pin):
        return [name(node.name), Part(f" {held(node, pin)}")]
    return [name(f"{node.name} = {held(node, pin)}")]


def held(node: Node, pin: Pin) -> str:
    """What a pin sees: nights or mixed; 5 to under 12 hours; 7 hours."""
    if not isinstance(pin, Within):
        return band(either(pin), node.unit) if _is_range(node, pin) else either(pin)
    if pin.value is not None:
        return f"{figure(pin.value)}{behind(node.unit)}"
    return band(_range(pin), node.unit)


def _range(pin: Within) -> str:
    if pin.low is None or pin.high is None:
        return f"{figure(pin.low)} and over" if pin.low is not None else f"under {figure(pin.high or 0.0)}"
    return f"{figure(pin.low)} to under {figure(pin.high)}"


def set_to(node: Node, setting: Setting) -> str:
    """What a lever sets: yes; 12 hours; of a shift the amount, without its sign."""
    match setting:
        case To(number):
            return f"{figure(number)}{behind(node.unit)}"
        case By(amount):
            return apart(figure(abs(amount)), node.unit)
        case level:
            return level


def setting_words(node: Node, setting: Setting) -> str:
    """A lever after "set": to yes; to 12 hours; 2 hours higher."""
    if isinstance(setting, By):
        return f"{set_to(node, setting)} {'higher' if setting.amount > 0 else 'lower'}"
    return f"to {set_to(node, setting)}"


def had_before(setting: Setting) -> Pin | None:
    """The value that those have who had a lever's setting anyway; None for a shift, which nobody has."""
    match setting:
        case To(number):
            return Within(number, number)
        case By():
            return None
        case level:
            return (level,)


def is_at(node: Node, levels: Sequence[str], verb: str = "is") -> Words:
    """The column is at these levels, as the verb of a sentence."""
    words = Part(held(node, tuple(levels))) if _is_range(node, levels) else name(either(levels))
    return [name(node.name), Part(f" {verb} "), words]


def subject(node: Node, levels: Sequence[str]) -> Words:
    """What moves: the bare column where only its yes or its mean can be meant, else the column at these levels."""
    return [name(node.name)] if is_yes(levels) or not levels else value(node, tuple(levels))


def is_yes(levels: Sequence[str]) -> bool:
    return tuple(level.casefold() for level in levels) == YES


def either(levels: Sequence[str]) -> str:
    """Levels one of which is held: nights or mixed."""
    return levels[0] if len(levels) == 1 else f"{', '.join(levels[:-1])} or {levels[-1]}"


def in_question(node: Node, better: Better | None, recorded: Sequence[float]) -> tuple[str, ...]:
    """The levels whose share answers the question; none for a number, which its mean answers for.

    The better levels of an outcome; else yes, where the column has it; else the level most often recorded.
    better: of the outcome, None for another column.  recorded: (levels,) shares as recorded.
    """
    if isinstance(node, Number):
        return ()
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
