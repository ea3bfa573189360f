"""Values of a number in words: means and their changes, so that no figure contradicts the one beside it."""

from __future__ import annotations

import math
from dataclasses import dataclass

from app.wording.figures import MINUS, Between

NEVER_FINER = 20  # parts of what the values spread by: an interval narrower than one of them gets no more decimals
MOST_MORE = 3  # decimals added at most, so that the figures of a change agree with each other
CERTAIN = 1e-9  # a change this small beside the spread of the values is the rounding of sums


def amount(value: float, decimals: int = 0) -> str:
    """A value with so many decimals, a comma between thousands and a true minus sign; −1 decimals tells tens."""
    rounded = _rounded(value, decimals)
    return f"{rounded:,.{max(decimals, 0)}f}".replace("-", MINUS)


def signed(value: float, decimals: int = 0) -> str:
    """A difference with its sign; 0 without one."""
    rounded = _rounded(value, decimals)
    return ("+" if rounded > 0 else "") + amount(value, decimals) if rounded else "0"


def decimals_for(width: float, spread: float) -> int:
    """Decimals that show an interval of this width without telling more than it knows.

    width: of the interval, 0 where there is none.  spread: standard deviation of the values.
    """
    shown = max(width, spread / NEVER_FINER)
    if not 0.0 < shown < math.inf:
        return 0
    if shown >= 100:  # two figures of the width
        return 1 - math.floor(math.log10(shown))
    return max(-math.floor(math.log10(shown / 5)), 0)


def round_value(value: float, width: float) -> float:
    """A value near `value` with no more digits than matter over a range of this width."""
    if not 0.0 < width < math.inf:
        return value
    decimals = 1 - math.floor(math.log10(width))
    return _rounded(value, decimals)


@dataclass(frozen=True)
class Move(Between):
    """From one mean to another, with the interval of the change, in the number's own unit.

    base: decimals to begin with.  The words agree with each other: when the decimals cannot show that the interval
    leaves 0 out all get more, and when the change does not come out of the rounded ends all get one less, or else more.
    """

    base: int = 0

    @property
    def decimals(self) -> int:
        tried = range(self.base, self.base + MOST_MORE + 1)
        shown = [decimals for decimals in tried if not self._hides(decimals)] or [tried[-1]]
        fewer = [shown[0] - 1] if shown[0] > 0 and not self._hides(shown[0] - 1) else []
        return next((decimals for decimals in (shown[0], *fewer, *shown[1:2]) if self._adds_up(decimals)), shown[0])

    @property
    def ends(self) -> tuple[str, str]:
        return amount(self.start, self.decimals), amount(self.end, self.decimals)

    @property
    def difference(self) -> str:
        """That of the rounded ends, so that a reader's sum agrees."""
        decimals = self.decimals
        return signed(_rounded(self.end, decimals) - _rounded(self.start, decimals), decimals)

    @property
    def interval(self) -> str:
        return f"{signed(self.low, self.decimals)} to {signed(self.high, self.decimals)}"

    def _hides(self, decimals: int) -> bool:
        """Whether so few decimals show a change, or an interval apart from 0, as none."""
        low, high = _rounded(self.low, decimals), _rounded(self.high, decimals)
        flat = not self.known and low == high
        same = self.moves and _rounded(self.start, decimals) == _rounded(self.end, decimals)
        return flat or same or (self.moves and 0 in (low, high))

    def _adds_up(self, decimals: int) -> bool:
        ends = _rounded(self.end, decimals) - _rounded(self.start, decimals)
        return _rounded(ends, decimals) == _rounded(self.end - self.start, decimals)


def _rounded(value: float, decimals: int) -> float:
    """Halves are rounded away from zero, as a reader rounds; the hair is for halves that binary numbers miss."""
    scaled = abs(value) * 10.0**decimals
    whole = math.floor(scaled + 0.5 + 1e-9)
    return math.copysign(round(whole / 10.0**decimals, max(decimals, 0)), value) if whole else 0.0
