"""Levers: what a question would set, and for whom.

Every lever has a reach: the probability, 0 to 1, that it takes; the others keep the value they would have had. Who
takes it up is independent of everything recorded and, lever by lever, of each other (stochastic settings: Pearl 2000,
Causality, section 4.2).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass


@dataclass(frozen=True)
class Fix:
    """Set a column to one value.

    value: a level, by name; a value of a number; on a number taken as bands also a value, meaning the band it is in.
    """

    value: object
    reach: float = 1.0


@dataclass(frozen=True, eq=False)
class Mix:
    """Draw a column's value from given shares, whatever it would have been.

    shares: level, or value of a number -> its share, 0 to 1; they sum to 1, and what is not named has none.
    """

    shares: Mapping[object, float]
    reach: float = 1.0


@dataclass(frozen=True)
class Shift:
    """Add an amount to a number, in its own unit."""

    amount: float
    reach: float = 1.0


@dataclass(frozen=True, eq=False)
class Rule:
    """Set a column by the level, or band, of a column that does not follow from it.

    values: level of `column` -> the level, or value of a number, to set; where it is not named, nothing is set.
    It reads what `column` was set to when that has a lever of its own.
    """

    column: str
    values: Mapping[str, object]
    reach: float = 1.0


Lever = Fix | Mix | Shift | Rule
