"""A mean over records with its standard error, record by record."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

WIDE = 1.6448536269514722  # standard errors to either side of a 90% interval


@dataclass(frozen=True)
class Gain:
    """A mean difference of log scores per record, nats, with the standard error of that difference."""

    mean: float
    se: float

    @property
    def low(self) -> float:
        """Lower end of the 90% interval."""
        return self.mean - WIDE * self.se

    @property
    def high(self) -> float:
        """Upper end of the 90% interval."""
        return self.mean + WIDE * self.se


def gain(difference: Floats, weights: Floats, group: NDArray[np.integer] | None = None) -> Gain:
    """The weighted mean of `difference` over records, and its standard error (for groups: Liang & Zeger 1986).

    difference, weights: (rows,).  group: (rows,) from 0, which records belong together and count as one.
    """
    mean = float(np.average(difference, weights=weights))
    away = weights * (difference - mean)
    if group is not None:
        away = np.asarray(np.bincount(group, away)[np.unique(group)], dtype=np.float64)
    cases = away.size
    square = float(away @ away) * cases / max(cases - 1, 1)
    return Gain(mean, float(np.sqrt(square) / weights.sum()))
