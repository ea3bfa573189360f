"""What a world with numbers looks like, before any value or parameter: tables, blocks of numbers, what is read where.

A number that acts through bands, or is kept in a range, brings in a label "which cell it is in", so that every
category has categories only among its parents. Numbers are then tied by links among themselves alone. A number with a
value is a constant to its children and an equation to its parents. What is left falls into blocks, each of which turns
into one factor over the categories and cells that it touches (Lauritzen 1992; Lauritzen & Jensen 2001).
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from engine.answering.mixed import MixedWorld
from engine.network.nodes import Category, Node, Number

Left = int | tuple[int, ...] | str  # of an axis: one position, several, or the band of a number that has a value
Cells = tuple[tuple[int, int], ...]  # first and last band of each cell of a number


@dataclass(frozen=True)
class Axis:
    """One category or number among the parents of a column: what is left of it, and its label if that is several."""

    left: Left
    label: int | None


@dataclass(frozen=True)
class Table:
    """The table of a category: its axes in order, its own last."""

    name: str
    axes: tuple[Axis, ...]

    @property
    def scope(self) -> tuple[int, ...]:
        return tuple(axis.label for axis in self.axes if axis.label is not None)


@dataclass(frozen=True)
class Equation:
    """The regression of a number: the axes of its category parents, its number parents in order."""

    name: str
    axes: tuple[Axis, ...]
    parents: tuple[str, ...]

    @property
    def scope(self) -> tuple[int, ...]:
        return tuple(axis.label for axis in self.axes if axis.label is not None)


@dataclass(frozen=True)
class Block:
    """Numbers that are tied together.

    equations: parents before children.  seen: those with values.  roots: number in cells -> the number that it is an
    exact function of, itself if of none, None if it is a constant.  scope: labels of categories, then of cells.
    outer: how many of these are categories'.
    """

    equations: tuple[Equation, ...]
    seen: tuple[str, ...]
    roots: Mapping[str, str | None]
    scope: tuple[int, ...]
    outer: int

    @property
    def names(self) -> tuple[str, ...]:
        return tuple(equation.name for equation in self.equations)

    @property
    def gates(self) -> tuple[str, ...]:
        """The different numbers that cells cut."""
        return tuple(dict.fromkeys(root for root in self.roots.values() if root is not None))


@dataclass(frozen=True)
class Layout:
    """One world, or the part of one that a reading needs.

    tables: of the categories.  factors: blocks that say something about them.  watched: number -> the block that its
    distribution comes from; roots: number -> the number that it is an exact function of, as in Block.
    sizes: label -> levels or cells left.  kept: category -> positions of the levels left.  boxed: number -> its cells.
    labels: name -> label of a category or of a number's cells, where several are left.
    """

    tables: tuple[Table, ...]
    factors: tuple[Block, ...]
    watched: Mapping[str, Block]
    roots: Mapping[str, str | None]
    sizes: Mapping[int, int]
    kept: Mapping[str, tuple[int, ...]]
    boxed: Mapping[str, Cells]
    labels: Mapping[str, int]


def layout(world: MixedWorld, watch: Collection[str]) -> Layout:
    """Lay out what of `world` bears on `watch` and on the probability of what was seen."""
    return _Laying(world, watch).done()


class _Laying:
    def __init__(self, world: MixedWorld, watch: Collection[str]) -> None:
        self.world = world
        self.watch = watch
        self.by_name: dict[str, Node] = {node.name: node for node in world.nodes}
        self.place = {node.name: place for place, node in enumerate(world.nodes)}
        self.nodes = _bearing(world, watch)
        acting = {parent for node in self.nodes if isinstance(node, Category) for parent in node.parents}
        self.boxed: dict[str, Cells] = {}
        self.kept: dict[str, tuple[int, ...]] = {}
        self.sizes: dict[int, int] = {}
        for node in self.nodes:
            levels = len(node.bands) + 1 if isinstance(node, Number) else len(node.levels)
            kept = tuple(sorted(world.pins.get(node.name, range(levels))))
            if isinstance(node, Category):
                self.kept[node.name] = kept
                size = len(kept)
            elif node.name in world.values or not (
                node.name in acting or node.name in world.ranges or node.name in world.pins
            ):
                continue
            else:
                self.boxed[node.name] = _singly(kept) if node.name in acting else _runs(kept)
                size = len(self.boxed[node.name])
            if size > 1:
                self.sizes[self.place[node.name]] = size

    def done(self) -> Layout:
        tables = tuple(self._table(node) for node in self.nodes if isinstance(node, Category))
        equations = {node.name: self._equation(node) for node in self.nodes if isinstance(node, Number)}
        core = self._above(equations, [name for name in equations if name in self.world.values or name in self.boxed])
        factors = [self._block(equations, names) for names in self._tied(equations, core)]
        watched = {}
        for name in self.watch:
            if name in equations and name not in self.world.values:
                own = set(self._above(equations, [name]))
                for block in factors:
                    held = {equation.name for equation in block.equations}
                    if own & held - self.world.values.keys():
                        own |= held
                watched[name] = self._block(equations, own)
        labels = {node.name: self.place[node.name] for node in self.nodes if self.place[node.name] in self.sizes}
        roots = {name: self._root(name) for name in watched}
        return Layout(tables, tuple(factors), watched, roots, self.sizes, self.kept, self.boxed, labels)

    def _label(self, name: str) -> int | None:
        place = self.place[name]
        return place if place in self.sizes else None

    def _axis(self, name: str) -> Axis:
        if name in self.world.values:
            return Axis(name, None)
        cells = self.boxed.get(name)  # bands one by one, since a category follows it
        positions = tuple(first for first, _ in cells) if cells is not None else self.kept[name]
        return Axis(positions[0] if len(positions) == 1 else positions, self._label(name))

    def _table(self, node: Category) -> Table:
        return Table(node.name, tuple(self._axis(name) for name in (*node.parents, node.name)))

    def _equation(self, node: Number) -> Equation:
        categories = [name for name in node.parents if isinstance(self.by_name[name], Category)]
        numbers = [name for name in node.parents if isinstance(self.by_name[name], Number)]
        return Equation(node.name, tuple(self._axis(name) for name in categories), tuple(numbers))

    def _above(self, equations: Mapping[str, Equation], names: Iterable[str]) -> list[str]:
        """`names` and every number above them, as far as one without a value leads to the next."""
        found: dict[str, None] = {}
        waiting = list(names)
        while waiting:
            name = waiting.pop()
            if name not in found:
                found[name] = None
                waiting.extend(parent for parent in equations[name].parents if parent not in self.world.values)
        return list(found)

    def _tied(self, equations: Mapping[str, Equation], names: Sequence[str]) -> list[set[str]]:
        """Equations that share numbers without values, set by set."""
        holder: dict[str, set[str]] = {}
        for name in names:
            merged = {name}
            unknown = [own for own in (name, *equations[name].parents) if own not in self.world.values]
            for own in unknown:
                merged |= holder.get(own, set())
            for member in merged:
                for own in (member, *equations[member].parents):
                    if own not in self.world.values:
                        holder[own] = merged
            if not unknown:
                holder[name] = merged
        found: dict[int, set[str]] = {}
        for merged in holder.values():
            found[id(merged)] = merged
        return sorted(found.values(), key=lambda members: min(self.place[name] for name in members))

    def _block(self, equations: Mapping[str, Equation], names: Collection[str]) -> Block:
        ordered = sorted(names, key=self.place.__getitem__)
        own = tuple(equations[name] for name in ordered)
        outer = sorted({label for equation in own for label in equation.scope})
        boxed = [name for name in ordered if name in self.boxed]
        inner = [self.place[name] for name in boxed if self.place[name] in self.sizes]
        return Block(
            own,
            tuple(name for name in ordered if name in self.world.values),
            {name: self._root(name) for name in boxed},
            (*outer, *inner),
            len(outer),
        )

    def _root(self, name: str) -> str | None:
        """The number that this one is an exact function of, by its links alone."""
        while True:
            node = self.by_name[name]
            assert isinstance(node, Number)
            if node.regression is not None or np.any(node.variance != 0.0):
                return name
            above = [
                parent
                for parent in node.parents
                if isinstance(self.by_name[parent], Number) and parent not in self.world.values
            ]
            if not above:
                return None
            if len(above) > 1:
                return name
            (name,) = above


def _bearing(world: MixedWorld, watch: Collection[str]) -> list[Node]:
    """Columns that are seen or watched, and all above them; the rest are barren."""
    wanted = {*world.pins, *world.values, *world.ranges, *watch}
    found = []
    for node in reversed(world.nodes):
        if node.name in wanted:
            wanted.update(node.parents)
            found.append(node)
    return found[::-1]


def _singly(positions: Sequence[int]) -> Cells:
    return tuple((position, position) for position in positions)


def _runs(positions: Sequence[int]) -> Cells:
    """Neighbouring bands taken together."""
    found: list[tuple[int, int]] = []
    for position in positions:
        if found and found[-1][1] == position - 1:
            found[-1] = (found[-1][0], position)
        else:
            found.append((position, position))
    return tuple(found)
