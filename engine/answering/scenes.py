"""One world of a question, and what reading it gave, by whichever route."""

from __future__ import annotations

from collections.abc import Hashable, Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from engine.answering.mixture import Mixture
from engine.answering.pins import Pins
from engine.answering.settings import AnySetting


@dataclass(frozen=True)
class Scene:
    """A world: what is seen before any lever, the levers, what is seen after them, and the columns to read."""

    before: Pins
    levers: Mapping[str, AnySetting]
    columns: tuple[str, ...]
    after: Pins = field(default_factory=Pins)

    @property
    def key(self) -> Hashable:
        """The same for the same world."""
        return self.before.key, tuple(self.levers.items()), self.columns, self.after.key

    @property
    def bare(self) -> bool:
        """Whether this is the recorded world: nothing seen, nothing set."""
        return not (self.before.columns or self.levers or self.after.columns)

    def reading(self, columns: tuple[str, ...]) -> Scene:
        return replace(self, columns=columns)


@dataclass(frozen=True, eq=False)
class Seen:
    """What reading a world gave.

    shares: column -> (levels or bands, 1 + draws), the posterior mean first.  numbers: number -> its distribution.
    log_evidence: (1 + draws,) natural log of the probability, or density, of all pins.
    error: sampled column -> Monte Carlo standard error of its point.  effective: number of particles, inf when exact.
    """

    shares: Mapping[str, np.ndarray]
    numbers: Mapping[str, Mixture] = field(default_factory=dict)
    log_evidence: np.ndarray = field(default_factory=lambda: np.zeros(1))
    error: Mapping[str, float] = field(default_factory=dict)
    effective: float = np.inf

    @property
    def possible(self) -> bool:
        return bool(self.log_evidence[0] > -np.inf)

    def with_other(self, other: Seen) -> Seen:
        """What was read of other columns of the same world beside these."""
        return Seen(
            {**self.shares, **other.shares},
            {**self.numbers, **other.numbers},
            self.log_evidence,
            {**self.error, **other.error},
            min(self.effective, other.effective),
        )

    def over(self, other: Seen, columns: tuple[str, ...]) -> Seen:
        """`columns` as read here, those that were not as in `other`."""
        return Seen(
            {name: self.shares[name] if name in self.shares else other.shares[name] for name in columns},
            {**{name: number for name, number in other.numbers.items() if name not in self.shares}, **self.numbers},
            self.log_evidence,
            {**{name: error for name, error in other.error.items() if name not in self.shares}, **self.error},
            min(self.effective, other.effective),
        )
