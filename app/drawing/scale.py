"""A graduated axis: where a value stands on it, and where its ticks and figures are."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

from engine.records.bands import YEARS
from engine.records.wording import figure

FINE = {"1": 10, "2": 4, "5": 5}  # ticks to a step, by its first digit
NEAR, TINY = 1e-9, 1e-100
FIGURES = 5  # at least so many steps where the ends are rounded outward


@dataclass(frozen=True)
class Tick:
    """A tick of the rule. place: 0 to 1.  rank: 0 the longest, with a figure; 2 the shortest."""

    place: float
    rank: int
    words: str = ""


@dataclass(frozen=True)
class Scale:
    """An axis from `first` to `last` steps, with a figure at each of them.

    step: in the unit of the values.  fine: ticks to a step; where they are even the middle one is longer.
    times: what figures are told in; sign: of the last, and of the first when it is 0.
    behind: what follows the last figure alone.
    """

    first: int
    last: int
    step: float
    fine: int = 10
    times: float = 1.0
    sign: str = ""
    behind: str = ""

    @property
    def low(self) -> float:
        return self.first * self.step

    @property
    def high(self) -> float:
        return self.last * self.step

    def place(self, value: float) -> float:
        """Where a value stands, 0 to 1; what lies beyond an end is drawn there."""
        return min(max((value - self.low) / (self.high - self.low), 0.0), 1.0)

    def ticks(self) -> list[Tick]:
        """Ticks from first to last."""
        found = []
        years = self.step >= 1 and YEARS[0] <= self.low and self.high <= YEARS[1]
        for count in range(self.first * self.fine, self.last * self.fine + 1):
            place = (count - self.first * self.fine) / ((self.last - self.first) * self.fine)
            half = self.fine % 2 == 0 and count % (self.fine // 2) == 0
            if count % self.fine:
                found.append(Tick(place, 1 if half else 2))
                continue
            whole = count // self.fine
            sign = self.sign if whole == self.last or (whole == self.first and not whole) else ""
            sign += self.behind if whole == self.last else ""
            found.append(Tick(place, 0, f"{figure(_exact(whole, self.step * self.times), commas=not years)}{sign}"))
        return found


PER_CENT = Scale(0, 10, 0.1, 10, 100.0, "%")


def rounded_outward(low: float, high: float, also: Iterable[float] = (), behind: str = "") -> Scale:
    """An axis over low to high and everything in `also`, its ends on round numbers; `behind` follows its last figure.

    A step is 1, 2 or 5 of a power of ten, the widest that leaves FIGURES of them.
    """
    low, high = min(low, high, *also), max(low, high, *also)
    size = max(abs(low), abs(high))
    if high - low <= NEAR * size or size < TINY:  # ticks between could not be told apart
        room = size / 10 if size >= TINY else 1.0
        low, high = low - room, high + room
    step = round_step((high - low) / FIGURES)
    first, last = math.floor(low / step + 1e-9), math.ceil(high / step - 1e-9)
    return Scale(first, last, step, FINE[f"{step:e}"[0]], behind=behind)


def round_step(most: float) -> float:
    """The largest of 1, 2 and 5 times a power of ten that is not above `most`; 1 where that is nothing."""
    if not 0.0 < most < math.inf:
        return 1.0
    power = math.floor(math.log10(most))
    lead = max((each for each in (1, 2, 5) if each * 10.0**power <= most * (1 + 1e-9)), default=1)
    return float(f"{lead}e{power}")


def _exact(whole: int, step: float) -> float:
    """A multiple of the step without the rounding of binary fractions."""
    return float(f"{whole * step:.12g}")
