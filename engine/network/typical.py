"""What is usual in a network with numbers: how common configurations are, and how its numbers lie."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import prod

import numpy as np
from numpy.typing import NDArray

from engine.network.network import Network
from engine.network.rows import Rows
from engine.network.sampling import drawn_rows
from engine.records.column import Coded

Floats = NDArray[np.float64]

INVENTED = 50_000  # rows that stand for a network without records
SEED = 0
TAIL = 0.05  # of the records, left out at either end of a number's reach
SDS = 2.0  # a number's reach without records: so many standard deviations to either side of its mean


@dataclass(frozen=True, eq=False)
class Typical:
    """Rows that stand for all: the records, or invented ones where there are none.

    weights: (rows,) summing to 1.  recorded: whether they are records.
    """

    rows: Rows
    weights: Floats
    recorded: bool

    def joint(self, network: Network, columns: tuple[str, ...]) -> Floats:
        """(levels, or bands, of each column in order...) their joint shares."""
        sizes = _sizes(network, columns)
        at = self.rows.configurations(network, columns)
        return np.asarray(np.bincount(at, self.weights, prod(sizes)).reshape(sizes), dtype=np.float64)

    def mean(self, number: str) -> float:
        """The mean of a number."""
        values = self.rows.values[number]
        return float(values[0] + self.weights @ (values - values[0]))  # the weights' sum is rounded: it may lie far off

    def sd(self, number: str) -> float:
        """The standard deviation of a number."""
        return float(np.sqrt(self.weights @ (self.rows.values[number] - self.mean(number)) ** 2))

    def reach(self, number: str) -> tuple[float, float]:
        """From a low to a high value: the 5th and 95th percentile of the records, else 2 sd on either side."""
        if not self.recorded:
            mean, sd = self.mean(number), self.sd(number)
            return mean - SDS * sd, mean + SDS * sd
        values = self.rows.values[number]
        order = np.argsort(values, kind="stable")
        upto = np.cumsum(self.weights[order])
        low, high = np.searchsorted(upto, [TAIL * upto[-1], (1.0 - TAIL) * upto[-1]])
        return float(values[order[low]]), float(values[order[high]])

    def means(self, network: Network, numbers: Sequence[str], columns: tuple[str, ...]) -> Floats:
        """(levels of each column..., numbers) means in each configuration; those of all rows where none has it."""
        sizes = _sizes(network, columns)
        at, cells = self.rows.configurations(network, columns), prod(sizes)
        common = np.bincount(at, self.weights, cells)
        found = np.empty((cells, len(numbers)))
        for place, number in enumerate(numbers):
            total = np.bincount(at, self.weights * self.rows.values[number], cells)
            overall = np.full(cells, self.mean(number))
            found[:, place] = np.divide(total, common, out=overall, where=common > 0.0)
        return found.reshape(*sizes, len(numbers))


def recorded(coded: Coded) -> Typical:
    """The records themselves, each as heavy as it counts."""
    codes = {name: coded.codes[:, place] for place, name in enumerate(coded.names)}
    values = {coded.names[place]: coded.values[:, at] for at, place in enumerate(coded.numbers)}
    weights = np.asarray(coded.weights, dtype=np.float64)
    return Typical(Rows(len(coded.codes), codes, values), weights / weights.sum(), True)


def invented(network: Network) -> Typical:
    """Rows drawn from the network, always the same."""
    return Typical(drawn_rows(network, INVENTED, SEED), np.full(INVENTED, 1.0 / INVENTED), False)


def _sizes(network: Network, columns: Sequence[str]) -> tuple[int, ...]:
    return tuple(len(network.node(column).levels) for column in columns)
