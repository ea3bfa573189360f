"""Exact answers where numbers and categories meet: every block of numbers a factor, one clique tree over the rest.

Lauritzen (1992), Lauritzen & Jensen (2001), with numbers that act through bands brought in by the cells that they
lie in. What is watched is read all at once, or number by number with only what bears on each, whichever is cheaper.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.answering import blocks
from engine.answering.layout import Block, Layout, layout
from engine.answering.mixed import Drawn, MixedRead, MixedWorld
from engine.answering.mixture import Gate, Mixture
from engine.answering.tree import Tree
from engine.answering.tree import plan as tree_plan
from engine.network.nodes import Category, Number
from engine.network.regression import Coefficients
from engine.refusal import quoted

Floats = NDArray[np.float64]

CHUNK = 64e6  # bytes held at once
STEP = 50.0  # cells that a step of a tree counts for, however small
CELL = {0: 2.0, 1: 40.0, 2: 600.0}  # cells that one costs, by how many numbers it cuts: so many times a product's time
GATE = ("slope", "at", "sd", "low", "high")
LIKELY = 1e-4  # evidence above this, against the likeliest cells, hangs on no small probability
PART, GATED = 4.0, 1500.0  # cells that a part of a mixture counts for, when nothing cuts it and when something does


@dataclass(frozen=True, eq=False)
class Reading:
    """What is read from one tree.

    layout: the columns that bear on it.  tree: over its tables, its factors, then a table of ones for every number
    whose labels share no other.  at: number -> the leaf that is read for it.  names: columns read.
    """

    layout: Layout
    tree: Tree
    at: Mapping[str, int]
    names: tuple[str, ...]
    ones: tuple[tuple[int, ...], ...]
    cells: float
    stored: float
    why: str

    @property
    def needs(self) -> list[str]:
        """Columns whose parameters it takes."""
        found = {table.name for table in self.layout.tables}
        return sorted(found.union(*(block.names for block in (*self.layout.factors, *self.layout.watched.values()))))


@dataclass(frozen=True, eq=False)
class Plan:
    """How to read a world exactly. It holds for other values and other ends of ranges, in the same columns.

    cells: cost in cells per draw; infinite when there is no exact route, and `why` says why not.
    """

    readings: tuple[Reading, ...]
    cells: float
    why: str

    def read(self, world: MixedWorld, drawn: Drawn, count: int) -> MixedRead:
        """Read `world` in 1 + count draws; `drawn` is every node's table or coefficients, the draws last."""
        log_evidence: Floats = np.zeros(1 + count)
        shares: dict[str, Floats] = {}
        numbers: dict[str, Mixture] = {}
        for turn, reading in enumerate(self.readings):
            width = max(1, int(CHUNK / (8.0 * max(reading.stored, 1.0))))
            ends = [(start, min(start + width, 1 + count)) for start in range(0, 1 + count, width)]
            parts = [
                _read(reading, world, {name: _some(drawn[name], start, end) for name in reading.needs}, end - start)
                for start, end in ends
            ]
            if turn == 0:
                log_evidence = np.concatenate([part.log_evidence for part in parts])
            for name in parts[0].shares:
                shares[name] = np.concatenate([part.shares[name] for part in parts], axis=-1)
            for name in parts[0].numbers:
                numbers[name] = _joined([part.numbers[name] for part in parts])
        for name in world.watch:
            if name in world.values:
                numbers[name] = _point(world.values[name], log_evidence)
        for node in world.nodes:
            if isinstance(node, Number) and node.name in numbers:
                shares[node.name] = numbers[node.name].bands(node.bands)
        return MixedRead(
            log_evidence, {name: shares[name] for name in world.watch}, {name: numbers[name] for name in numbers}
        )


