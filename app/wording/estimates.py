"""The figures behind a sentence: the share or mean in question in every world, its interval, the changes between."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np

from app.wording.figures import CERTAIN, Change, share, span
from app.wording.numbers import CERTAIN as STILL
from app.wording.numbers import Move, amount, decimals_for
from engine.answering.answer import Marginal, Reading, spread

COVERAGE = 0.90
WITHIN = "within this model"  # of an interval, until the one over sampled models is ready
OVER = "90% interval"  # of one over sampled models


@dataclass(frozen=True)
class Estimate:
    """A share, 0 to 1, or a number's mean, with its interval; low equals high where the model is known exactly.

    inner: the interval within the accepted model, where low and high are over sampled models; else None.
    """

    point: float
    low: float
    high: float
    inner: tuple[float, float] | None = None

    @property
    def known(self) -> bool:
        return self.low == self.high


@dataclass(frozen=True)
class Estimates:
    """Shares of the levels in question; of a number its means.

    gap: from as recorded to among these.  change: from among these to if set; None without levers.
    decimals: of a mean; None for shares.  doubted: whether the intervals are over sampled models.
    unit: of the number, which its figures leave to the sentence.
    """

    recorded: Estimate
    among: Estimate
    gap: Change | Move
    set: Estimate | None = None
    had: Estimate | None = None
    change: Change | Move | None = None
    decimals: int | None = None
    doubted: bool = False
    unit: str = ""

    @property
    def interval(self) -> str:
        """What the intervals are, in words."""
        return OVER if self.doubted else WITHIN

    @property
    def of_a_number(self) -> bool:
        return self.decimals is not None

    def figure(self, estimate: Estimate, decimals: int | None = None) -> str:
        """The estimate in words; decimals: others than are usual here."""
        if self.decimals is None:
            return share(estimate.point, decimals or 0)
        return amount(estimate.point, self.decimals if decimals is None else decimals)

    def span(self, estimate: Estimate, decimals: int | None = None) -> str:
        """Its interval in words."""
        if self.decimals is None:
            return span(estimate.low, estimate.high, decimals or 0)
        told = self.decimals if decimals is None else decimals
        return f"{amount(estimate.low, told)} to {amount(estimate.high, told)}"


def estimates(reading: Reading, wanted: Iterable[str], within: Reading | None = None) -> Estimates:
    """The share of the `wanted` levels, taken together, in every world of `reading`; of none of them: the mean.

    within: the reading within the accepted model, where `reading` is over sampled models.
    """
    levels = tuple(wanted)
    if not levels:
        found = _means(reading)
        return found if within is None else _with_inner(found, _means(within))
    found = Estimates(
        recorded=_estimate(reading.recorded, levels),
        among=_estimate(reading.among, levels),
        gap=_change(reading.recorded, reading.among, levels),
        set=None if reading.set is None else _estimate(reading.set, levels),
        had=None if reading.had is None else _estimate(reading.had, levels),
        change=None if reading.set is None else _change(reading.among, reading.set, levels),
    )
    return found if within is None else _with_inner(found, estimates(within, levels))


def _with_inner(found: Estimates, within: Estimates) -> Estimates:
    """The same over sampled models, with the narrower intervals inside."""
    return replace(
        found,
        recorded=_around(found.recorded, within.recorded),
        among=_around(found.among, within.among),
        set=None if found.set is None or within.set is None else _around(found.set, within.set),
        doubted=True,
    )


def _around(estimate: Estimate, within: Estimate) -> Estimate:
    """The narrower interval is told as far as it lies inside: from so many draws its ends are not sure to a hair."""
    low, high = estimate.low, estimate.high
    return replace(estimate, inner=(min(max(within.low, low), high), min(max(within.high, low), high)))


def _means(reading: Reading) -> Estimates:
    spread_of = reading.recorded.sd
    recorded, among = _mean(reading.recorded), _mean(reading.among)
    after = None if reading.set is None else _mean(reading.set)
    gap = _move(reading.recorded, reading.among, spread_of)
    change = None if reading.set is None else _move(reading.among, reading.set, spread_of)
    moved = [move for move in (change, gap) if move is not None and not move.still]
    base = moved[0].decimals if moved else decimals_for(recorded.high - recorded.low, spread_of)
    return Estimates(recorded, among, gap, after, None if reading.had is None else _mean(reading.had), change, base)


def _mean(marginal: Marginal) -> Estimate:
    return Estimate(marginal.mean, *marginal.interval(None, COVERAGE))


def _draws(marginal: Marginal) -> np.ndarray:
    """(draws,) the mean of a number in each draw."""
    assert marginal.mean_draws is not None
    return marginal.mean_draws


def _move(start: Marginal, end: Marginal, spread_of: float) -> Move:
    """As `_change`, for means. spread_of: the standard deviation of the values as recorded."""
    before, after = start.mean, end.mean
    difference = _draws(end) - _draws(start)
    if max(abs(after - before), np.abs(difference).max(initial=0.0)) <= STILL * max(spread_of, abs(before)):
        return Move(before, before, 0.0, 0.0, decimals_for(0.0, spread_of))
    low, high = spread(difference, after - before, COVERAGE)
    if high - low <= STILL * spread_of:  # a shift moves its own number by as much in every draw
        low = high = after - before
    return Move(before, after, low, high, decimals_for(high - low, spread_of))


def level_estimates(marginal: Marginal, within: Marginal | None = None) -> list[Estimate]:
    """Every level of a column in one world.  within: as for `estimates`."""
    if within is not None:
        inside = level_estimates(within)
        return [_around(each, inner) for each, inner in zip(level_estimates(marginal), inside, strict=True)]
    if marginal.draws.shape[-1] == 0:
        return [Estimate(float(part), float(part), float(part)) for part in marginal.point]
    tail = (1.0 - COVERAGE) / 2.0
    lows, highs = np.quantile(marginal.draws, [tail, 1.0 - tail], axis=-1)
    ends = zip(marginal.point, lows, highs, strict=True)
    return [Estimate(float(point), float(low), float(high)) for point, low, high in ends]


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
