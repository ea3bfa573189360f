"""What grouped records are worth as separate cases: how alike the records of a group are, and the design effect."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.records.column import Column

Ints = NDArray[np.integer]
Floats = NDArray[np.float64]


@dataclass(frozen=True)
class DesignEffect:
    """How far groups lower the effective number of records.

    groups: how many there are.  size: the mean size of the group that a record finds itself in, by weight, at least 1.
    alike: the mean intraclass correlation of the columns, at most 1; under 0 where groups differ less than by chance.
    same: columns that never vary inside a group.
    """

    groups: int
    size: float
    alike: float
    same: tuple[str, ...] = ()

    @property
    def factor(self) -> float:
        """What the effective number of records is divided by: 1 + (size - 1) x alike (Kish 1965), at least 1."""
        return max(1.0, 1.0 + (self.size - 1.0) * self.alike)


def design_effect(group: Ints, weights: Floats, columns: Iterable[Column]) -> DesignEffect:
    """The design effect of `group`, (rows,) 0 to groups - 1, for tables that are learned from as a whole.

    weights: (rows,) over 0, of any sum.  columns: those that a model may be learned from, of the same rows.
    The counts of a table belong to all of its columns together, so one factor serves them all, and the correlation in
    it is the mean over the columns: one column that never varies inside a group does not by itself make a case of each
    group. The size is the sum of squared group weights by the sum of squared weights (Gabler, Häder & Lahiri 1999),
    which for equal weights is Kish's sum of squared sizes by the sum of sizes.
    """
    together = np.bincount(group, weights)
    size = float((together**2).sum() / (weights**2).sum())
    found = {column.name: alike(group, column) for column in columns}
    correlations = {name: each for name, each in found.items() if each is not None}
    mean = float(np.mean(list(correlations.values()))) if correlations else 0.0
    same = tuple(name for name, each in correlations.items() if each >= 1.0 - 1e-9)
    return DesignEffect(int(together.size), max(1.0, size), mean, same)


def alike(group: Ints, column: Column) -> float | None:
    """The intraclass correlation of one column, as `intraclass` finds it; a blank in a number is passed over."""
    if column.kind == "number" and column.values is not None:
        seen = ~np.isnan(column.values)
        return intraclass(group[seen], column.values[seen])
    return intraclass(group, levels=column.codes)


def intraclass(group: Ints, values: Floats | None = None, levels: Ints | None = None) -> float | None:
    """The correlation of two records of one group, by analysis of variance (Donner 1986): at most 1, under 0 by chance.

    group: (rows,) whole numbers from 0; some may have no row.  values: (rows,) finite, or levels: (rows,) positions.
    Of levels, the squares of all their indicators are summed first, so that which level comes first does not matter.
    None where nothing varies, where there is a single group, and where no group has two rows.
    """
    sizes = np.bincount(group)
    sizes, place = sizes[sizes > 0], (np.cumsum(sizes > 0) - 1)[group]
    rows, groups = int(group.size), int(sizes.size)
    if groups < 2 or rows == groups:
        return None
    if values is not None:
        spread = float(values.std())
        if spread == 0.0 or not np.isfinite(spread):
            return None
        standard = (values - values.mean()) / spread
        total = float((standard**2).sum())
        between = float((np.bincount(place, standard) ** 2 / sizes).sum())
    else:
        assert levels is not None
        many = int(levels.max()) + 1
        cell, counts = np.unique(place * many + levels, return_counts=True)
        chance = float((np.bincount(levels).astype(np.float64) ** 2).sum()) / rows
        total = rows - chance
        between = float((counts.astype(np.float64) ** 2 / sizes[cell // many]).sum()) - chance
        if total <= 0.0:
            return None
    within = max(0.0, total - between) / (rows - groups)
    mean_between = between / (groups - 1)
    usual = (rows - float((sizes.astype(np.float64) ** 2).sum()) / rows) / (groups - 1)
    over = mean_between + (usual - 1.0) * within
    return min(1.0, (mean_between - within) / over) if over > 0.0 else None
