"""A network as a value: nodes in an order that puts parents first, their tables, and draws of those tables."""

from __future__ import annotations

import zlib
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np


@dataclass(frozen=True, eq=False)
class Category:
    """A category (or grade, or a number taken as bands) with a table per configuration of its parents.

    table: float64, one axis per parent in order, own levels last; each row sums to 1.
    dirichlet: posterior Dirichlet parameters, same shape as `table`; None when the table is known exactly.
    kind, cuts, has_blank: as in engine.records.Column (a number here acts through its bands).
    """

    name: str
    levels: tuple[str, ...]
    parents: tuple[str, ...] = ()
    table: np.ndarray | Sequence[object] = ()
    dirichlet: np.ndarray | None = None
    kind: str = "category"
    cuts: tuple[float, ...] = ()
    has_blank: bool = False

    def __post_init__(self) -> None:
        object.__setattr__(self, "levels", tuple(self.levels))
        object.__setattr__(self, "parents", tuple(self.parents))
        object.__setattr__(self, "table", np.asarray(self.table, dtype=np.float64))


@dataclass(frozen=True, eq=False)
class Network:
    """Nodes, parents before children. Made by `network(nodes)`, which checks and sorts them."""

    nodes: tuple[Category, ...]

    @cached_property
    def index(self) -> dict[str, int]:
        return {node.name: place for place, node in enumerate(self.nodes)}

    @property
    def names(self) -> tuple[str, ...]:
        return tuple(node.name for node in self.nodes)

    def node(self, name: str) -> Category:
        return self.nodes[self.index[name]]

    @cached_property
    def links(self) -> tuple[tuple[str, str], ...]:
        return tuple((parent, node.name) for node in self.nodes for parent in node.parents)

    def descendants(self, names: Sequence[str]) -> frozenset[str]:
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
        return tuple(_family_draws(node, count, seed) for node in self.nodes)


def _family_draws(node: Category, count: int, seed: int) -> np.ndarray:
    mean = np.asarray(node.table)[..., None]
    if node.dirichlet is None or count == 0:
        return np.repeat(mean, 1 + count, axis=-1)
    key = zlib.crc32("\x1f".join((node.name, *node.parents)).encode())
    rng = np.random.default_rng([seed, key])
    # ln Gamma(a) draws through Gamma(a + 1) and a uniform: a prior cell of 0.001 would underflow to 0 otherwise.
    alpha = node.dirichlet[..., None]
    shape = (*node.dirichlet.shape, count)
    log_gamma = np.log(rng.standard_gamma(np.broadcast_to(alpha + 1.0, shape))) - rng.standard_exponential(shape) / alpha
    log_gamma -= log_gamma.max(axis=-2, keepdims=True)
    drawn = np.exp(log_gamma)
    drawn /= drawn.sum(axis=-2, keepdims=True)
    return np.concatenate([mean, drawn], axis=-1)
