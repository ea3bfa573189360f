"""A network as a value: nodes in an order that puts parents first, their tables, and draws of those tables."""

from __future__ import annotations

import zlib
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.network.nodes import Category
from engine.refusal import Refusal, quoted

__all__ = ["Category", "Network", "drawn_table", "network"]

ROUNDING = 1e-8  # how far a row of a table may be from 1: tables are often written with nine or more digits
SMALLEST = 1e-300  # a drawn share that rounds to 0 although its cell is possible is taken as this
AT_ONCE = 1_000_000  # cells times draws that are drawn at once; a larger table is drawn in parts


@dataclass(frozen=True, eq=False)
class Network:
    """Nodes, parents before children. Made by `network(nodes)`, which checks and sorts them."""

    nodes: tuple[Category, ...]

    @cached_property
    def index(self) -> dict[str, int]:
        return {node.name: place for place, node in enumerate(self.nodes)}

    @cached_property
    def names(self) -> tuple[str, ...]:
        return tuple(node.name for node in self.nodes)

    def node(self, name: str) -> Category:
        return self.nodes[self.index[name]]

    @cached_property
    def links(self) -> tuple[tuple[str, str], ...]:
        return tuple((parent, node.name) for node in self.nodes for parent in node.parents)

    @property
    def drawable(self) -> bool:
        """Whether any table is uncertain, so that draws differ from the posterior mean."""
        return any(node.dirichlet is not None for node in self.nodes)

    def descendants(self, names: Iterable[str]) -> frozenset[str]:
        """Columns strictly downstream of any of `names` (a name itself only when it follows another of them)."""
        reached: set[str] = set()
        below = set(names)
        for node in self.nodes:
            if below & set(node.parents):
                below.add(node.name)
                reached.add(node.name)
        return frozenset(reached)

    def draws(self, count: int, seed: int) -> tuple[np.ndarray, ...]:
        """Tables with the draws on the last axis: (parent levels..., own levels, 1 + count).

        The first draw is the posterior mean. A family (column and parents) draws the same numbers in every
        network that holds it, so that answers from different networks are compared on common draws.
        """
        return tuple(drawn_table(node, count, seed) for node in self.nodes)


def network(nodes: Iterable[Category]) -> Network:
    """Check `nodes` and sort them, parents before children, otherwise in the order given.

    Raises Refusal for: no columns, what is no Category, a name that is no text, a column twice, a level twice, an
    unknown parent, a parent twice, a table of the wrong shape, an entry that is no probability, a row that does not
    sum to 1, links that run in a circle.
    """
    given = tuple(nodes)
    if not given:
        raise Refusal("A network needs at least one column.", do="Give a list of engine.Category.")
    by_name: dict[str, Category] = {}
    for node in given:
        if not isinstance(node, Category):
            raise Refusal(f"{node!r} is no column of a network.", do="Give a list of engine.Category.")
        if not isinstance(node.name, str):
            raise Refusal(f"The column name {node.name!r} is not a text.", do="Name columns with words.")
        if node.name in by_name:
            raise Refusal(
                f"The column {quoted(node.name)} is given twice.", where=node.name, do="Give each column once."
            )
        by_name[node.name] = node
    for node in given:
        _check_family(node, by_name)
    return Network(_parents_first(given, by_name))


