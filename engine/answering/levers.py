"""Levers: what a question would set, and for whom."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Fix:
    """Set a column to one level for a random share of the people asked about.

    value: a level, by name; on a number taken as bands also a value, meaning the band that holds it.
    reach: the probability, 0 to 1, that the lever takes; the others keep the value they would have had.
    Who takes it up is independent of everything recorded (stochastic settings: Pearl 2000, Causality, section 4.2).
    """

    value: object
    reach: float = 1.0
