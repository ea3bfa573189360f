"""The slow truth beside unrecorded causes: models of yes/no columns, with the causes in them, case by case.

Every share of a yes is one entry of a vector, and every cell of a joint is a sum of products of them that has each
entry at most once. So a derivative is exact as the difference between the values where the entry is 1 and 0.
"""

import itertools

import numpy as np

from engine.network.network import Category, network

LEVELS = ("no", "yes")
CAUSE_LEVELS = 4  # all as likely


class Tied:
    """columns: parents first.  links: (source, target).  pairs: of columns that share a cause of their own."""

    def __init__(self, columns, links, pairs):
        self.columns, self.links, self.pairs = tuple(columns), tuple(links), tuple(map(tuple, pairs))
        self.parents = {column: [source for source, target in links if target == column] for column in columns}
        self.causes = {column: [i for i, pair in enumerate(self.pairs) if column in pair] for column in columns}
        self.shapes = {
            column: (2,) * len(self.parents[column]) + (CAUSE_LEVELS,) * len(self.causes[column]) for column in columns
        }
        self.size = sum(int(np.prod(shape)) for shape in self.shapes.values())

    def some(self, rng):
        """(entries, 1) shares well inside 0 and 1."""
        return rng.uniform(0.2, 0.8, (self.size, 1))

    def cells(self, shares, levers=None):
        """(2 per column..., models) the joint of what the columns are before levers; children of a lever see it set.

        shares: (entries, models).
        """
        levers = levers or {}
        place = {column: i for i, column in enumerate(self.columns)}
        end = len(self.columns) + len(self.pairs)
        operands, start = [], 0
        for column in self.columns:
            shape = self.shapes[column]
            count = int(np.prod(shape))
            yes = shares[start : start + count].reshape(*shape, -1)
            start += count
            axes = [place[parent] for parent in self.parents[column]]
            axes += [len(self.columns) + i for i in self.causes[column]]
            for parent in self.parents[column]:
                if parent in levers:
                    axis = axes.index(place[parent])
                    yes = np.take(yes, levers[parent], axis=axis)
                    axes.remove(place[parent])
            operands += [np.stack([1.0 - yes, yes]), [place[column], *axes, end]]
        joint = np.einsum(*operands, [*range(len(self.columns)), end], optimize=False)
        return joint / CAUSE_LEVELS ** len(self.pairs)

    def answer(self, shares, outcome, levers, pins=None):
        """(models,) share of a yes in `outcome` among cases with `pins`, where `levers` are set."""
        pins = pins or {}
        joint = self.cells(shares, levers)
        at = tuple(pins.get(column, slice(None)) for column in self.columns)
        left = [column for column in self.columns if column not in pins]
        pinned = joint[at]
        axes = tuple(range(len(left)))
        yes = np.take(pinned, 1, axis=left.index(outcome))
        return yes.sum(axis=axes[:-1]) / pinned.sum(axis=axes)

    def derivative(self, of, shares):
        """(values, entries) of a function, linear in each entry, that takes (entries, models) -> (values, models)."""
        ends = np.repeat(shares, 2 * self.size, axis=1)
        for entry in range(self.size):
            ends[entry, 2 * entry : 2 * entry + 2] = 0.0, 1.0
        values = of(ends).reshape(-1, self.size, 2)
        return values[..., 1] - values[..., 0]

    def unseen_moves(self, shares):
        """(entries, moves) an orthonormal basis of the moves that leave, at first order, all that is seen as it is."""
        _, sizes, turned = np.linalg.svd(self.derivative(self.cells, shares))
        return turned[(sizes > 1e-9).sum() :].T

    def answer_slope(self, shares, outcome, levers, pins=None):
        """(entries,) derivative of the answer; through the two joint shares that it is a ratio of."""

        def both(given):
            joint = self.cells(given, levers)
            at = tuple((pins or {}).get(column, slice(None)) for column in self.columns)
            left = [column for column in self.columns if column not in (pins or {})]
            axes = tuple(range(len(left)))
            yes = np.take(joint[at], 1, axis=left.index(outcome))
            return np.stack([yes.sum(axis=axes[:-1]), joint[at].sum(axis=axes)])

        above, below = both(shares)[:, 0]
        slope_above, slope_below = self.derivative(both, shares)
        return slope_above / below - above * slope_below / below**2

    def alike(self, shares, move):
        """Shares some way along a move, brought back to where all that is seen is the same; None if that fails."""
        seen = self.cells(shares)
        for step in (0.2, 0.1, 0.05):
            found = shares + step * move[:, None]
            for _ in range(12):
                off = (seen - self.cells(found)).reshape(-1)
                if np.abs(off).max() < 1e-13:
                    break
                found = found + np.linalg.lstsq(self.derivative(self.cells, found), off, rcond=1e-9)[0][:, None]
            if np.abs(seen - self.cells(found)).max() < 1e-12 and (found > 0.0).all() and (found < 1.0).all():
                return found
        return None

    def fitted(self, shares):
        """The network of the recorded columns alone that has the same joint: each column given all before it."""
        joint, nodes = self.cells(shares)[..., 0], []
        for count, column in enumerate(self.columns):
            upto = joint.sum(axis=tuple(range(count + 1, len(self.columns))))
            nodes.append(Category(column, LEVELS, self.columns[:count], upto / upto.sum(axis=-1, keepdims=True)))
        return network(nodes)


def graphs(count):
    """Every set of links between `count` columns, each from an earlier to a later one."""
    columns = "abcd"[:count]
    every = list(itertools.combinations(columns, 2))
    for links in itertools.product((False, True), repeat=len(every)):
        yield columns, tuple(link for link, there in zip(every, links, strict=True) if there)
