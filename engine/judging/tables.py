"""Tables seen against tables foreseen: the G statistic, and which of many are more than chance."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaincc, xlogy

Floats = NDArray[np.float64]

_ROUNDS = 200
_CLOSE = 1e-10  # of the records: how near the margins must come


def raked(table: Floats, target: Floats, margins: Sequence[tuple[int, ...]]) -> Floats:
    """`table` with those margins of `target` and its own association (iterative proportional fitting, Deming & Stephan
    1940).  margins: the axes that each of them keeps."""
    found = np.array(table, dtype=np.float64)
    for _ in range(_ROUNDS):
        furthest = 0.0
        for kept in margins:
            others = tuple(axis for axis in range(found.ndim) if axis not in kept)
            have, want = found.sum(axis=others, keepdims=True), target.sum(axis=others, keepdims=True)
            furthest = max(furthest, float(np.abs(have - want).max()))
            found *= np.divide(want, have, out=np.zeros_like(have), where=have > 0.0)
        if furthest <= _CLOSE * target.sum():
            break
    return found


def departure(seen: Floats, foreseen: Floats, invented: float = np.inf) -> tuple[float, int, float]:
    """How far an association seen is from the one foreseen: the G statistic, its degrees of freedom, and its p value.

    seen: (levels, ...) sums of records.  foreseen: the same shape, on any scale, above 0 where something was seen. All
    margins but the association of every axis at once are taken as seen, so that only that is judged.
    invented: rows that `foreseen` was counted from; their own noise is allowed for.
    """
    axes = range(seen.ndim)
    expected = raked(foreseen, seen, list(combinations(axes, seen.ndim - 1)))
    statistic = 2.0 * float((xlogy(seen, seen) - xlogy(seen, np.where(expected > 0.0, expected, 1.0))).sum())
    statistic = max(statistic, 0.0) / (1.0 + float(seen.sum()) / invented)
    freedom = 1
    for axis in axes:
        held = seen.sum(axis=tuple(other for other in axes if other != axis)) > 0.0
        freedom *= int(held.sum()) - 1
    return statistic, freedom, float(gammaincc(0.5 * freedom, 0.5 * statistic)) if freedom > 0 else 1.0


def false_discovery(chances: Sequence[float]) -> Floats:
    """(tests,) the smallest false discovery rate at which each p value is a discovery (Benjamini & Hochberg 1995)."""
    p = np.asarray(chances, dtype=np.float64)
    falling = np.argsort(-p, kind="stable")
    ranks = np.arange(p.size, 0, -1)
    found = np.empty(p.size)
    found[falling] = np.minimum(np.minimum.accumulate(p[falling] * p.size / ranks), 1.0)
    return found
