"""A normal number kept in an interval, and by a gate: where another number that goes with it must lie."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.answering.bivariate import Rectangle
from engine.answering.normal import log_between, moments_between, standardised

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Gate:
    """Another number X of each part, kept where low <= X < high: X given the value y ~ N(at + slope y, sd^2).

    All (parts, draws), or what broadcasts to it.
    """

    slope: Floats
    at: Floats
    sd: Floats
    low: Floats
    high: Floats


def back(low: Floats, high: Floats, constant: Floats, slope: Floats) -> tuple[Floats, Floats]:
    """Where x lies when low <= constant + slope x < high; without a slope everywhere or nowhere."""
    flat = slope == 0.0
    inside = (low <= constant) & (constant < high)
    divisor = np.where(flat, 1.0, slope)
    one, other = (low - constant) / divisor, (high - constant) / divisor
    down = slope < 0.0
    start, end = np.where(down, other, one), np.where(down, one, other)
    return (
        np.where(flat, np.where(inside, -np.inf, np.inf), start),
        np.where(flat, np.where(inside, np.inf, -np.inf), end),
    )


def forward(low: Floats, high: Floats, constant: Floats, slope: Floats) -> tuple[Floats, Floats]:
    """Where constant + slope x lies when low <= x < high; without a slope that leaves it where it is."""
    flat = slope == 0.0
    factor = np.where(flat, 1.0, slope)
    one, other = constant + factor * low, constant + factor * high
    return (
        np.where(flat, -np.inf, np.where(slope < 0.0, other, one)),
        np.where(flat, np.inf, np.where(slope < 0.0, one, other)),
    )


@dataclass(frozen=True, eq=False)
class Cut:
    """y ~ N(mean, sd^2), kept where low <= y < high and where the gate lets it; arrays that broadcast."""

    mean: Floats
    sd: Floats
    low: Floats
    high: Floats
    gate: Gate | None = None

    def log_mass(self, needed: NDArray[np.bool_] | None = None) -> Floats:
        """Natural log of the probability that it is kept; needed: as in Rectangle."""
        if self.gate is None:
            return log_between(*standardised(self.low, self.high, self.mean, self.sd))
        eased, gate = self._eased()
        found = log_between(*standardised(eased.low, eased.high, eased.mean, eased.sd))
        beside = log_between(*standardised(gate.low, gate.high, gate.at + gate.slope * eased.mean, gate.sd))
        found = found + beside
        tied = np.broadcast_to(eased._tied(gate), found.shape)
        if np.any(tied):
            box = eased._rectangle(gate, tied, found.shape)
            wanted = None if needed is None else np.broadcast_to(needed, found.shape)[tied]
            found[tied] = box.log_mass(wanted)
        return found

    def moments(self, needed: NDArray[np.bool_], weighty: NDArray[np.bool_]) -> tuple[Floats, Floats]:
        """Mean and variance of y where it is kept; needed, weighty: as in Rectangle."""
        eased, gate = (self, None) if self.gate is None else self._eased()
        mean, variance = moments_between(*standardised(eased.low, eased.high, eased.mean, eased.sd))
        if gate is not None:
            shape = np.broadcast_shapes(mean.shape, eased._tied(gate).shape)
            tied = np.broadcast_to(eased._tied(gate), shape)
            mean, variance = (np.array(np.broadcast_to(array, shape)) for array in (mean, variance))
            if np.any(tied):
                box = eased._rectangle(gate, tied, shape)
                sides = (np.broadcast_to(side, shape)[tied] for side in (needed, weighty))
                mean[tied], variance[tied] = box.moments(*sides)
        return eased.mean + eased.sd * np.where(np.isfinite(mean), mean, 0.0), eased.sd**2 * variance

    def log_open(self, y: Floats) -> Floats:
        """Natural log of the probability that the gate lets y pass; 0 without a gate."""
        if self.gate is None:
            return np.zeros(1)
        gate = self.gate
        return log_between(*standardised(gate.low, gate.high, gate.at + gate.slope * y, gate.sd))

    def _eased(self) -> tuple[Cut, Gate]:
        """A gate on an exact function of y becomes an interval of y."""
        gate = self.gate
        assert gate is not None
        exact = (gate.sd <= 0.0) & (gate.slope != 0.0) & (self.sd > 0.0)
        start, end = back(gate.low, gate.high, gate.at, np.where(exact, gate.slope, 1.0))
        low = np.where(exact, np.maximum(self.low, start), self.low)
        high = np.where(exact, np.minimum(self.high, end), self.high)
        free = Gate(
            np.where(exact, 0.0, gate.slope),
            np.where(exact, 0.0, gate.at),
            np.where(exact, 1.0, gate.sd),
            np.where(exact, -np.inf, gate.low),
            np.where(exact, np.inf, gate.high),
        )
        return Cut(self.mean, self.sd, low, high), free

    def _tied(self, gate: Gate) -> NDArray[np.bool_]:
        """Where y and the gate's number move together, and the gate is not open wide."""
        bounded = (gate.low > -np.inf) | (gate.high < np.inf)
        return np.asarray((gate.slope != 0.0) & (self.sd > 0.0) & bounded)

    def _rectangle(self, gate: Gate, tied: NDArray[np.bool_], shape: tuple[int, ...]) -> Rectangle:
        """The standard rectangle of each place that is tied."""

        def chosen(array: Floats) -> Floats:
            return np.broadcast_to(array, shape)[tied]

        mean, sd, slope, rest = (chosen(array) for array in (self.mean, self.sd, gate.slope, gate.sd))
        centre, spread = chosen(gate.at) + slope * mean, np.hypot(slope * sd, rest)
        return Rectangle(
            (chosen(self.low) - mean) / sd,
            (chosen(self.high) - mean) / sd,
            (chosen(gate.low) - centre) / spread,
            (chosen(gate.high) - centre) / spread,
            slope * sd / spread,
            rest / spread,
        )