def plan(world: MixedWorld) -> Plan:
    """Lay out how to read `world`; nothing of it hangs on its values or on the ends of its ranges."""
    watch = tuple(dict.fromkeys(world.watch))
    numbers = tuple(node.name for node in world.nodes if isinstance(node, Number) and node.name in watch)
    numbers = tuple(name for name in numbers if name not in world.values)
    categories = tuple(node.name for node in world.nodes if isinstance(node, Category) and node.name in watch)
    whole = Plan((_reading(world, (*categories, *numbers)),), 0.0, "")
    tried = [_summed(whole)]
    if len(numbers) + bool(categories) > 1:
        alone = [_reading(world, (name,)) for name in numbers]
        tried.append(_summed(Plan((_reading(world, categories), *alone), 0.0, "")))
        if len(categories) > 1 and not np.isfinite(min(each.cells for each in tried)):
            singly = [_reading(world, (name,)) for name in categories]
            tried.append(_summed(Plan((*singly, *alone), 0.0, "")))
    return min(tried, key=lambda each: each.cells)


def _summed(found: Plan) -> Plan:
    why = next((reading.why for reading in found.readings if reading.why), "")
    return Plan(found.readings, sum(reading.cells for reading in found.readings), why)


def _reading(world: MixedWorld, names: tuple[str, ...]) -> Reading:
    laid = layout(world, names)
    scopes = [table.scope for table in laid.tables] + [block.scope for block in laid.factors]
    at: dict[str, int] = {}
    ones: list[tuple[int, ...]] = []
    for name, block in laid.watched.items():
        holding = [place for place, scope in enumerate(scopes) if set(block.scope) <= set(scope)]
        if not holding:
            holding = [len(scopes)]
            scopes.append(block.scope)
            ones.append(block.scope)
        at[name] = min(holding, key=lambda place: _product(scopes[place], laid.sizes))
    watched = [laid.labels[name] for name in names if name in laid.labels and name in laid.kept]
    tree = tree_plan(scopes, laid.sizes, watched, wholes=tuple(at.values()))
    why = next((_why_not(block, None) for block in laid.factors if len(block.gates) > 2), "")
    for name, block in laid.watched.items():
        why = why or _why_not(block, name) * (len(set(block.gates) - {laid.roots[name]}) > 1)
    cells, stored = tree.cells + STEP * len(tree.steps), tree.stored
    for block in {id(block): block for block in (*laid.factors, *laid.watched.values())}.values():
        outer, full = _product(block.scope[: block.outer], laid.sizes), _product(block.scope, laid.sizes)
        size = len(block.equations)
        cells += outer * size * (2.0 + 0.5 * size) * (1.0 + len(block.seen)) + full * CELL.get(len(block.gates), 0.0)
        stored += outer * size * (2.0 + size) + 6.0 * full
    for block in laid.watched.values():
        cells += (GATED if block.gates else PART) * _product(block.scope, laid.sizes)
    return Reading(laid, tree, at, names, tuple(ones), np.inf if why else cells, stored, why)


def _why_not(block: Block, name: str | None) -> str:
    """In words: more numbers of one block are cut by bands than there is a closed form for."""
    several = ", ".join(map(quoted, block.gates))
    if name is None:
        return f"{several} hang together, and each acts through its bands or is kept in a range"
    return f"{quoted(name)} hangs together with {several}, each of which acts through its bands or is kept in a range"


def _product(scope: Sequence[int], sizes: Mapping[int, int]) -> float:
    found = 1.0
    for label in scope:
        found *= sizes[label]
    return found


def _some(found: np.ndarray | Coefficients, start: int, stop: int) -> np.ndarray | Coefficients:
    if isinstance(found, Coefficients):
        return Coefficients(
            found.intercept[..., start:stop], found.slopes[..., start:stop], found.variance[..., start:stop]
        )
    return found[..., start:stop]


