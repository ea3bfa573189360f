"""Tables that know which column each axis is: multiplied, summed and divided, draw by draw."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.refusal import Refusal

MOST = 2e7  # cells times draws of one table, 160 MB


@dataclass(frozen=True, eq=False)
class Factor:
    """values: (levels of each of `columns`..., draws); one draw serves for all where nothing is drawn."""

    columns: tuple[str, ...]
    values: np.ndarray

    @property
    def sizes(self) -> dict[str, int]:
        return dict(zip(self.columns, self.values.shape, strict=False))

    def taken(self, positions: Mapping[str, NDArray[np.intp]]) -> Factor:
        """Only these levels of the columns named; axes stay."""
        values = self.values
        for axis, column in enumerate(self.columns):
            if column in positions:
                values = np.take(values, positions[column], axis=axis)
        return Factor(self.columns, values)

    def without(self, columns: Iterable[str]) -> Factor:
        """Axes of one level taken off."""
        off = [axis for axis, column in enumerate(self.columns) if column in set(columns)]
        left = tuple(column for axis, column in enumerate(self.columns) if axis not in off)
        return Factor(left, np.squeeze(self.values, axis=tuple(off)))

    def along(self, columns: Sequence[str]) -> np.ndarray:
        """values with an axis for each of `columns` in turn, of one level where the factor does not depend on it."""
        held = [column for column in columns if column in self.columns]
        turned = np.transpose(self.values, [*map(self.columns.index, held), self.values.ndim - 1])
        sizes = iter(turned.shape)
        return turned.reshape([*(next(sizes) if column in held else 1 for column in columns), turned.shape[-1]])


def multiplied(factors: Sequence[Factor], over: Iterable[str] = ()) -> Factor:
    """The product of factors, summed over columns.

    Raises Refusal for more than MOST cells times draws before the sum.
    """
    gone = set(over)
    sizes = {column: size for factor in factors for column, size in factor.sizes.items()}
    draws = max((factor.values.shape[-1] for factor in factors), default=1)
    if np.prod([float(size) for size in sizes.values()]) * draws > MOST:
        raise Refusal(
            "With unrecorded causes the answer to this question has to hold too many combinations of levels at once.",
            where=", ".join(sizes),
            do="Give the columns of this question fewer levels or bands, or pin some of them.",
        )
    left = tuple(column for column in sizes if column not in gone)
    label = {column: place for place, column in enumerate(sizes)}
    end = len(label)
    operands: list[object] = []
    for factor in factors:
        operands += [factor.values, [*(label[column] for column in factor.columns), end]]
    if not operands:
        return Factor((), np.ones(1))
    values = np.einsum(*operands, [*(label[column] for column in left), end])  # type: ignore[call-overload]
    return Factor(left, np.asarray(values))


def eliminated(factors: Iterable[Factor], over: Iterable[str]) -> list[Factor]:
    """Factors whose product is that of the given ones summed over columns, the cheapest column first."""
    left, waiting = list(factors), set(over)
    while waiting:
        costs = {column: _cells(left, column) for column in sorted(waiting)}
        column = min(costs, key=lambda name: costs[name])
        holding = [factor for factor in left if column in factor.columns]
        left = [factor for factor in left if column not in factor.columns]
        left.append(multiplied(holding, [column]))
        waiting.remove(column)
    return left


def divided(above: Factor, below: Factor) -> Factor:
    """One factor by another; 0 where both are 0, since nobody is there."""
    columns = (*above.columns, *(column for column in below.columns if column not in above.columns))
    top, bottom = np.broadcast_arrays(above.along(columns), below.along(columns))
    return Factor(columns, np.divide(top, bottom, out=np.zeros(top.shape), where=bottom > 0.0))


def _cells(factors: Sequence[Factor], column: str) -> float:
    """Of the table that summing over a column takes."""
    sizes: dict[str, int] = {}
    for factor in factors:
        if column in factor.columns:
            sizes |= factor.sizes
    return float(np.prod([float(size) for size in sizes.values()]))
