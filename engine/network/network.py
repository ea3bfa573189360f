"""A network as a value: nodes in an order that puts parents first, and draws of their parameters."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.network.drawn import drawn, drawn_table
from engine.network.family import category_parents, check_family, number_parents
from engine.network.nodes import Category, Node, Number
from engine.network.regression import Coefficients
from engine.refusal import Refusal, quoted

__all__ = ["Category", "Network", "Node", "Number", "drawn_table", "network"]


@dataclass(frozen=True, eq=False)
class Network:
    """Nodes, parents before children. Made by `network(nodes)`, which checks and sorts them."""

    nodes: tuple[Node, ...]

    @cached_property
    def index(self) -> dict[str, int]:
        return {node.name: place for place, node in enumerate(self.nodes)}

    @cached_property
    def names(self) -> tuple[str, ...]:
        return tuple(node.name for node in self.nodes)

    @cached_property
    def numbers(self) -> tuple[str, ...]:
        """Columns that are numbers with a regression; a number taken as bands is none of them."""
        return tuple(node.name for node in self.nodes if isinstance(node, Number))

    def node(self, name: str) -> Node:
        return self.nodes[self.index[name]]

    def category(self, name: str) -> Category:
        """The node of a column that is known to be a category."""
        node = self.node(name)
        assert isinstance(node, Category), f"{name!r} is a number"
        return node

    def number(self, name: str) -> Number:
        """The node of a column that is known to be a number."""
        node = self.node(name)
        assert isinstance(node, Number), f"{name!r} is a category"
        return node

    def category_parents(self, name: str) -> tuple[str, ...]:
        """The parents of a column that are categories, in order."""
        return category_parents(self.node(name), self._by_name)

    def number_parents(self, name: str) -> tuple[str, ...]:
        """The parents of a column that are numbers, in order."""
        return number_parents(self.node(name), self._by_name)

    @cached_property
    def links(self) -> tuple[tuple[str, str], ...]:
        return tuple((parent, node.name) for node in self.nodes for parent in node.parents)

    @property
    def drawable(self) -> bool:
        """Whether any parameter is uncertain, so that draws differ from the posterior mean."""
        return any(uncertain(node) for node in self.nodes)

    def descendants(self, names: Iterable[str]) -> frozenset[str]:
        """Columns strictly downstream of any of `names` (a name itself only when it follows another of them)."""
        reached: set[str] = set()
        below = set(names)
        for node in self.nodes:
            if below & set(node.parents):
                below.add(node.name)
                reached.add(node.name)
        return frozenset(reached)

    def draws(self, count: int, seed: int) -> tuple[np.ndarray | Coefficients, ...]:
        """Parameters of every node, as engine.network.drawn.drawn gives them."""
        return tuple(drawn(node, count, seed) for node in self.nodes)

    @cached_property
    def _by_name(self) -> dict[str, Node]:
        return {node.name: node for node in self.nodes}


def uncertain(node: Node) -> bool:
    """Whether the parameters of a column have a posterior, and so differ from draw to draw."""
    return (node.dirichlet if isinstance(node, Category) else node.regression) is not None


def network(nodes: Iterable[Node]) -> Network:
    """Check `nodes` and sort them, parents before children, otherwise in the order given.

    Raises Refusal for: no columns, what is no column, a name that is no text, a column twice, a level twice, an
    unknown parent, a parent twice, parameters of the wrong shape, an entry that is no probability, a row that does
    not sum to 1, coefficients that are not finite, a variance below 0, a number without bands that leads to a
    category, links that run in a circle.
    """
    given = tuple(nodes)
    if not given:
        raise Refusal("A network needs at least one column.", do="Give a list of engine.Category and engine.Number.")
    by_name: dict[str, Node] = {}
    for node in given:
        if not isinstance(node, Category | Number):
            raise Refusal(
                f"{node!r} is no column of a network.", do="Give a list of engine.Category and engine.Number."
            )
        if not isinstance(node.name, str):
            raise Refusal(f"The column name {node.name!r} is not a text.", do="Name columns with words.")
        if node.name in by_name:
            raise Refusal(
                f"The column {quoted(node.name)} is given twice.", where=node.name, do="Give each column once."
            )
        by_name[node.name] = node
    for node in given:
        check_family(node, by_name)
    return Network(_parents_first(given, by_name))


def _parents_first(given: tuple[Node, ...], by_name: dict[str, Node]) -> tuple[Node, ...]:
    """Topological order, stable in the order given (Kahn 1962)."""
    done: dict[str, Node] = {}
    waiting = list(given)
    while waiting:
        ready = next((node for node in waiting if all(parent in done for parent in node.parents)), None)
        if ready is None:
            circle = _circle(waiting, {node.name for node in waiting})
            raise Refusal(
                f"The links run in a circle: {', '.join(map(quoted, circle))} and back to {quoted(circle[0])}.",
                where=circle[0],
                do="Take out or turn round one of these links.",
            )
        waiting.remove(ready)
        done[ready.name] = ready
    return tuple(done.values())


def _circle(waiting: list[Node], left: set[str]) -> list[str]:
    """One circle among columns that each have a parent among them, told parent first."""
    by_name = {node.name: node for node in waiting}
    walk = [waiting[0].name]
    while True:
        parent = next(parent for parent in by_name[walk[-1]].parents if parent in left)
        if parent in walk:
            return walk[walk.index(parent) :][::-1]
        walk.append(parent)
