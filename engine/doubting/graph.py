"""Columns, the links between them, and the unrecorded causes that two of them share."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

from engine.order import Link
from engine.records.wording import listing
from engine.refusal import Refusal, quoted

Columns = frozenset[str]


@dataclass(frozen=True)
class Graph:
    """An acyclic graph of links, and of pairs that share a cause which is in no column (Richardson 2003 (m)).

    columns: parents before children.  links: (source, target).  pairs: of two columns each.  Made by `graph`.
    """

    columns: tuple[str, ...]
    links: frozenset[Link]
    pairs: frozenset[Columns]

    def among(self, kept: Collection[str]) -> Graph:
        """The part of the graph between some of its columns."""
        return Graph(
            tuple(column for column in self.columns if column in kept),
            frozenset(link for link in self.links if link[0] in kept and link[1] in kept),
            frozenset(pair for pair in self.pairs if all(column in kept for column in pair)),
        )

    def without_links_from(self, columns: Collection[str]) -> Graph:
        return Graph(self.columns, frozenset(link for link in self.links if link[0] not in columns), self.pairs)

    def sorted(self, columns: Collection[str]) -> tuple[str, ...]:
        """Some of its columns, parents before children."""
        return tuple(column for column in self.columns if column in columns)

    def before(self, column: str) -> tuple[str, ...]:
        return self.columns[: self.columns.index(column)]

    def parents(self, columns: Collection[str]) -> Columns:
        """Everything with a link to one of `columns`, which may be one of them."""
        return frozenset(source for source, target in self.links if target in columns)

    def ancestors(self, columns: Iterable[str]) -> Columns:
        """`columns` themselves, and all that leads to them."""
        return _reached(columns, {(target, source) for source, target in self.links})

    def descendants(self, columns: Iterable[str]) -> Columns:
        """`columns` themselves, and all that they lead to."""
        return _reached(columns, self.links)

    @cached_property
    def districts(self) -> tuple[Columns, ...]:
        """The columns in parts that are tied by unrecorded causes, from column to column (Tian & Pearl 2002)."""
        tied = {pair for pair in self.pairs} | {frozenset((column,)) for column in self.columns}
        both = {(one, other) for pair in tied for one in pair for other in pair}
        found: list[Columns] = []
        for column in self.columns:
            if not any(column in part for part in found):
                found.append(_reached([column], both))
        return tuple(found)

    def district(self, column: str) -> Columns:
        """The part that holds a column."""
        return next(part for part in self.districts if column in part)

    def apart(self, left: Columns, right: Columns, given: Columns) -> bool:
        """Whether the graph alone makes `left` and `right` independent among cases alike in `given`.

        By the moral graph of what leads to them, unrecorded causes as well (Lauritzen, Dawid, Larsen & Leimer 1990).
        """
        part = self.among(self.ancestors(left | right | given))
        families: list[set[str]] = [{column, *part.parents([column])} for column in part.columns]
        causes = [(f"\x00{number}", pair) for number, pair in enumerate(sorted(map(sorted, part.pairs)))]
        for cause, pair in causes:  # what drives two columns is a parent of both
            for column in pair:
                families[part.columns.index(column)].add(cause)
        married = {(one, other) for family in families for one in family - given for other in family - given}
        return not _reached(left - given, married) & (right - given)


def graph(columns: Sequence[str], links: Iterable[Link], pairs: Iterable[Collection[str]] = ()) -> Graph:
    """Check and sort a graph, parents before children, otherwise in the sequence given.

    Raises Refusal for links in a circle.
    """
    given = frozenset(links)
    done: list[str] = []
    while len(done) < len(columns):
        waiting = [column for column in columns if column not in done]
        ready = (column for column in waiting if not any(t == column and s not in done for s, t in given))
        found = next(ready, None)
        if found is None:
            raise Refusal(
                f"The links run in a circle among {listing([quoted(column) for column in waiting])}.",
                where=waiting[0],
                do="Take out or turn round one of these links.",
            )
        done.append(found)
    return Graph(tuple(done), given, frozenset(frozenset(pair) for pair in pairs))


def _reached(start: Iterable[str], steps: Collection[tuple[str, str]]) -> Columns:
    onward: dict[str, list[str]] = {}
    for source, target in steps:
        onward.setdefault(source, []).append(target)
    found, ahead = set(start), list(start)
    while ahead:
        for column in onward.get(ahead.pop(), ()):
            if column not in found:
                found.add(column)
                ahead.append(column)
    return frozenset(found)
