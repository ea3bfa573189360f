"""Does what is said come true: tenths of the records, Wilson intervals, the Brier score and its parts."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.records.intervals import wilson

Floats = NDArray[np.float64]

TENTHS = 10
COVERAGE = 0.99  # of each tenth's interval, so that all ten hold together in at least 90 of 100 (Bonferroni)


@dataclass(frozen=True)
class Tenth:
    """Some of the records: what was said of them, what was seen, and within what that may be by chance.

    said, seen, low, high: shares, 0 to 1; low to high is the Wilson interval of `seen`.  records: how many.
    """

    said: float
    seen: float
    low: float
    high: float
    records: int

    @property
    def agrees(self) -> bool:
        """Whether said and seen differ by no more than chance allows."""
        return self.low <= self.said <= self.high


@dataclass(frozen=True)
class Brier:
    """The Brier score, the mean squared difference between what was said and what happened, and its parts.

    score = reliability - resolution + uncertainty + within (Murphy 1973); `within` is what is said differently inside
    a group of records (Stephenson, Coelho & Jolliffe 2008), 0 where a group holds one forecast.
    """

    score: float
    reliability: float
    resolution: float
    uncertainty: float
    within: float


def brier(
    said: Floats, happened: Floats, weights: Floats | None = None, groups: NDArray[np.integer] | None = None
) -> Brier:
    """The score and its parts.  said: (rows,) shares.  happened: (rows,) 0 or 1.

    groups: (rows,) from 0, which records are taken together; None: those of equal forecasts.
    """
    weight = np.ones(len(said)) if weights is None else weights
    together = np.unique(said, return_inverse=True)[1].ravel() if groups is None else groups
    size = np.bincount(together, weight)
    held = size > 0.0
    means = [np.bincount(together, weight * each)[held] / size[held] for each in (said, happened)]
    share = size[held] / size.sum()
    base = float(np.average(happened, weights=weight))
    score = float(np.average((said - happened) ** 2, weights=weight))
    reliability = float(share @ (means[0] - means[1]) ** 2)
    resolution = float(share @ (means[1] - base) ** 2)
    uncertainty = base * (1.0 - base)
    return Brier(score, reliability, resolution, uncertainty, score - (reliability - resolution + uncertainty))


def in_tenths(said: Floats, rng: np.random.Generator) -> NDArray[np.int64]:
    """(rows,) 0 to 9: ten parts of about equally many records, from the least said to the most; ties by lot.

    By lot, for the sequence of the records may follow what happened.
    """
    rows = len(said)
    rank = np.empty(rows, dtype=np.int64)
    rank[np.lexsort((rng.random(rows), said))] = np.arange(rows)
    return np.asarray(rank * TENTHS // max(rows, 1), dtype=np.int64)


def tenths(said: Floats, happened: Floats, weights: Floats, part: NDArray[np.int64]) -> tuple[Tenth, ...]:
    """What was said and what was seen in each part; parts without records are left out."""
    found = []
    for each in range(TENTHS):
        rows = np.flatnonzero(part == each)
        if rows.size:
            worth = float(weights[rows].sum())
            seen = float(weights[rows] @ happened[rows])
            low, high = wilson(seen, worth, COVERAGE)
            mean = float(np.average(said[rows], weights=weights[rows]))
            found.append(Tenth(mean, seen / worth, low, high, int(rows.size)))
    return tuple(found)


def spread(below: Floats, weights: Floats) -> tuple[Tenth, ...]:
    """Shares of the records in each tenth of what was foreseen for them (probability integral transform, Dawid 1984).

    below: (rows,) how much of what was foreseen lies below what was recorded. Each tenth should hold a tenth.
    """
    part = np.minimum((below * TENTHS).astype(np.int64), TENTHS - 1)
    worth = float(weights.sum())
    held = np.bincount(part, weights, TENTHS)
    records = np.bincount(part, minlength=TENTHS)
    ends = [wilson(float(each), worth, COVERAGE) for each in held]
    return tuple(
        Tenth(1.0 / TENTHS, float(held[each] / worth), *ends[each], int(records[each])) for each in range(TENTHS)
    )
