"""One tree, two passes: the marginals of every column asked for from one set of tables.

A binary join tree (Shenoy 1997) run by the two-pass scheme of Shafer & Shenoy (1990). Its leaves are the tables,
each inner node contracts two of them and sums out what occurs nowhere else. Inward gives the probability of the
pins; outward gives every marginal, without any division, so that tables may hold zeros.
"""

from __future__ import annotations

import string
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from engine.answering.orders import Scopes, elimination_order

Scope = tuple[int, ...]
Entry = tuple[int, tuple[int, ...], int | None, str]
DRAWS = "Z"  # the letter of the draws' axis; other letters stand for columns
LETTERS = string.ascii_letters.replace(DRAWS, "")
SAFE = 1e-150  # a probability of the pins above this met no cell that mattered below the smallest float


@dataclass(frozen=True)
class Step:
    """Contract tables `left` and `right` (or only sum over `left` when `right` is None) into `out`."""

    left: int
    right: int | None
    out: int

    @property
    def sides(self) -> tuple[int, ...]:
        return (self.left,) if self.right is None else (self.left, self.right)


@dataclass(frozen=True)
class Tree:
    """A plan that holds for every set of tables with the same scopes and sizes.

    scopes: labels of every table, leaves first, then one per step; those summed out first lead, so that what is
    summed over is outermost in memory.  axes: for each leaf, its axes as given in the order of its scope.
    roots: tables left at the end.
    reads: label -> the table whose two messages give its marginal.  wholes: leaves that are read whole.
    outward: tables whose outward message is needed.
    cells: cells touched per draw, inward and outward.  stored: cells kept at once per draw.
    """

    axes: tuple[tuple[int, ...], ...]
    scopes: tuple[Scope, ...]
    steps: tuple[Step, ...]
    roots: tuple[int, ...]
    reads: Mapping[int, int]
    wholes: tuple[int, ...]
    outward: frozenset[int]
    cells: float
    stored: float

    @cached_property
    def programme(self) -> Programme:
        return Programme(self)


def plan(
    scopes: Scopes,
    sizes: Mapping[int, int],
    watched: Sequence[int],
    keep: Sequence[int] = (),
    wholes: Sequence[int] = (),
) -> Tree:
    """Lay out the tree for tables over `scopes`; `sizes` gives the levels of each label.

    watched: labels whose marginals are asked for.  keep: labels left in the root, for one joint table of them.
    wholes: places in `scopes` of tables whose labels are to be read jointly.
    """
    order = elimination_order(scopes, sizes, keep)
    position = {label: turn for turn, label in enumerate((*order, *keep))}
    axes = tuple(tuple(sorted(range(len(scope)), key=lambda axis: position[scope[axis]])) for scope in scopes)
    alive: dict[int, Scope] = {table: tuple(scope[axis] for axis in axes[table]) for table, scope in enumerate(scopes)}
    every: list[Scope] = list(alive.values())
    holders: dict[int, set[int]] = {}
    for table, scope in alive.items():
        for label in scope:
            holders.setdefault(label, set()).add(table)
    steps: list[Step] = []
    kept = frozenset(keep)

    def contract(left: int, right: int | None) -> int:
        pair = {left} if right is None else {left, right}
        union = set(alive[left]).union(alive[right] if right is not None else ())
        stays = [label for label in union if label in kept or holders[label] - pair]
        scope = tuple(sorted(stays, key=position.__getitem__))
        out = len(every)
        for table in pair:
            for label in alive.pop(table):
                holders[label].discard(table)
        for label in scope:
            holders[label].add(out)
        alive[out] = scope
        every.append(scope)
        steps.append(Step(left, right, out))
        return out

    def by_cells(table: int) -> tuple[float, int]:
        return _cells(alive[table], sizes), table

    for label in order:
        while len(holders[label]) > 1:
            left, right = sorted(holders[label], key=by_cells)[:2]
            contract(left, right)
        if holders[label]:
            contract(next(iter(holders[label])), None)
    while kept and len(alive) > 1:
        left, right = sorted(alive, key=by_cells)[:2]
        contract(left, right)
    return _tree(axes, every, steps, tuple(sorted(alive)), sizes, watched, tuple(dict.fromkeys(wholes)))