def _read(reading: Reading, world: MixedWorld, drawn: Drawn, width: int, finely: bool = False) -> MixedRead:
    """One reading, `width` draws of it. finely: with every digit of small probabilities, where that could tell."""
    laid = reading.layout
    nodes = {node.name: node for node in world.nodes}
    bands = {name: int(np.searchsorted(nodes[name].cuts, value, side="right")) for name, value in world.values.items()}
    tables = []
    for table in laid.tables:
        own = drawn[table.name]
        assert isinstance(own, np.ndarray)
        tables.append(blocks.restricted(own[..., :1] if own.strides[-1] == 0 else own, table.axes, bands)[0])
    keep: dict[tuple[str, ...], list[str]] = {}
    for name, block in laid.watched.items():
        keep.setdefault(block.names, []).append(name)
    solved: dict[tuple[str, ...], blocks.Solved] = {}
    for block in (*laid.factors, *laid.watched.values()):
        if block.names not in solved:
            solved[block.names] = blocks.solve(block, world, drawn, keep.get(block.names, ()))
    log_constant: Floats = np.zeros(1)
    rare: Floats = np.zeros(1)
    logs: list[Floats] = []
    for block in laid.factors:
        cells, log_scale, small = blocks.factor(solved[block.names], world, laid, finely)
        logs.append(cells)
        log_constant, rare = log_constant + log_scale, rare + small
    logs, taken = blocks.gathered(logs, [block.scope for block in laid.factors])
    log_constant = log_constant + taken
    tables.extend(np.exp(cells) for cells in logs)
    tables.extend(np.ones((*(laid.sizes[label] for label in scope), 1)) for scope in reading.ones)
    read = reading.tree.programme.run(tables)
    coarse = not finely and any(len(block.gates) > 1 for block in laid.factors)
    if coarse and not np.all(read.log_evidence + taken + rare > np.log(LIKELY)):
        return _read(reading, world, drawn, width, finely=True)
    shares: dict[str, Floats] = {}
    numbers: dict[str, Mixture] = {}
    for name in reading.names:
        if name in laid.kept:
            shares[name] = np.zeros((len(nodes[name].levels), width))
            found: Floats | float = read.marginals[laid.labels[name]] if name in laid.labels else 1.0
            shares[name][list(laid.kept[name])] = found
        elif name in laid.watched:
            block, leaf = laid.watched[name], reading.at[name]
            scope = (*(table.scope for table in laid.tables), *(each.scope for each in laid.factors), *reading.ones)[
                leaf
            ]
            joint = _marginal(read.wholes[leaf], scope, block.scope)
            joint = np.broadcast_to(joint, (*joint.shape[:-1], width))
            numbers[name] = blocks.mixture(solved[block.names], name, joint, world, laid)
    log_evidence = np.broadcast_to(read.log_evidence + log_constant, (width,))
    return MixedRead(log_evidence, shares, numbers)


def _marginal(joint: Floats, scope: Sequence[int], wanted: Sequence[int]) -> Floats:
    """(wanted..., draws) of a joint over `scope`."""
    summed = joint.sum(axis=tuple(axis for axis, label in enumerate(scope) if label not in wanted))
    left = [label for label in scope if label in wanted]
    return np.transpose(summed, (*(left.index(label) for label in wanted), len(wanted)))


def _point(value: float, log_evidence: Floats) -> Mixture:
    """The distribution of a number that has a value, where that can be."""
    shape = (1, len(log_evidence))
    weight = np.where(log_evidence > -np.inf, 1.0, np.nan).reshape(shape)
    return Mixture(weight, np.full(shape, value), np.zeros(shape))


def _joined(parts: Sequence[Mixture]) -> Mixture:
    """Mixtures of one draw after another as one, without the parts that weigh nothing in any draw."""

    def wide(arrays: Sequence[Floats | None]) -> Floats | None:
        given = [array for array in arrays if array is not None]
        return np.concatenate(given, axis=-1)[weighs] if given else None

    weight = np.concatenate([part.weight for part in parts], axis=-1)
    weighs = ~(weight == 0.0).all(axis=-1)
    gates = [part.gate for part in parts if part.gate is not None]
    gate = None
    if gates:
        gate = Gate(*(_kept(wide([getattr(each, side) for each in gates])) for side in GATE))
    mean, sd = (_kept(wide([getattr(part, side) for part in parts])) for side in ("mean", "sd"))
    return Mixture(
        weight[weighs], mean, sd, gate, wide([part.low for part in parts]), wide([part.high for part in parts])
    )


def _kept(array: Floats | None) -> Floats:
    assert array is not None
    return array
