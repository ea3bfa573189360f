"""Parts of a sentence about a network: words, and names that are shown in another face."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal

from engine.network.nodes import Node
from engine.records.bands import band_levels

NAMED = 3  # levels of a column named one by one


@dataclass(frozen=True)
class Said:
    """A few words of one style. name: a column or a level.  figure: a share, a mean, a change."""

    text: str
    style: Literal["plain", "name", "figure"] = "plain"


Words = tuple[Said, ...]


def name(text: str) -> Said:
    return Said(text, "name")


def figure(share: float) -> Said:
    """A share, 0 to 1, as cases in a hundred."""
    return Said(in_hundred(share), "figure")


def plain(words: Iterable[Said]) -> str:
    """The words as text."""
    return "".join(part.text for part in words)


def series(items: Sequence[Iterable[Said]], last: str, between: str = ", ") -> Words:
    """The items in a row: a, b and c."""
    found: list[Said] = []
    for place, item in enumerate(items):
        if place:
            found.append(Said(last if place == len(items) - 1 else between))
        found += item
    return tuple(found)


def in_hundred(share: float) -> str:
    """A share, 0 to 1, as cases in a hundred; what is not quite none or all is said so."""
    if share <= 1e-9:
        return "none"
    if share >= 1 - 1e-9:
        return "all"
    if share < 0.01:
        return "under 1 in 100"
    return "over 99 in 100" if share > 0.99 else f"{int(100 * share + 0.5 + 1e-9)} in 100"


def these(node: Node, positions: Sequence[int]) -> Words:
    """One or several levels of a column: nights or days; upper or above; 20 and over; anything but nights."""
    last = len(node.levels) - 1
    real = [place for place in positions if not (node.has_blank and place == last)]
    blank = [[name(node.levels[last])]] if len(real) < len(positions) else []
    graded = last + 1 - int(node.has_blank)
    told = _run(node, real, graded)
    if told is not None:
        return series([told, *blank], " or " if told[-1].style == "name" else ", or ")
    missing = [place for place in range(len(node.levels)) if place not in positions]
    if len(positions) > NAMED:
        if 0 < len(missing) < NAMED:
            return (Said("anything but "), *series([[name(node.levels[place])] for place in missing], " or "))
        shown = [[name(node.levels[place])] for place in positions[: NAMED - 1]]
        return series([*shown, [Said(f"one of {len(positions) - len(shown)} others")]], " or ")
    return series([[name(node.levels[place])] for place in positions], " or ")


def _run(node: Node, real: Sequence[int], graded: int) -> Words | None:
    """Neighbouring levels of an ordered column told as one; None where that cannot be said."""
    if node.kind not in ("grade", "number") or not 2 <= len(real) < graded or real[-1] - real[0] != len(real) - 1:
        return None
    low, high = real[0], real[-1]
    if node.kind == "number" and len(node.cuts) == graded - 1:
        ends = [node.cuts[place] for place in (low - 1, high) if 0 <= place < len(node.cuts)]
        return (name(band_levels(ends)[1 if low else 0]),)
    if low and high < graded - 1:
        return (Said("from "), name(node.levels[low]), Said(" to "), name(node.levels[high]))
    level = node.levels[low if low else high]
    pause = "," if " or " in level else ""  # one or two, or above
    return (name(level), Said(f"{pause} or above" if low else f"{pause} or below"))