def _tree(
    axes: tuple[tuple[int, ...], ...],
    scopes: Sequence[Scope],
    steps: Sequence[Step],
    roots: tuple[int, ...],
    sizes: Mapping[int, int],
    watched: Sequence[int],
    wholes: tuple[int, ...],
) -> Tree:
    """Choose where each watched label is read, and which outward messages that needs.

    A label is read where it is summed out: on a side that hears from outside anyway, else on the smaller one.
    """
    wanted = set(watched)
    hearing = set(wholes)  # tables from which something is read, or from what was contracted into them
    outward: set[int] = set()
    reads: dict[int, int] = {}
    cells = 0.0
    for step in steps:
        union = {label for side in step.sides for label in scopes[side]}
        sides = sorted(step.sides, key=lambda side: _cells(scopes[side], sizes))
        needed = hearing.intersection(sides)
        for label in wanted.intersection(union).difference(scopes[step.out]):
            holding = [side for side in sides if label in scopes[side]]
            reads[label] = next((side for side in holding if side in needed), holding[0])
            needed.add(reads[label])
        if needed:
            hearing.add(step.out)
            outward |= needed
        cells += _cells(union, sizes) * (1 + len(needed))
    stored = sum(_cells(scope, sizes) for scope in scopes) + sum(_cells(scopes[table], sizes) for table in outward)
    return Tree(axes, tuple(scopes), tuple(steps), roots, reads, wholes, frozenset(outward), cells, stored)


def _cells(scope: Sequence[int] | set[int], sizes: Mapping[int, int]) -> float:
    cells = 1.0
    for label in scope:
        cells *= sizes[label]
    return cells


@dataclass(frozen=True)
class Read:
    """What running a tree gave.

    log_evidence: (draws,) natural log of the summed total, the probability of the pins; -inf where it is 0.
    marginals: label -> (levels, draws), each draw sums to 1; nan where the pins are impossible.
    joint: (levels of the kept labels in the root's order..., draws), unscaled up to a factor per draw; None without.
    wholes: leaf -> the joint shares of its labels, (levels in the leaf's order as given..., draws).
    """

    log_evidence: np.ndarray
    marginals: Mapping[int, np.ndarray]
    joint: np.ndarray | None = None
    wholes: Mapping[int, np.ndarray] = field(default_factory=dict)