def _check_family(node: Category, by_name: dict[str, Category]) -> None:
    if not node.levels or not all(isinstance(level, str) for level in node.levels):
        raise Refusal(
            f"{quoted(node.name)} needs levels, each a text.", where=node.name, do='Give them as ["no", "yes"].'
        )
    if len(set(node.levels)) < len(node.levels):
        raise Refusal(f"{quoted(node.name)} has a level twice.", where=node.name, do="Give each level once.")
    if not all(isinstance(parent, str) for parent in node.parents):
        raise Refusal(f"A parent of {quoted(node.name)} is not a text.", where=node.name, do="Give columns by name.")
    if len(set(node.parents)) < len(node.parents):
        raise Refusal(f"{quoted(node.name)} has a parent twice.", where=node.name, do="Give each parent once.")
    for parent in node.parents:
        if parent not in by_name:
            raise Refusal(
                f"{quoted(node.name)} has the parent {quoted(parent)}, which is no column of this network.",
                where=node.name,
                do=f"Add {quoted(parent)}, or take it out of the parents.",
            )
    expected = (*(len(by_name[parent].levels) for parent in node.parents), len(node.levels))
    table = np.asarray(node.table)
    if table.shape != expected:
        raise Refusal(
            f"The table of {quoted(node.name)} has the shape {table.shape}; its parents and levels ask for {expected}.",
            where=node.name,
            do="Give one axis per parent in order, and the column's own levels last.",
        )
    if not np.all(np.isfinite(table)) or np.any(table < 0.0):
        raise Refusal(
            f"The table of {quoted(node.name)} holds an entry that is no probability.",
            where=node.name,
            do="Every entry is 0 or more, and each row sums to 1.",
        )
    off = np.abs(table.sum(axis=-1) - 1.0)
    if np.any(off > ROUNDING):
        row = np.unravel_index(int(np.argmax(off)), off.shape)
        at = ", ".join(
            f"{quoted(parent)} = {quoted(by_name[parent].levels[place])}"
            for parent, place in zip(node.parents, row, strict=True)
        )
        raise Refusal(
            f"The table of {quoted(node.name)} sums to {table[row].sum():.6g} instead of 1"
            f"{f' where {at}' if at else ''}.",
            where=node.name,
            do="Correct that row; nothing is rescaled here.",
        )
    if node.dirichlet is not None and node.dirichlet.shape != expected:
        raise Refusal(f"The Dirichlet parameters of {quoted(node.name)} do not fit its table.", where=node.name)


def _parents_first(given: tuple[Category, ...], by_name: dict[str, Category]) -> tuple[Category, ...]:
    """Topological order, stable in the order given (Kahn 1962)."""
    done: dict[str, Category] = {}
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


def _circle(waiting: list[Category], left: set[str]) -> list[str]:
    """One circle among columns that each have a parent among them, told parent first."""
    by_name = {node.name: node for node in waiting}
    walk = [waiting[0].name]
    while True:
        parent = next(parent for parent in by_name[walk[-1]].parents if parent in left)
        if parent in walk:
            return walk[walk.index(parent) :][::-1]
        walk.append(parent)


def drawn_table(node: Category, count: int, seed: int) -> np.ndarray:
    """One family's part of `Network.draws`, read-only: (parent levels..., own levels, 1 + count).

    A table known exactly is the same in every draw and takes no more room than once.
    """
    mean = np.asarray(node.table)[..., None]
    if node.dirichlet is None or count == 0:
        return np.broadcast_to(mean, (*mean.shape[:-1], 1 + count))
    key = zlib.crc32("\x1f".join((node.name, *node.parents)).encode())
    rng = np.random.default_rng([seed, key])
    # ln Gamma(a) draws through Gamma(a + 1) and a uniform: a prior cell of 0.001 would underflow to 0 otherwise.
    alpha = node.dirichlet.reshape(-1, node.dirichlet.shape[-1], 1)  # (configurations, own levels, 1)
    drawn = np.empty((*alpha.shape[:2], 1 + count))
    drawn[..., :1] = mean.reshape(alpha.shape)
    rows = max(1, AT_ONCE // (alpha.shape[1] * count))
    parts = [slice(start, start + rows) for start in range(0, len(alpha), rows)]
    for part in parts:
        shape = (*alpha[part].shape[:2], count)
        drawn[part, :, 1:] = rng.standard_gamma(np.broadcast_to(alpha[part] + 1.0, shape))
    with np.errstate(divide="ignore"):  # a parameter of 0 is a level that cannot be: its share is 0 in every draw
        for part in parts:
            shape = (*alpha[part].shape[:2], count)
            log_gamma = np.log(drawn[part, :, 1:]) - rng.standard_exponential(shape) / alpha[part]
            log_gamma -= log_gamma.max(axis=-2, keepdims=True)
            shares = np.exp(log_gamma, out=log_gamma)
            shares /= shares.sum(axis=-2, keepdims=True)
            drawn[part, :, 1:] = np.where(alpha[part] > 0.0, np.maximum(shares, SMALLEST), 0.0)
    drawn.flags.writeable = False
    return drawn.reshape(*node.dirichlet.shape, 1 + count)
