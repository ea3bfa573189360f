"""A block of numbers as one factor over the categories and cells that it touches, and a number of it as a mixture."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.answering.cutting import Cut, Gate, back, forward
from engine.answering.layout import Axis, Block, Layout
from engine.answering.linear import Given, Line, apart, following, given, steady, together
from engine.answering.mixed import Drawn, MixedWorld
from engine.answering.mixture import Mixture
from engine.network.nodes import Number
from engine.network.regression import Coefficients

Floats = NDArray[np.float64]

FAINT = -300.0  # natural log below which a cell may underflow beside others
EXACTLY = 230.0  # natural log that a value counts for where its number could be nothing else: more than any density


@dataclass(frozen=True, eq=False)
class Solved:
    """A block given its values; arrays broadcast over (categories..., draws).

    affine: number in cells, or watched -> (constant, slope) on its root.
    """

    block: Block
    given: Given
    affine: Mapping[str, tuple[Floats, Floats]]

    def open(self, array: Floats) -> Floats:
        """The same with an axis of length 1 for every number in several cells."""
        inner = len(self.block.scope) - self.block.outer
        shape = (1,) * (self.block.outer + 1 - array.ndim) + array.shape
        return array.reshape((*shape[:-1], *(1,) * inner, shape[-1]))

    def line(self, name: str) -> tuple[Floats, Floats]:
        """Mean and standard deviation of a number before any cut."""
        line = self.given.lines[name]
        return self.open(line.offset), self.open(steady(line))


def solve(block: Block, world: MixedWorld, drawn: Drawn, keep: Sequence[str]) -> Solved:
    """Add up the numbers of a block, give those with values their values, and keep what `keep` and the cells need."""
    outer = block.scope[: block.outer]
    lines: dict[str, Line] = {}
    exact: dict[str, tuple[Floats, Floats]] = {}
    nodes = {node.name: node for node in world.nodes}
    for noise, equation in enumerate(block.equations):
        found = drawn[equation.name]
        assert isinstance(found, Coefficients)
        offset = arranged(found.intercept, equation.axes, outer)
        slopes = np.moveaxis(np.asarray(found.slopes), -2, 0)
        terms: list[tuple[Floats, Line]] = []
        own: tuple[Floats, Floats] | None = None
        for parent, slope in zip(equation.parents, slopes, strict=True):
            arranged_slope = arranged(slope, equation.axes, outer)
            if parent in world.values:
                offset = offset + arranged_slope * world.values[parent]
            else:
                terms.append((arranged_slope, lines[parent]))
                own = exact[parent]
        sd = np.sqrt(arranged(found.variance, equation.axes, outer))
        node = nodes[equation.name]
        assert isinstance(node, Number)
        lines[equation.name] = following(offset, terms, noise, sd)
        if len(terms) == 1 and own is not None and node.regression is None and not np.any(np.asarray(node.variance)):
            exact[equation.name] = offset + terms[0][0] * own[0], terms[0][0] * own[1]
        else:
            exact[equation.name] = np.zeros(1), np.ones(1)
    wanted = {*block.seen, *block.gates, *block.roots, *keep}
    kept = {name: line for name, line in lines.items() if name in wanted}
    values = [(name, world.values[name]) for name in block.seen]
    return Solved(block, given(kept, values), {name: exact[name] for name in kept})


def arranged(array: NDArray[np.float64], axes: Sequence[Axis], scope: Sequence[int]) -> Floats:
    """(parent levels..., draws) as (scope..., draws): the levels left, length 1 where a label is no parent."""
    found = np.asarray(array)
    if found.strides[-1] == 0:
        found = found[..., :1]
    found, labels = restricted(found, axes)
    order = sorted(range(len(labels)), key=lambda axis: scope.index(labels[axis]))
    found = np.transpose(found, (*order, len(labels)))
    shape = dict(zip((labels[axis] for axis in order), found.shape, strict=False))
    return found.reshape((*(shape.get(label, 1) for label in scope), found.shape[-1]))


def restricted(
    array: NDArray[np.float64], axes: Sequence[Axis], bands: Mapping[str, int] | None = None
) -> tuple[Floats, list[int]]:
    """Take away the levels that pins leave out, and the axes of which one level is left; also the labels that remain.

    bands: band of every number with a value, where one is among the axes.
    """
    labels: list[int] = []
    for axis in axes:
        if isinstance(axis.left, tuple):
            if len(axis.left) < array.shape[len(labels)]:
                array = np.take(array, axis.left, axis=len(labels))
            assert axis.label is not None
            labels.append(axis.label)
        else:
            position = axis.left if isinstance(axis.left, int) else (bands or {})[axis.left]
            array = array[(slice(None),) * len(labels) + (position,)]
    return array, labels


def factor(solved: Solved, world: MixedWorld, layout: Layout, finely: bool) -> tuple[Floats, Floats, Floats]:
    """(scope..., draws) natural logs of a block, largest cell of every draw at 0, and what was taken from all of them.

    Third, (draws,) how much of that comes from small probabilities of two numbers in their cells, 0 or less.
    finely: small probabilities of two numbers in their cells have all their digits, too.
    """
    block = solved.block
    needed = None if finely else np.zeros(1, dtype=bool)
    logs = solved.open(solved.given.log_density) + solved.open(EXACTLY * solved.given.certain.astype(np.float64))
    density = logs.reshape(-1, logs.shape[-1]).max(axis=0)
    if block.roots:
        logs = logs + _log_mass(solved, _intervals(solved, world, layout), needed)
    shape = tuple(layout.sizes[label] for label in block.scope)
    flat = np.broadcast_to(logs, (*shape, logs.shape[-1]))
    largest = flat.reshape(-1, flat.shape[-1]).max(axis=0)
    largest = np.where(largest > -np.inf, largest, 0.0)
    sure = solved.open(solved.given.certain.astype(np.float64))
    lifted = EXACTLY * sure.reshape(-1, sure.shape[-1]).max(axis=0)
    rare = largest - np.where(density > -np.inf, density, 0.0) if len(block.gates) > 1 else np.zeros(1)
    return flat - largest, largest - lifted, rare


def gathered(logs: Sequence[Floats], scopes: Sequence[Sequence[int]]) -> tuple[list[Floats], Floats]:
    """Factors by their natural logs, so that those that contradict each other do not underflow before they meet.

    What a factor says of the labels that it shares with a later one, at its likeliest there, is handed on to that one:
    the product of all stays the same. Also the natural log of what was taken from every cell, by draw.
    """
    found, taken = list(logs), np.zeros(1)
    for place, scope in enumerate(scopes):
        later = (other for other in range(place + 1, len(scopes)) if set(scope) & set(scopes[other]))
        to = next(later, None)
        if to is not None and np.any((found[place] < FAINT) & (found[place] > -np.inf)):
            apart = tuple(axis for axis, label in enumerate(scope) if label not in scopes[to])
            best = found[place].max(axis=apart, keepdims=True)
            best = np.where(best > -np.inf, best, 0.0)
            found[place] = found[place] - best
            shared = [label for label in scope if label in scopes[to]]
            handed = np.squeeze(best, axis=apart)
            order = sorted(range(len(shared)), key=lambda axis: scopes[to].index(shared[axis]))
            sizes = {label: handed.shape[axis] for axis, label in enumerate(shared)}
            handed = np.transpose(handed, (*order, len(shared)))
            total = found[to] + handed.reshape((*(sizes.get(label, 1) for label in scopes[to]), handed.shape[-1]))
            largest = total.reshape(-1, total.shape[-1]).max(axis=0)
            largest = np.where(largest > -np.inf, largest, 0.0)
            found[to], taken = total - largest, taken + largest
    return found, taken


def _intervals(solved: Solved, world: MixedWorld, layout: Layout) -> dict[str | None, tuple[Floats, Floats]]:
    """What the cells leave of every root: low and high over (scope..., draws). None: of the constants, in or out."""
    block = solved.block
    bands = {node.name: node.bands for node in world.nodes if isinstance(node, Number)}
    found: dict[str | None, tuple[Floats, Floats]] = {}
    for name, root in block.roots.items():
        ends = (-np.inf, *bands[name], np.inf)
        bottom, top = world.ranges.get(name, (-np.inf, np.inf))
        cells = layout.boxed[name]
        low = np.maximum([ends[first] for first, _ in cells], bottom)
        high = np.minimum([ends[last + 1] for _, last in cells], top)
        shape = [1] * (len(block.scope) + 1)
        if name in layout.labels:
            shape[block.scope.index(layout.labels[name])] = len(cells)
        low, high = low.reshape(shape), high.reshape(shape)
        if root is None:
            constant, slope = solved.open(solved.given.lines[name].offset), np.zeros(1)
        else:
            constant, slope = (solved.open(array) for array in solved.affine[name])
        low, high = back(low, high, constant, slope)
        before = found.get(root, (np.full(1, -np.inf), np.full(1, np.inf)))
        found[root] = np.maximum(low, before[0]), np.minimum(high, before[1])
    return found


def _log_mass(
    solved: Solved, intervals: Mapping[str | None, tuple[Floats, Floats]], needed: NDArray[np.bool_] | None
) -> Floats:
    """Natural log of the probability that every number is in its cell."""
    total: Floats = np.zeros(1)
    if None in intervals:
        low, high = intervals[None]
        total = np.where(low < high, 0.0, -np.inf)
    gates = solved.block.gates
    if gates:
        mean, sd = solved.line(gates[0])
        gate = _gate(solved, gates[0], gates[1], *intervals[gates[1]]) if len(gates) > 1 else None
        total = total + Cut(mean, sd, *intervals[gates[0]], gate).log_mass(needed)
    return total


def mixture(solved: Solved, name: str, shares: Floats, world: MixedWorld, layout: Layout) -> Mixture:
    """The distribution of a number: a part for every cell of `shares`, (scope..., draws)."""
    block = solved.block
    root = layout.roots[name]
    mean, sd = solved.line(name)
    draws = shares.shape[-1]

    def flat(array: Floats) -> Floats:
        return np.broadcast_to(array, (*shares.shape[:-1], draws)).reshape(-1, draws)

    gate, low, high = None, None, None
    intervals = _intervals(solved, world, layout) if block.roots else {}
    for cut in block.gates:
        start, end = intervals[cut]
        if cut == root:
            constant, slope = (solved.open(array) for array in solved.affine[name])
            low, high = (flat(side) for side in forward(start, end, constant, slope))
            continue
        made = _gate(solved, name, cut, start, end)
        gate = Gate(*(flat(side) for side in (made.slope, made.at, made.sd, made.low, made.high)))
    return Mixture(flat(shares), flat(mean), flat(sd), gate, low, high)


def _gate(solved: Solved, name: str, cut: str, low: Floats, high: Floats) -> Gate:
    """Another number of the block as a gate on this one."""
    own, other = solved.given.lines[name], solved.given.lines[cut]
    variance = steady(own) ** 2
    still = variance == 0.0
    lean = np.where(still, 0.0, together(own, other) / np.where(still, 1.0, variance))
    rest = np.where(still, steady(other), apart(other, lean, own))
    return Gate(solved.open(lean), solved.open(other.offset - lean * own.offset), solved.open(rest), low, high)
