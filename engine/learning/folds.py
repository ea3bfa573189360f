"""Which part of the records holds each of them out of learning."""

from __future__ import annotations

from heapq import heapify, heapreplace

import numpy as np
from numpy.typing import NDArray

FOLDS = 5

Ints = NDArray[np.int64]


def folds(rows: int, seed: int, group: NDArray[np.integer] | None = None) -> Ints:
    """(rows,) which of FOLDS parts holds each record out, at random, as even as can be.

    group: (rows,) from 0, which records belong together; they are held out together, the largest groups dealt first,
    each to the part with the fewest records.
    """
    rng = np.random.default_rng([seed, FOLDS])
    if group is None:
        return rng.permutation(np.arange(rows, dtype=np.int64) % FOLDS)
    sizes = np.bincount(group)
    shuffled = rng.permutation(sizes.size)
    dealt = shuffled[np.argsort(-sizes[shuffled], kind="stable")]
    part = np.zeros(sizes.size, dtype=np.int64)
    held = [(0, fold) for fold in range(FOLDS)]  # records of each part
    heapify(held)
    for each in dealt.tolist():
        records, fold = held[0]
        part[each] = fold
        heapreplace(held, (records + int(sizes[each]), fold))
    return np.asarray(part[group])
