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
MOST_WINDOWS = 16
_FAR = 50.0  # nats below a sum at which further terms no longer show in it
_NOTHING = -60.0  # natural log of a share that no sum of shares can show


def subset_totals(weights: Floats, still: Callable[[], None] = lambda: None) -> Floats:
    """(columns, sets) natural log of the sum of e^weights over all subsets of each set. Sets are bits.

    A column is never in its own sets: the sets that hold it have the totals of those without it.
    """
    totals = np.empty_like(weights)
    sets = np.arange(weights.shape[1])
    for column, row in enumerate(weights):
        without = np.flatnonzero((sets >> column & 1) == 0)
        totals[column, without] = totals[column, without | 1 << column] = subset_total(row[without])
        still()
    return totals


def over_subsets(values: Floats, combine: np.ufunc) -> Floats:
    """(sets,) `values` of all subsets of each set, combined.

    One place after another; the low places on the transposed table, as many short steps in memory are slow.
    """
    places = values.size.bit_length() - 1
    low = places // 2
    table = np.array(values.reshape(-1, 1 << low).T, order="C")
    for place in range(places):
        if place == low:
            table = np.array(table.T, order="C")
        halves = table.reshape(-1, 2, table.shape[1] << (place if place < low else place - low))
        combine(halves[:, 1], halves[:, 0], out=halves[:, 1])
    return table.reshape(-1)


def subset_total(row: Floats) -> Floats:
    """(sets,) natural log of the sum of e^row over all subsets of each set."""
    finite = np.isfinite(row)
    total = np.full(row.size, -np.inf)
    if not finite.any():
        return total
    top, bottom = row[finite].max(), row[finite].min()
    if top - bottom > WINDOW * MOST_WINDOWS:
        return over_subsets(row, np.logaddexp)
    while top >= bottom:
        inside = finite & (row <= top) & (row > top - WINDOW)
        if inside.any():
            linear = np.zeros(row.size)
            linear[inside] = np.exp(row[inside] - top)
            linear = over_subsets(linear, np.add)
            reached = np.flatnonzero((linear > 0.0) & (total < top + _FAR))
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
        sums = over_subsets(np.where(seen, around, -np.inf)[::-1], np.logaddexp)[::-1]
        found[families] = np.exp(weights[families] + sums[families])
        return found
    while low <= high:
        inside = seen & (totals >= low) & (totals < low + WINDOW)
        if inside.any():  # no family in a set weighs more than the set's total, so neither factor leaves the range
            linear = np.zeros(weights.size)
            linear[inside] = np.exp(around[inside] + low)
            linear = over_subsets(linear[::-1], np.add)[::-1]  # a set's supersets are its complement's subsets
            held = families[linear[families] > 0.0]
            found[held] += np.exp(weights[held] - low) * linear[held]
        low += WINDOW
    return found
