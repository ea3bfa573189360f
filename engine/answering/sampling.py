"""What is known of a world before anything is sampled: which columns matter, and what was seen of them."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np

from engine.answering.mixed import Drawn, MixedWorld
from engine.answering.truncated import WHOLE, Floats, Interval
from engine.network.nodes import Category, Node, Number


@dataclass(frozen=True)
class Batch:
    """`size` particles in each of `draws` draws from `first` on.

    key: tells the batches of a reading apart; the same in every world, so that a column meets the same chances.
    """

    first: int
    draws: int
    size: int
    key: tuple[int, ...]

    @property
    def slots(self) -> slice:
        return slice(self.first, self.first + self.draws)

    def uniform(self, name: str, seed: int) -> Floats:
        """(draws, size) numbers in 0 < u < 1 that belong to one column."""
        digest = hashlib.blake2b(name.encode("utf-8", "surrogatepass"), digest_size=8).digest()
        rng = np.random.default_rng([seed, int.from_bytes(digest, "little"), *self.key])
        return rng.random((self.draws, self.size)) + 2.0**-54


class Sampler:
    """What sampling a world needs to know before any number is looked at.

    Only columns that are watched, or seen, or lead to such a column are sampled: the others cannot change anything.
    """

    def __init__(self, world: MixedWorld, drawn: Drawn, seed: int) -> None:
        self.world = world
        self.drawn = drawn
        self.seed = seed
        self.node: dict[str, Node] = {node.name: node for node in world.nodes}
        self.pins = {name: at for name, at in world.pins.items() if len(at) < len(self.node[name].levels)}
        needed = {*self.seen, *world.watch}
        for node in reversed(world.nodes):
            if node.name in needed:
                needed.update(node.parents)
        self.nodes = tuple(node for node in world.nodes if node.name in needed)
        self.following: dict[str, list[str]] = {}
        for node in self.nodes:
            for parent in node.parents:
                self.following.setdefault(parent, []).append(node.name)
        self.told_by_later: set[str] = set()  # columns with something seen downstream
        for node in reversed(self.nodes):
            if node.name in self.told_by_later or node.name in self.seen:
                self.told_by_later.update(node.parents)
        self.telling = self.told_by_later | self.seen

    @cached_property
    def seen(self) -> frozenset[str]:
        return frozenset(self.pins) | frozenset(self.world.values) | frozenset(self.intervals)

    @cached_property
    def intervals(self) -> dict[str, tuple[Interval, ...]]:
        """Numbers kept inside intervals, ascending and apart."""
        found: dict[str, tuple[Interval, ...]] = {}
        for name, interval in self.world.ranges.items():
            if interval != WHOLE:
                found[name] = (interval,)
        for name, kept in self.pins.items():
            node = self.node[name]
            if isinstance(node, Number):
                found[name] = _joined_bands(node.bands, kept)
        return found

    def boxes(self, name: str) -> tuple[Interval, ...]:
        """Intervals in which nothing seen tells one value of a number from another but by the numbers around it.

        One per band when it is pinned by bands, or when a category that tells something follows it; else only one.
        """
        node = self.node[name]
        low, high = self.world.ranges.get(name, WHOLE)
        by_band = name in self.pins or any(
            isinstance(self.node[child], Category) and child in self.telling for child in self.following.get(name, ())
        )
        edges = (-np.inf, *node.cuts, np.inf) if by_band else WHOLE
        return tuple((max(start, low), min(end, high)) for start, end in pairwise(edges))


def _joined_bands(cuts: tuple[float, ...], kept: frozenset[int]) -> tuple[Interval, ...]:
    """The bands kept, neighbours as one."""
    edges = (-np.inf, *cuts, np.inf)
    found: list[Interval] = []
    for place, (low, high) in enumerate(pairwise(edges)):
        if place not in kept:
            continue
        if found and found[-1][1] == low:
            found[-1] = (found[-1][0], high)
        else:
            found.append((low, high))
    return tuple(found)
