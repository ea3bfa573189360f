"""What grouped records are worth as separate cases: how alike the records of a group are, and the design effect."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Mapping
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
    alike: column -> its intraclass correlation, at most 1; under 0 where groups differ less than by chance. A column
    that never varies, and one of which nothing can be said, is not there.
    """

    groups: int
    size: float
    alike: Mapping[str, float]

    @property
    def same(self) -> tuple[str, ...]:
        """Columns that never vary inside a group."""
        return tuple(name for name, each in self.alike.items() if each >= 1.0 - 1e-9)

    def correlation(
        self, names: Collection[str] | None = None, linked: Callable[[str, str], bool] = lambda one, other: True
    ) -> float:
        """The correlation that the records count by when the columns `names` are learned together, 0 to 1.

        names: None for all.  linked: whether two columns may be parent and child, either way round.

        Groups of size m raise the variance of the coefficient of x in a model of y by 1 + (m - 1) r_x r_y (Kish 1965
        for means; Moulton 1990 for coefficients): in full where both are the same all through a group, and not at all
        where one of them varies as if there were no groups. So it takes a pair to make links falsely certain, and one
        alike pair is enough, however many other columns there are. Of every pair that may be linked, the lesser of
        the two is at least their product, and is what a share of that column needs; the largest of these serves all
        counts, since they belong to all columns together. Columns without a pair are only told the shares of: then
        the largest of all.
        """
        found = sorted(
            ((each, name) for name, each in self.alike.items() if names is None or name in names), reverse=True
        )
        for place, (lesser, name) in enumerate(found):
            if any(linked(other, name) for _, other in found[:place]):
                return max(0.0, lesser)
        return max(0.0, found[0][0]) if found else 0.0

    def factor(
        self, names: Collection[str] | None = None, linked: Callable[[str, str], bool] = lambda one, other: True
    ) -> float:
        """What the effective number of records is divided by: 1 + (size - 1) x `correlation`, at least 1."""
        return 1.0 + (self.size - 1.0) * self.correlation(names, linked)


def design_effect(group: Ints, weights: Floats, columns: Iterable[Column]) -> DesignEffect:
    """The design effect of `group`, (rows,) 0 to groups - 1.

    weights: (rows,) over 0, of any sum.  columns: those that a model may be learned from, of the same rows.
    The size is the sum of squared group weights by the sum of squared weights (Gabler, Häder & Lahiri 1999), which for
    equal weights is Kish's sum of squared sizes by the sum of sizes.
    """
    together = np.bincount(group, weights)
    size = float((together**2).sum() / (weights**2).sum())
    found = {column.name: alike(group, column) for column in columns}
    correlations = {name: each for name, each in found.items() if each is not None}
    return DesignEffect(int(together.size), max(1.0, size), correlations)


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
