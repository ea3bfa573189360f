"""Sums over all subsets or supersets of every set, in logs.

Scores differ by thousands of nats, more than the range of a float, so sums of powers of e are taken window by window:
within one, all terms fit beside each other. Where there are too many windows each addition is made in logs, which is
slower.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from engine.learning.scores import Floats

WINDOW = 600.0  # nats; e^-600 is still a normal float
MOST_WINDOWS = 6
_NOTHING = -60.0  # natural log of a share that no sum of shares can show


def subset_totals(weights: Floats, still: Callable[[], None] = lambda: None) -> Floats:
    """(columns, sets) natural log of the sum of e^weights over all subsets of each set. Sets are bits."""
    totals = np.empty_like(weights)
    for column, row in enumerate(weights):
        totals[column] = _subset_totals(row)
        still()
    return totals


def _subset_totals(row: Floats) -> Floats:
    finite = np.isfinite(row)
    total = np.full(row.size, -np.inf)
    if not finite.any():
        return total
    top, bottom = row[finite].max(), row[finite].min()
    if top - bottom > WINDOW * MOST_WINDOWS:
        total[:] = row
        for place in range(row.size.bit_length() - 1):
            halves = total.reshape(-1, 2, 1 << place)
            np.logaddexp(halves[:, 1], halves[:, 0], out=halves[:, 1])
        return total
    while top >= bottom:
        inside = finite & (row <= top) & (row > top - WINDOW)
        if inside.any():
            linear = np.zeros(row.size)
            linear[inside] = np.exp(row[inside] - top)
            for place in range(row.size.bit_length() - 1):
                halves = linear.reshape(-1, 2, 1 << place)
                halves[:, 1] += halves[:, 0]
            reached = np.flatnonzero(linear)
            total[reached] = np.logaddexp(total[reached], np.log(linear[reached]) + top)
        top -= WINDOW
    return total


def superset_shares(weights: Floats, around: Floats, totals: Floats) -> Floats:
    """(sets,) e^weights of each set times the sum of e^around over all its supersets.

    totals: natural log of the sum of e^weights over all subsets of each set; around + totals is the log of a share.
    """
    with np.errstate(invalid="ignore"):
        seen = around + totals > _NOTHING
    found = np.zeros(weights.size)
    if not seen.any():
        return found
    families = np.flatnonzero(np.isfinite(weights))
    low, high = totals[seen].min(), totals[seen].max()
    if high - low > WINDOW * MOST_WINDOWS:
        sums = np.where(seen, around, -np.inf)
        for place in range(weights.size.bit_length() - 1):
            halves = sums.reshape(-1, 2, 1 << place)
            np.logaddexp(halves[:, 0], halves[:, 1], out=halves[:, 0])
        found[families] = np.exp(weights[families] + sums[families])
        return found
    while low <= high:
        inside = seen & (totals >= low) & (totals < low + WINDOW)
        if inside.any():  # no family in a set weighs more than the set's total, so neither factor leaves the range
            linear = np.zeros(weights.size)
            linear[inside] = np.exp(around[inside] + low)
            for place in range(weights.size.bit_length() - 1):
                halves = linear.reshape(-1, 2, 1 << place)
                halves[:, 0] += halves[:, 1]
            held = families[linear[families] > 0.0]
            found[held] += np.exp(weights[held] - low) * linear[held]
        low += WINDOW
    return found
