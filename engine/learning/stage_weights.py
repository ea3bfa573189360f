"""What is summed and drawn from inside one stage: the weight of every set of parents of every column."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from engine.learning.lattice import subset_totals
from engine.learning.scores import Floats, Ints


@dataclass(frozen=True, eq=False)
class StageWeights:
    """A stage of `width` columns.

    weights: (width, 2^width) natural log of the summed scores of a column's families with these parents in the stage,
    -inf where not allowed. Sets are bits.  still is called often; raising inside it cancels.
    """

    weights: Floats
    still: Callable[[], None] = lambda: None

    @property
    def width(self) -> int:
        return int(self.weights.shape[0])

    @property
    def everything(self) -> int:
        return (1 << self.width) - 1

    @cached_property
    def totals(self) -> Floats:
        """(width, sets) natural log of the sum over all parent sets within a set."""
        return subset_totals(self.weights, self.still)

    @cached_property
    def families(self) -> tuple[Ints, ...]:
        """The sets of parents that each column may have."""
        return tuple(np.flatnonzero(np.isfinite(row)) for row in self.weights)
