"""The figures behind a sentence: the share in question in every world, its interval, and the changes between worlds."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from app.wording.figures import CERTAIN, Change
from engine.answering.answer import Marginal, Reading, spread

COVERAGE = 0.90


@dataclass(frozen=True)
class Estimate:
    """A share with its interval, all 0 to 1; low equals high where the tables are known exactly."""

    share: float
    low: float
    high: float

    @property
    def known(self) -> bool:
        return self.low == self.high


@dataclass(frozen=True)
class Estimates:
    """Shares of the levels in question.

    gap: from as recorded to among these.  change: from among these to if set; None without levers.
    """

    recorded: Estimate
    among: Estimate
    gap: Change
    set: Estimate | None = None
    had: Estimate | None = None
    change: Change | None = None


def estimates(reading: Reading, wanted: Iterable[str]) -> Estimates:
    """The share of the `wanted` levels, taken together, in every world of `reading`."""
    levels = tuple(wanted)
    return Estimates(
        recorded=_estimate(reading.recorded, levels),
        among=_estimate(reading.among, levels),
        gap=_change(reading.recorded, reading.among, levels),
        set=None if reading.set is None else _estimate(reading.set, levels),
        had=None if reading.had is None else _estimate(reading.had, levels),
        change=None if reading.set is None else _change(reading.among, reading.set, levels),
    )


def level_estimates(marginal: Marginal) -> list[Estimate]:
    """Every level of a column in one world."""
    if marginal.draws.shape[-1] == 0:
        return [Estimate(float(part), float(part), float(part)) for part in marginal.point]
    tail = (1.0 - COVERAGE) / 2.0
    lows, highs = np.quantile(marginal.draws, [tail, 1.0 - tail], axis=-1)
    return [Estimate(*map(float, each)) for each in zip(marginal.point, lows, highs, strict=True)]


def _estimate(marginal: Marginal, levels: tuple[str, ...]) -> Estimate:
    return Estimate(marginal.share(levels), *marginal.interval(levels, COVERAGE))


def _change(start: Marginal, end: Marginal, levels: tuple[str, ...]) -> Change:
    """Draws of both worlds are common, so that their difference is the change in each draw.

    A change that is as small as the rounding of sums in every draw is none.
    """
    before, after = start.share(levels), end.share(levels)
    difference = end.share_draws(levels) - start.share_draws(levels)
    if max(abs(after - before), np.abs(difference).max(initial=0.0)) <= CERTAIN:
        return Change(before, before, 0.0, 0.0)
    return Change(before, after, *spread(difference, after - before, COVERAGE))
