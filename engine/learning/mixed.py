"""Scores of every family of a table of categories and numbers: counts for the ones, moments for the others."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

from engine.learning.gaussian import coarsened
from engine.learning.scores import SetScores


@dataclass(frozen=True, eq=False)
class MixedScores:
    """A family's score is the difference of two set scores: of counts for a category, of moments for a number.

    categories: every number in a set acts through its bands.  numbers: None when no column is a number.
    held: positions of the numbers.  Both have one grain, so that sums over a graph are exact.
    """

    categories: SetScores
    numbers: SetScores | None = None
    held: frozenset[int] = frozenset()

    @property
    def size(self) -> int:
        """Columns in the largest set."""
        return self.categories.size

    def of(self, child: int) -> SetScores:
        """Whose differences are the scores of the families of that column."""
        return self.numbers if self.numbers is not None and child in self.held else self.categories


FamilyScores = SetScores | MixedScores


def mixed_scores(categories: SetScores, numbers: SetScores | None, held: Collection[int]) -> MixedScores:
    """Both as multiples of the coarser of their grains.  held: positions of the numbers."""
    if numbers is None:
        return MixedScores(categories)
    grain = max(categories.grain, numbers.grain)
    return MixedScores(coarsened(categories, grain), coarsened(numbers, grain), frozenset(held))