class Programme:
    """A tree's contractions, written out once as subscripts for numpy.einsum.

    Every entry: the table that is made, or read; inward messages and an outward one that go into it; subscripts. An
    outward message that is one everywhere, as at the roots, is left out.
    """

    def __init__(self, tree: Tree) -> None:
        self.tree = tree
        scopes = tree.scopes
        write = _Writer({label for scope in scopes for label in scope})
        self.inward = [
            (step.sides, write([scopes[side] for side in step.sides], scopes[step.out])) for step in tree.steps
        ]
        told: dict[int, Scope] = {}  # table -> scope of its outward message
        self.outward: list[Entry] = []
        for step in reversed(tree.steps):
            above = step.out if step.out in told else None
            for side in step.sides:
                beside = tuple(other for other in step.sides if other != side)
                if side not in tree.outward or (above is None and not beside):
                    continue
                sources = [scopes[other] for other in beside] + ([] if above is None else [told[above]])
                around = set().union(*sources)
                told[side] = tuple([label for label in scopes[side] if label in around])
                self.outward.append((side, beside, above, write(sources, told[side])))

        def read(table: int, scope: Scope) -> Entry:
            if table not in told:
                return table, (table,), None, write([scopes[table]], scope)
            return table, (table,), table, write([scopes[table], told[table]], scope)

        self.reads = [(label, read(table, (label,))) for label, table in tree.reads.items()]
        self.wholes = [
            (read(table, scopes[table]), (*np.argsort(tree.axes[table]).tolist(), len(scopes[table])))
            for table in tree.wholes
        ]

    def run(self, tables: Sequence[np.ndarray], scaled: bool = False) -> Read:
        """Contract `tables`, one per leaf: (levels in the leaf's order..., draws or 1).

        scaled: keep every message at a largest cell of 1 with a running log constant, for pins so improbable that
        plain products would fall below the smallest float. Tried without first; both give the same to rounding.
        """
        found = self._run(tables, scaled)
        if not scaled and not np.all(found.log_evidence > np.log(SAFE)):
            return self._run(tables, scaled=True)
        return found

    def _run(self, tables: Sequence[np.ndarray], scaled: bool) -> Read:
        tree = self.tree
        inward = [
            np.ascontiguousarray(np.transpose(table, (*axes, len(axes))))
            for table, axes in zip(tables, tree.axes, strict=True)
        ]
        log_constant: np.ndarray | float = 0.0
        for sides, subscripts in self.inward:
            message = np.einsum(subscripts, *(inward[side] for side in sides))
            if scaled:
                message, log_scale = _scaled(message)
                log_constant = log_constant + log_scale
            inward.append(message)
        outward: dict[int | None, np.ndarray] = {}

        def made(entry: Entry) -> np.ndarray:
            _, beside, above, subscripts = entry
            sources = [inward[table] for table in beside]
            return np.asarray(np.einsum(subscripts, *sources, *([] if above is None else [outward[above]])))

        for entry in self.outward:
            outward[entry[0]] = _scaled(made(entry))[0] if scaled else made(entry)
        marginals: dict[int, np.ndarray] = {}
        with np.errstate(invalid="ignore", divide="ignore"):
            for label, entry in self.reads:
                belief = made(entry)
                marginals[label] = belief / belief.sum(axis=0)
            wholes: dict[int, np.ndarray] = {}
            for entry, back in self.wholes:
                belief = made(entry)
                total = belief.reshape(-1, belief.shape[-1]).sum(axis=0)
                wholes[entry[0]] = np.transpose(belief / total, back)
            log_total = log_constant
            for root in tree.roots:
                total = inward[root]
                log_total = log_total + np.log(total.reshape(-1, total.shape[-1]).sum(axis=0))
        joint = inward[tree.roots[0]] if len(tree.roots) == 1 else None
        return Read(np.atleast_1d(np.asarray(log_total, dtype=np.float64)), marginals, joint, wholes)


def _scaled(message: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The message with its largest cell at 1 in every draw, and the natural log of what was divided out."""
    largest = message.reshape(-1, message.shape[-1]).max(axis=0)
    divisor = np.where(largest > 0.0, largest, 1.0)
    return message / divisor, np.log(divisor)


class _Writer:
    """Writes contractions as subscripts, every label with the same letter throughout where there are enough."""

    def __init__(self, labels: Iterable[int]) -> None:
        every = sorted(labels)
        self._letters = dict(zip(every, LETTERS, strict=False)) if len(every) <= len(LETTERS) else None
        self._words: dict[Scope, str] = {}

    def __call__(self, sources: Sequence[Scope], out: Scope) -> str:
        letters = self._letters
        if letters is None:
            letters = dict(zip(dict.fromkeys(label for scope in sources for label in scope), LETTERS, strict=False))
            words = ["".join([letters[label] for label in scope]) + DRAWS for scope in (*sources, out)]
        else:
            words = [self._word(scope, letters) for scope in (*sources, out)]
        return ",".join(words[:-1]) + "->" + words[-1]

    def _word(self, scope: Scope, letters: Mapping[int, str]) -> str:
        if scope not in self._words:
            self._words[scope] = "".join([letters[label] for label in scope]) + DRAWS
        return self._words[scope]
