"""A world as tables: pins take levels away, a lever splits its column in two.

The natural column keeps its own table; the set copy feeds the column's children (Richardson & Robins 2013). Labels
are places in the network; the set copy of the column at place i has the label i + number of columns.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.answering.settings import OfCategory, Setting
from engine.network.network import Network

Left = int | tuple[int, ...] | None  # what is left of an axis: one position, some positions, or all


@dataclass(frozen=True)
class Part:
    """One table of a world.

    family: place of the column whose table it is.  left: what is left of each axis.
    scope: labels of the axes left with more than one level.  lever: when this is the set copy of that column.
    """

    family: int
    left: tuple[Left, ...]
    scope: tuple[int, ...]
    lever: OfCategory | None = None


@dataclass(frozen=True)
class World:
    """The tables that one world needs, before any number is looked at.

    sizes: label -> levels left.  reads: watched column -> label that shows it, or the position of its one level
    left as a negative number, -1 - position.  kept: pinned label -> positions left.
    """

    network: Network
    parts: tuple[Part, ...]
    sizes: Mapping[int, int]
    reads: Mapping[str, int]
    kept: Mapping[int, tuple[int, ...]]

    @property
    def scopes(self) -> tuple[tuple[int, ...], ...]:
        return tuple(part.scope for part in self.parts)

    @property
    def watched(self) -> tuple[int, ...]:
        return tuple(label for label in self.reads.values() if label >= 0)

    @cached_property
    def families(self) -> tuple[int, ...]:
        """Places of the columns whose own tables this world needs."""
        return tuple(part.family for part in self.parts if part.lever is None)

    def tables(self, drawn: Mapping[int, np.ndarray]) -> list[np.ndarray]:
        """One table per part, (levels left..., draws), from the tables of `families`; (..., 1) for a set copy."""
        return [_table(part, drawn, len(self.network.nodes[part.family].levels)) for part in self.parts]

    def spread_out(self, column: str, marginals: Mapping[int, np.ndarray], draws: int) -> np.ndarray:
        """(levels, draws) of a watched column over all its levels, those pinned away at 0."""
        place = self.network.index[column]
        levels = len(self.network.nodes[place].levels)
        label = self.reads[column]
        shares = np.zeros((levels, draws))
        if label < 0:
            shares[-1 - label] = 1.0
        elif label in self.kept:
            shares[list(self.kept[label])] = marginals[label]
        else:
            shares[:] = marginals[label]
        return shares


def world(
    network: Network,
    pins: Mapping[str, frozenset[int]],
    levers: Mapping[str, OfCategory],
    columns: Iterable[str],
    after: Mapping[str, frozenset[int]] | None = None,
) -> World:
    """The world where `pins` held before `levers`, with the tables that reading `columns` needs and no others.

    after: pins on what is seen after the levers, of columns that a lever sets or moves.
    """
    count = len(network.nodes)
    settings = {network.index[column]: setting for column, setting in levers.items()}
    pinned: dict[int, tuple[int, ...]] = {}
    for given, copied in ((pins, False), (after or {}, True)):
        for column, wanted in given.items():
            place = network.index[column]
            if len(wanted) < len(network.nodes[place].levels):
                pinned[place + count if copied and place in settings else place] = tuple(sorted(wanted))
    kept = {place: (0,) for place, node in enumerate(network.nodes) if len(node.levels) == 1} | pinned

    def as_seen(place: int) -> tuple[int | None, Left]:
        """Label under which the children of a column see it, and what is left of that axis."""
        setting = settings.get(place)
        if setting is None:
            return _left(place, kept)
        if isinstance(setting, Setting) and setting.reach == 1.0 and place + count not in kept:
            return None, setting.position
        return _left(place + count, kept)

    def axes_of(own: int) -> list[tuple[int | None, Left]]:
        """Parents, then the column itself, of a table; those of a set copy are its ruler and the natural column."""
        node = network.nodes[own % count]
        before = node.parents
        if own >= count:
            ruler = settings[own - count].ruler
            before = () if ruler is None else (ruler,)
        seen = [as_seen(network.index[parent]) for parent in before]
        natural = [_left(own - count, kept)] if own >= count and not settings[own - count].forgets else []
        return [*seen, *natural, _left(own, kept)]

    reads: dict[str, int] = {}
    for column in columns:
        label, left = as_seen(network.index[column])
        if isinstance(left, int):
            reads[column] = -1 - left
        elif label is not None:
            reads[column] = label

    parts: dict[int, Part] = {}
    waiting = [*pinned, *(label for label in reads.values() if label >= 0)]
    while waiting:
        own = waiting.pop()
        if own in parts:
            continue
        axes = axes_of(own)
        scope = tuple(label for label, left in axes if label is not None and not isinstance(left, int))
        lever = settings[own - count] if own >= count else None
        parts[own] = Part(own % count, tuple(left for _, left in axes), scope, lever)
        waiting.extend(label for label, _ in axes if label is not None and label not in parts)
    labels = sorted({label for part in parts.values() for label in part.scope})
    sizes = {label: len(kept.get(label, network.nodes[label % count].levels)) for label in labels}
    return World(network, tuple(parts[own] for own in sorted(parts)), sizes, reads, kept)


def _left(label: int, kept: Mapping[int, tuple[int, ...]]) -> tuple[int, Left]:
    """A label and what is left of its axis."""
    positions = kept.get(label)
    return label, positions[0] if positions is not None and len(positions) == 1 else positions


def _table(part: Part, drawn: Mapping[int, np.ndarray], levels: int) -> np.ndarray:
    table = drawn[part.family] if part.lever is None else part.lever.copy(levels)[..., None]
    table = table[tuple(left if isinstance(left, int) else slice(None) for left in part.left)]
    axis = 0
    for left in part.left:
        if isinstance(left, tuple):
            table = np.take(table, left, axis=axis)
        if not isinstance(left, int):
            axis += 1
    return table
