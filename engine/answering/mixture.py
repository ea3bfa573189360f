"""The distribution of a number in an answer: a mixture of normals, some of them cut by what another number was in."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from engine.answering.cutting import Cut, Gate
from engine.answering.normal import log_density, moments_between, standardised

__all__ = ["Gate", "Mixture"]

Floats = NDArray[np.float64]

WEIGHS = 1e-12  # a part that weighs less is of no account
MUCH = 1e4  # a weight that is so many times the probability of what the part keeps
FAR = 40.0  # standard deviations that no quantile lies beyond
HALVINGS = 200
CLOSE = 1e-14  # a step of this size, against the number and 1, ends the search
AT_ONCE = 2_000_000  # numbers of a grid x parts x draws that are worked on at once


@dataclass(frozen=True, eq=False)
class Mixture:
    """Parts of a mixture in every draw.

    weight: (parts, draws), each draw sums to 1, nan where what was seen cannot be.  mean, sd: (parts, draws) of the
    normal before any cut; sd 0 is a single value.  gate: another number that cuts it; None when none does.
    low, high: (parts, draws), the interval that the number itself is kept in; None when it is kept in none.
    """

    weight: Floats
    mean: Floats
    sd: Floats
    gate: Gate | None = None
    low: Floats | None = None
    high: Floats | None = None

    @cached_property
    def means(self) -> Floats:
        """(draws,)"""
        return np.asarray((self.weight * self._moments[0]).sum(axis=0))

    @cached_property
    def sds(self) -> Floats:
        """(draws,) standard deviations."""
        mean, variance = self._moments
        away = mean - self.means
        return np.asarray(np.sqrt((self.weight * (variance + away * away)).sum(axis=0)))

    def only(self, draw: int) -> Mixture:
        """One draw of it, for what need not be found in all."""

        def column(array: Floats) -> Floats:
            return np.broadcast_to(array, self.weight.shape)[:, draw : draw + 1]

        gate = self.gate and Gate(*(column(getattr(self.gate, side.name)) for side in fields(Gate)))
        sides = (None if side is None else column(side) for side in (self.low, self.high))
        return Mixture(column(self.weight), column(self.mean), column(self.sd), gate, *sides)

    def below(self, grid: Sequence[float] | Floats) -> Floats:
        """(grid, draws) share below each value."""
        return self._on(grid, self._parts_below)

    def density(self, grid: Sequence[float] | Floats) -> Floats:
        """(grid, draws) density at each value, per unit of the number; inf at a single value that has a share."""
        return self._on(grid, self._parts_density)

    def bands(self, cuts: Sequence[float]) -> Floats:
        """(bands, draws) shares of the bands that `cuts` make."""
        below = self.below(np.asarray(cuts, dtype=np.float64))
        one = np.where(np.isnan(self.weight[:1]), np.nan, 1.0)
        return np.diff(np.concatenate([0.0 * one, below, one]), axis=0)

    def quantile(self, q: float) -> Floats:
        """(draws,) the smallest value that a share `q` (above 0, below 1) of the distribution does not exceed.

        By halving and Newton steps, to the last digits; a single value comes out as it is.
        """
        z = float(ndtri(q))
        if len(self.weight) == 1 and self._free:
            return np.asarray(self.mean[0] + z * self.sd[0] + 0.0 * self.weight[0])
        low, high = self._bracket(z)
        start = self.means + z * self.sds
        if not self._free:  # begin where normals with the same moments have it: each step is dear here
            mean, variance = self._moments
            start = Mixture(self.weight, mean, np.sqrt(variance)).quantile(q)
        x = np.clip(start, low, high)
        found = np.full(x.shape, np.nan)
        going = low < high  # false too where it is nan
        for turn in range(HALVINGS):
            if not np.any(going):
                break
            short = q - self._at(x, self._parts_below)
            low, high = np.where(short > 0.0, x, low), np.where(short > 0.0, high, x)
            with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
                step = short / self._at(x, self._parts_density)
            near = going & (np.abs(step) <= CLOSE * (1.0 + np.abs(x)) * (turn > 0))
            found = np.where(near, x + step, found)
            middle = 0.5 * (low + high)
            shut = going & ~near & ~((low < middle) & (middle < high))
            found = np.where(shut, high, found)
            going &= ~(near | shut)
            inside = (x + step > low) & (x + step < high) & (turn % 4 < 3)  # a halving now and then, lest it creep
            x = np.where(inside, x + step, middle)
        found = np.where(going, high, found)
        single = np.where((self.sd == 0.0) & (self.weight > 0.0), self.mean, np.nan)
        exact = np.abs(single - found) <= CLOSE * (1.0 + np.abs(found))
        return np.where(exact.any(axis=0), np.where(exact, single, -np.inf).max(axis=0), found)

    def _bracket(self, z: float) -> tuple[Floats, Floats]:
        """Values that the quantile lies between in every draw."""
        live = self.weight > 0.0
        reach = (z, z) if self._free else (-FAR, FAR)
        low, high = (self.mean + side * self.sd for side in reach)
        if self.low is not None and self.high is not None:
            low, high = np.maximum(low, self.low), np.minimum(high, self.high)
            low, high = np.minimum(low, self.high), np.maximum(high, self.low)
        lowest, highest = np.where(live, low, np.inf).min(axis=0), np.where(live, high, -np.inf).max(axis=0)
        some = live.any(axis=0)
        margin = 1e-9 * (1.0 + np.where(some, np.maximum(np.abs(lowest), np.abs(highest)), 0.0))
        return np.where(some, lowest, np.nan) - margin, np.where(some, highest, np.nan) + margin

    def _on(self, grid: Sequence[float] | Floats, parts: Callable[[Floats], Floats]) -> Floats:
        points = np.asarray(grid, dtype=np.float64)
        rows = max(1, AT_ONCE // max(self.weight.size, 1))
        found = [self._at(points[start : start + rows, None, None], parts) for start in range(0, len(points), rows)]
        return np.concatenate(found) if found else np.zeros((0, self.weight.shape[1]))

    def _at(self, x: Floats, parts: Callable[[Floats], Floats]) -> Floats:
        """Sum over parts of what `parts` says of x, (..., 1 or parts, 1 or draws)."""
        live = np.where(self.weight == 0.0, 0.0, parts(x))
        with np.errstate(invalid="ignore"):
            return np.asarray((self.weight * live).sum(axis=-2))

    @cached_property
    def _cut(self) -> Cut:
        everywhere = np.full(1, np.inf)
        low = -everywhere if self.low is None else self.low
        return Cut(self.mean, self.sd, low, everywhere if self.high is None else self.high, self.gate)

    @property
    def _free(self) -> bool:
        return self.gate is None and self.low is None and self.high is None

    @cached_property
    def _log_mass(self) -> Floats:
        """Natural log of what each part keeps, (parts, draws); 0 where that is nothing."""
        found = self._cut.log_mass(self._needed)
        return np.where(found > -np.inf, found, 0.0)

    @cached_property
    def _needed(self) -> NDArray[np.bool_]:
        """Parts whose small probabilities must have all their digits: the others weigh too little for it to tell."""
        if self.gate is None:
            return np.zeros(self.weight.shape, dtype=bool)
        coarse = np.exp(self._cut.log_mass(np.zeros(1, dtype=bool)))
        return np.asarray((self.weight > WEIGHS) & (self.weight > MUCH * coarse))

    def _parts_below(self, x: Floats) -> Floats:
        certain = self.sd == 0.0
        if self._free:
            return np.where(certain, self.mean < x, ndtr((x - self.mean) / np.where(certain, 1.0, self.sd)))
        cut = replace(self._cut, high=np.minimum(self._cut.high, x))
        share = np.minimum(np.exp(np.minimum(cut.log_mass(self._needed) - self._log_mass, 0.0)), 1.0)
        return np.where(certain, self.mean < x, np.where(x >= self._cut.high, 1.0, share))

    def _parts_density(self, x: Floats) -> Floats:
        found = log_density(x, self.mean, self.sd)
        if self._free:
            return np.exp(found)
        kept = found + self._cut.log_open(x) - self._log_mass
        inside = (self._cut.low <= x) & (x < self._cut.high)
        return np.exp(np.where(self.sd == 0.0, found, np.where(inside, kept, -np.inf)))

    @cached_property
    def _moments(self) -> tuple[Floats, Floats]:
        """Mean and variance of each part, (parts, draws)."""
        if self._free:
            return self.mean, self.sd * self.sd
        if self.gate is None or self.low is not None or self.high is not None:
            return self._cut.moments(self._needed, self.weight > 1.0 / MUCH)
        gate = self.gate  # the gate's number is only cut to an interval, and this one leans on it
        spread = np.hypot(gate.slope * self.sd, gate.sd)
        still = spread == 0.0
        divisor = np.where(still, 1.0, spread)
        lean = gate.slope * self.sd * self.sd / divisor
        mean, variance = moments_between(*standardised(gate.low, gate.high, gate.at + gate.slope * self.mean, spread))
        own = np.where(still, self.sd, self.sd * gate.sd / divisor)
        return self.mean + lean * np.where(np.isfinite(mean), mean, 0.0), own * own + lean * lean * variance
