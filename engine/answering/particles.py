"""Cases made up from a world, each with the weight that what was seen gives it (Fung & Chang 1990)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from engine.answering import truncated
from engine.answering.normal import log_between, standardised
from engine.answering.sampling import Batch, Sampler
from engine.answering.truncated import Floats, Interval
from engine.network.nodes import Category, Number
from engine.network.regression import Coefficients

Places = NDArray[np.intp]

_POINT = 1e-9  # sds that a sampled value is spread over


@dataclass(frozen=True, eq=False)
class Rows:
    """What one column follows in each particle: `at` (draws, size or 1) counts through the rows of its parameters.

    per_draw: rows of each draw, so that row r of draw b is b * per_draw + r.
    """

    at: Places
    per_draw: int

    def summed(self, weight: Floats) -> Floats:
        """(draws, rows of each) sums of (draws, size) weights."""
        if self.per_draw == 1:
            return np.asarray(weight.sum(axis=1, keepdims=True))
        at = np.broadcast_to(self.at, weight.shape).ravel()
        summed = np.bincount(at, weight.ravel(), len(weight) * self.per_draw)
        return np.asarray(summed.reshape(len(weight), -1), dtype=np.float64)


class Case:
    """The particles of a batch. Every array is (draws, size), or has 1 on an axis where all are the same.

    log_weight: natural log of the probability of what was seen, given what was sampled.
    values: number -> its values.  positions: column -> its levels or bands; both for columns that lead to others or
    are sampled within what was seen.
    rows: column -> where its parameters are.  tables: category -> (rows, levels) shares given parents and its own pin.
    mean, sd: number -> what it follows given its parents, before its own pin: one per row when it has no number
    parent, else one per particle.
    pulls: watched number -> what the numbers that follow it tell of it, see `told`.
    """

    def __init__(self, sampler: Sampler, batch: Batch) -> None:
        self.sampler = sampler
        self.batch = batch
        self.log_weight: Floats = np.zeros((1, 1))
        self.values: dict[str, Floats] = {}
        self.positions: dict[str, Places] = {}
        self.rows: dict[str, Rows] = {}
        self.tables: dict[str, Floats] = {}
        self.mean: dict[str, Floats] = {}
        self.sd: dict[str, Floats] = {}
        self.pulls: dict[str, tuple[Floats, Floats]] = {}
        for node in sampler.nodes:
            if isinstance(node, Category):
                self._category(node)
            else:
                self._number(node)

    def _category(self, node: Category) -> None:
        table = self.sampler.drawn[node.name]
        assert isinstance(table, np.ndarray)
        levels = len(node.levels)
        at, (shares,) = self._gathered(node.parents, table.shape[:-2], [table.reshape(-1, levels, table.shape[-1])])
        kept = self.sampler.pins.get(node.name)
        if kept is not None:
            seen = np.zeros(levels)
            seen[list(kept)] = 1.0
            shares = shares * seen
        upto = np.cumsum(shares, axis=1)
        total = upto[:, -1]
        if kept is not None:
            with np.errstate(divide="ignore"):
                self.log_weight = self.log_weight + np.log(total)[at.at]
        some = np.where(total > 0.0, total, 1.0)
        self.rows[node.name] = at
        self.tables[node.name] = shares / some[:, None]
        if kept is not None and len(kept) == 1:
            self.positions[node.name] = np.full((1, 1), next(iter(kept)))
        elif node.name in self.sampler.following:
            uniform = self.batch.uniform(node.name, self.sampler.seed)
            position = np.zeros(uniform.shape, dtype=np.intp)
            for level in range(levels - 1):  # dividing keeps a last level of share 0 out of reach
                position += uniform >= (upto[:, level] / some)[at.at]
            self.positions[node.name] = position

    def _number(self, node: Number) -> None:
        drawn = self.sampler.drawn[node.name]
        assert isinstance(drawn, Coefficients)
        categories = [parent for parent in node.parents if isinstance(self.sampler.node[parent], Category)]
        numbers = [parent for parent in node.parents if isinstance(self.sampler.node[parent], Number)]
        draws = drawn.intercept.shape[-1]
        stacked = [part.reshape(-1, width, draws) for part, width in _parts(drawn, len(numbers))]
        at, (intercept, variance, *slopes) = self._gathered(categories, drawn.intercept.shape[:-1], stacked)
        mean, sd = intercept[:, 0], np.sqrt(variance[:, 0])
        spread = sd[at.at]
        self.rows[node.name] = at
        middle = mean[at.at]
        steep = [slopes[0][:, place][at.at] for place in range(len(numbers))]
        for slope, parent in zip(steep, numbers, strict=True):
            middle = middle + slope * self.values[parent]
        self.mean[node.name], self.sd[node.name] = (middle, spread) if numbers else (mean, sd)
        if numbers and not spread.any():
            self._follow(node.name, mean[at.at], steep, numbers)
        self._value(node, middle, spread)
        if node.name in self.sampler.telling:
            for slope, parent in zip(steep, numbers, strict=True):
                self._pull(node.name, parent, slope, middle, spread)

    def _follow(self, name: str, intercept: Floats, slopes: list[Floats], numbers: list[str]) -> None:
        """What tells a number that follows others exactly, such as a set copy: what those follow, where that is free.

        Otherwise the sampled values as very narrow normals, for sd 0 is kept for a value that is certain.
        """
        mean: Floats = intercept
        variance: Floats = np.zeros((1, 1))
        for slope, parent in zip(slopes, numbers, strict=True):
            at, sd = self._normals(parent)
            if parent in self.sampler.telling or self.sampler.following[parent] != [name]:
                at, sd = self.values[parent], _POINT * sd
            mean, variance = mean + slope * at, variance + (slope * sd) ** 2
        self.mean[name], self.sd[name] = mean, np.sqrt(variance)

    def _pull(self, name: str, parent: str, slope: Floats, mean: Floats, sd: Floats) -> None:
        """How a number that tells something pulls one that it follows: precision, and precision times place."""
        if parent not in self.sampler.world.watch or parent in self.sampler.world.values:
            return
        left = self.values[name] - mean + slope * self.values[parent]
        with np.errstate(divide="ignore", invalid="ignore"):
            precision = np.where(slope == 0.0, 0.0, (slope / sd) ** 2)
            place = np.where(slope == 0.0, 0.0, slope * left / sd**2)
        before = self.pulls.get(parent, (np.zeros((1, 1)), np.zeros((1, 1))))
        self.pulls[parent] = before[0] + precision, before[1] + place

    def _normals(self, name: str) -> tuple[Floats, Floats]:
        """(draws, size or 1) mean and sd of a number given its parents."""
        mean, sd = self.mean[name], self.sd[name]
        if sd.ndim == 1:
            return mean[self.rows[name].at], sd[self.rows[name].at]
        return mean, sd

    def told(self, name: str) -> tuple[Floats, Floats]:
        """(draws, size or 1) means and sds of what a number follows given all else that was sampled and matters.

        It is kept in the box of `Sampler.boxes` that its sampled value is in; sd 0 is a certain value. These normals,
        with the weights of the particles, tell the number without the gaps between sampled values: one step of Gibbs
        sampling, averaged (Gelfand & Smith 1990). When nothing is seen of it or downstream of it, they are what it
        follows given its parents, and free of the noise of its own value (Rao-Blackwell).
        """
        if name in self.sampler.world.values:
            return self.values[name], np.zeros((1, 1))
        mean, sd = self._normals(name)
        if name not in self.pulls:
            return mean, sd
        precision, place = self.pulls[name]
        certain = (sd == 0.0) | ~np.isfinite(precision)
        own = 1.0 / np.where(certain, 1.0, sd) ** 2
        variance = 1.0 / np.where(certain, 1.0, own + precision)
        return (
            np.where(certain, self.values[name], variance * np.where(certain, 0.0, own * mean + place)),
            np.where(certain, _POINT * sd, np.sqrt(variance)),
        )

    def _value(self, node: Number, mean: Floats, sd: Floats) -> None:
        """Its value in every particle, and the weight of what was seen of it."""
        sampler = self.sampler
        if node.name in sampler.world.values:
            value = np.full((1, 1), float(sampler.world.values[node.name]))
            self.log_weight = self.log_weight + truncated.log_density(value - mean, sd)
        elif node.name in sampler.intervals:
            uniform = self.batch.uniform(node.name, sampler.seed)
            value, log_mass = _kept_inside(sampler.intervals[node.name], mean, sd, uniform)
            self.log_weight = self.log_weight + log_mass
        elif node.name in sampler.following:
            value = mean + sd * ndtri(self.batch.uniform(node.name, sampler.seed)) if np.any(sd) else mean
        else:
            return
        self.values[node.name] = value
        self.positions[node.name] = np.searchsorted(np.asarray(node.bands), value, side="right")

    def _gathered(
        self, parents: tuple[str, ...] | list[str], sizes: tuple[int, ...], parts: list[Floats]
    ) -> tuple[Rows, list[Floats]]:
        """Where each particle's parameters are, and the parameters (rows, width) of the batch's draws.

        parts: (configurations, width, draws). A table far larger than the batch is read particle by particle.
        """
        batch = self.batch
        configuration: Places = np.zeros((1, 1), dtype=np.intp)
        for parent, size in zip(parents, sizes, strict=True):
            configuration = configuration * size + self.positions[parent]
        count = int(np.prod(sizes, dtype=np.int64))
        if count > batch.size:
            configuration = np.broadcast_to(configuration, (batch.draws, batch.size))
            draw = np.broadcast_to(batch.first + np.arange(batch.draws)[:, None], configuration.shape)
            at = np.arange(configuration.size).reshape(configuration.shape)
            return Rows(at, batch.size), [part[configuration.ravel(), :, draw.ravel()] for part in parts]
        at = np.arange(batch.draws)[:, None] * count + configuration
        return Rows(at, count), [
            np.moveaxis(part[..., batch.slots], -1, 0).reshape(batch.draws * count, -1) for part in parts
        ]


def _parts(drawn: Coefficients, numbers: int) -> list[tuple[Floats, int]]:
    parts = [(drawn.intercept, 1), (drawn.variance, 1)]
    return [*parts, (drawn.slopes, numbers)] if numbers else parts


def _kept_inside(intervals: tuple[Interval, ...], mean: Floats, sd: Floats, uniform: Floats) -> tuple[Floats, Floats]:
    """A value inside the intervals for every particle, and the log of how much of the normal is inside.

    One uniform number picks the interval and, by what is left of it, the place inside.
    """
    ends = [standardised(np.full(1, low), np.full(1, high), mean, sd) for low, high in intervals]
    with np.errstate(invalid="ignore"):  # the whole line has no middle
        logs = np.stack([log_between(low, high) for low, high in ends])
    largest = logs.max(axis=0)
    shares = np.exp(logs - np.where(np.isfinite(largest), largest, 0.0))
    total = shares.sum(axis=0)
    value = np.zeros(uniform.shape)
    before = np.zeros(1)
    with np.errstate(divide="ignore", invalid="ignore"):
        log_mass = largest + np.log(total)
        for (low, high), (from_value, to_value), share in zip(ends, intervals, shares, strict=True):
            left = (uniform * total - before) / share
            chosen = (left >= 0.0) & (share > 0.0)
            z = truncated.inside(low, high, np.clip(np.where(chosen, left, 0.5), 2.0**-54, 1.0 - 2.0**-53))
            # rounding must not carry a value out of what was seen
            there = np.clip(mean + sd * np.where(sd == 0.0, 0.0, z), from_value, np.nextafter(to_value, -np.inf))
            value = np.where(chosen, there, value)
            before = before + share
    return value, np.where(np.isnan(log_mass), -np.inf, log_mass)
