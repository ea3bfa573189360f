"""How far learning is: a fraction by a rough estimate of the seconds of each step, and words."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import comb

from engine.learning.families import Candidates
from engine.learning.layers import WIDEST_LAYERED
from engine.records.counts import ArrayCounts
from engine.records.moments import ArrayMoments

Progress = Callable[[float, str], None]


LOOKING = 0.2  # the most that looking at numbers takes of all, where many are recorded coarsely
LOOK = "Looking at how each number varies"


class Looking:
    """Tells `progress` of what comes before the records are coded, and of the rest from there on."""

    def __init__(self, progress: Progress | None) -> None:
        self.progress = progress
        self.fraction = 0.0

    def within(self, part: float) -> None:
        """`part` of the looking is done."""
        if self.progress is not None:
            self.fraction = max(self.fraction, LOOKING * part)
            self.progress(self.fraction, LOOK)

    def after(self, fraction: float, words: str) -> None:
        """`fraction` of what follows is done."""
        if self.progress is not None:
            self.progress(self.fraction + (1.0 - self.fraction) * fraction, words)


class Saying:
    """Tells `progress` of every step; raising in there cancels.

    counts, moments: what is learned from; they tell their own cost.
    """

    def __init__(
        self,
        progress: Progress | None,
        counts: ArrayCounts,
        moments: ArrayMoments | None,
        stages: Sequence[Sequence[Candidates]],
        max_parents: int,
    ) -> None:
        self.progress = progress
        columns = len(counts.levels)
        size = min(max_parents + 1, columns)
        parts = counts.folds if counts.folds > 1 else 0
        thousands = max(1.0, counts.rows / 1_000)
        counting = counts.seconds(size) * (2.0 if parts else 1.5)
        summing = [] if moments is None else [moments.seconds(size)]
        families = 1e-6 * columns * comb(columns, size - 1)
        searching = sum(len(stage) * 2.0 ** len(stage) * columns * 2e-8 for stage in stages) + families
        scoring = 0.001 * columns * max_parents + 1.5e-4 * columns * thousands
        if moments is not None:
            scoring += len(moments.numbers.columns) * max_parents * (0.0015 + 0.0001 * thousands)
        weighing = sum(_weighing(len(stage)) for stage in stages) + families
        trying = 0.002 * columns * min(thousands, 5.0)
        self.steps = [counting, *summing, searching, weighing, *[searching + scoring] * parts, trying]
        self.at = -1
        self.words = ""
        self.fraction = 0.0

    def begin(self, words: str) -> None:
        self.at += 1
        self.words = words
        self.within(0.0)

    def within(self, part: float) -> None:
        """`part` of the present step is done."""
        done = sum(self.steps[: self.at]) + min(part, 1.0) * self.steps[self.at]
        self.fraction = min(max(done / sum(self.steps), self.fraction), 1.0)
        self.still()

    def expect_of_last(self, seconds: float) -> None:
        """The last step takes about so long."""
        self.steps[-1] = seconds

    def still(self) -> None:
        """No further yet, but a chance to cancel."""
        if self.progress is not None:
            self.progress(self.fraction, self.words)

    def finish(self) -> None:
        self.fraction, self.words = 1.0, "Done"
        self.still()


def _weighing(width: int) -> float:
    """Roughly how long a stage of `width` columns takes to weigh, with graphs drawn."""
    sums = 1.7e-6 * width * 3.0**width if width <= WIDEST_LAYERED else 1.6e-7 * width * 2.0**width
    return sums + 0.012 * width
