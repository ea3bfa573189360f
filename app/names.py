"""Readable names for addresses: a word for each column and each level, unique and the same on every page."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection, Iterable, Sequence
from urllib.parse import quote

from engine.refusal import Refusal

LONGEST = 40  # letters of a name that go into an address


class Names:
    """Readable names for the addresses of one model's columns and levels.

    columns: (name, levels) in the order of the study.  numbers: those of them learned as numbers.
    """

    def __init__(self, columns: Sequence[tuple[str, Sequence[str]]], numbers: Collection[str] = ()) -> None:
        self.columns = tuple(name for name, _ in columns)
        self.numbers = frozenset(numbers)
        self.levels = {name: tuple(levels) for name, levels in columns}
        self._places = {name: place for place, name in enumerate(self.columns)}
        self.slugs = dict(zip(self.columns, slugs(self.columns, "column"), strict=True))
        self.quoted = {name: quote(slug) for name, slug in self.slugs.items()}
        self._named = {slug: name for name, slug in self.slugs.items()}
        self.level_slugs = {
            name: dict(zip(levels, slugs(levels, "level"), strict=True)) for name, levels in self.levels.items()
        }
        self.quoted_levels = {
            name: {level: quote(slug) for level, slug in found.items()} for name, found in self.level_slugs.items()
        }
        self._levels_named = {
            name: {slug: level for level, slug in found.items()} for name, found in self.level_slugs.items()
        }

    def ordered(self, columns: Iterable[str]) -> list[str]:
        """These columns in the order of the study."""
        return sorted(columns, key=self._places.__getitem__)

    def column(self, slug: str) -> str:
        """Raises Refusal when no column has that name."""
        if not slug:
            raise Refusal("The address names no column.", where=slug, do="Pick a column on the page.")
        if slug not in self._named:
            raise Refusal(
                f"There is no column “{slug}” in this model.",
                where=slug,
                do="It may have been left out or renamed since this address was written.",
            )
        return self._named[slug]

    def number(self, slug: str) -> str:
        """A column that is a number. Raises Refusal when no number has that name."""
        column = self.column(slug)
        if column not in self.numbers:
            raise Refusal(
                f"{column} is no number here, so it has levels and no values.",
                where=slug,
                do=f"Its levels are {', '.join(list(self.levels[column])[:12])}.",
            )
        return column

    def level(self, column: str, slug: str) -> str:
        """Raises Refusal when the column has no such level."""
        found = self._levels_named[column]
        if slug not in found:
            raise Refusal(
                f"The column {column} has no level “{slug}”.",
                where=slug,
                do=f"Its levels are {', '.join(list(self.levels[column])[:12])}.",
            )
        return found[slug]


def slugs(names: Sequence[str], nameless: str) -> list[str]:
    """A readable word for each name: small letters, digits and hyphens, unique among them."""
    taken: set[str] = set()
    found = []
    for name in names:
        wanted = _slug(name) or nameless
        slug, number = wanted, 1
        while slug in taken:
            number += 1
            slug = f"{wanted}-{number}"
        taken.add(slug)
        found.append(slug)
    return found


def _slug(name: str) -> str:
    bare = "".join(each for each in unicodedata.normalize("NFKD", name) if not unicodedata.combining(each))
    words = "".join(each if each.isalnum() else " " for each in bare.lower()).split()
    return "-".join(words)[:LONGEST].strip("-")
