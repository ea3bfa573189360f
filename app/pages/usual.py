"""What is usual of a number in the records: where its axis runs, and what its forms begin with."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from app.drawing.scale import round_step
from engine.answering.answer import Marginal
from engine.records.column import Coded

ENDS = (0.01, 0.5, 0.99)


@dataclass(frozen=True)
class Usual:
    """low, middle, high: 1st, 50th and 99th percentile.  step: a shift to begin with, half a standard deviation.

    least, most: of all records, infinite without records.
    """

    low: float
    middle: float
    high: float
    step: float
    least: float = -math.inf
    most: float = math.inf

    def holds(self, value: float) -> bool:
        """Whether the records reach as far as this value."""
        return self.least <= value <= self.most


def usual(coded: Coded | None, column: str, recorded: Marginal) -> Usual:
    """From the records; without them from the marginal as recorded."""
    if coded is not None and column in coded.names:
        values = coded.values[:, coded.numbers.index(coded.names.index(column))]
        low, middle, high = (float(value) for value in np.quantile(values, ENDS))
        return Usual(low, middle, high, round_step(float(values.std()) / 2), float(values.min()), float(values.max()))
    low, middle, high = (recorded.quantile(share) for share in ENDS)
    return Usual(low, middle, high, round_step(recorded.sd / 2))
