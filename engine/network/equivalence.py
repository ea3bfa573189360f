"""Which links could as well run the other way: Markov equivalence within an order. Pure graph work, no records."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from itertools import combinations

Link = tuple[str, str]


def unsettled_links(links: Iterable[Link], may_lead: Callable[[str, str], bool]) -> frozenset[Link]:
    """Links that some allowed graph, Markov equivalent to this one, has the other way round.

    links: the (source, target) pairs of an acyclic graph that `may_lead` allows.
    Two graphs are equivalent when they have the same adjacent pairs and the same colliders of non-adjacent parents
    (Verma & Pearl 1990). Allowed directions are background knowledge; Meek's four rules complete it (Meek 1995).
    """
    pattern = _Pattern(links)
    pattern.settle_colliders()
    for source, target in list(pattern.open):
        if not may_lead(target, source):
            pattern.direct(source, target)
    pattern.complete()
    return frozenset(link for link in pattern.links if link in pattern.open)


class _Pattern:
    """A graph of which some links have their direction and some do not (yet)."""

    def __init__(self, links: Iterable[Link]) -> None:
        self.links = tuple(dict.fromkeys(links))
        self.open = {pair for source, target in self.links for pair in ((source, target), (target, source))}
        self.beside: dict[str, set[str]] = {}
        for source, target in self.links:
            self.beside.setdefault(source, set()).add(target)
            self.beside.setdefault(target, set()).add(source)
        self.before: dict[str, set[str]] = {name: set() for name in self.beside}

    def direct(self, source: str, target: str) -> None:
        self.open -= {(source, target), (target, source)}
        self.before[target].add(source)

    def settle_colliders(self) -> None:
        parents: dict[str, list[str]] = {}
        for source, target in self.links:
            parents.setdefault(target, []).append(source)
        for target, sources in parents.items():
            for one, other in combinations(sources, 2):
                if other not in self.beside[one]:
                    self.direct(one, target)
                    self.direct(other, target)

    def complete(self) -> None:
        """Direct every open link that a rule decides, until none does."""
        changed = True
        while changed:
            changed = False
            for source, target in sorted(self.open):
                if (source, target) in self.open and self._forced(source, target):
                    self.direct(source, target)
                    changed = True

    def _forced(self, source: str, target: str) -> bool:
        """Whether one of Meek's rules directs source -> target."""
        near, far = self.beside[source], self.beside[target]
        if any(one not in far for one in self.before[source]):  # else a new collider at source
            return True
        if any(source in self.before[between] for between in self.before[target]):  # else a circle
            return True
        open_beside = {one for one in near if (source, one) in self.open}
        into = [one for one in self.before[target] if one in open_beside]
        if any(other not in self.beside[one] for one, other in combinations(into, 2)):  # else one of both
            return True
        return any(
            first in open_beside and first not in far
            for between in self.before[target]
            if between in near
            for first in self.before[between]
        )
