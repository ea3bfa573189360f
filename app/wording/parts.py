"""A sentence as parts: the page sets them in their faces, titles and the store take the same parts as plain text."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal

Style = Literal["plain", "name", "recorded", "among", "set", "withheld"]


@dataclass(frozen=True)
class Part:
    """Words of one style.

    name: a column or level, italic in serif sentences.  recorded, among, set: a figure of that world.
    withheld: stands where a figure may not.
    """

    text: str
    style: Style = "plain"


@dataclass(frozen=True)
class Clause:
    """A part of the question that a person put there: "watch", or a pin or a lever that can be taken out again."""

    kind: Literal["watch", "pin", "set"]
    column: str
    parts: tuple[Part, ...]

    @property
    def text(self) -> str:
        return "".join(part.text for part in self.parts)


def plain(sentence: Iterable[Part | Clause]) -> str:
    """The sentence as text."""
    return "".join(part.text for part in sentence)


def say(*parts: str | Part | Clause | Iterable[Part | Clause]) -> list[Part | Clause]:
    """Parts in a row; bare text is plain, empty text is left out."""
    found: list[Part | Clause] = []
    for part in parts:
        if isinstance(part, str):
            found += [Part(part)] if part else []
        elif isinstance(part, Part | Clause):
            found.append(part)
        else:
            found += part
    return found


def name(text: str) -> Part:
    return Part(text, "name")


def series(items: Sequence[Iterable[Part | Clause] | Part | Clause], last: str = " and ") -> list[Part | Clause]:
    """a, b and c."""
    found: list[Part | Clause] = []
    for place, item in enumerate(items):
        if place:
            found.append(Part(last if place == len(items) - 1 else ", "))
        found += [item] if isinstance(item, Part | Clause) else item
    return found
