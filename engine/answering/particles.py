"""Cases made up from a world, each with the weight that what was seen gives it (Fung & Chang 1990)."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri

from engine.answering import truncated
from engine.answering.mixed import Drawn, MixedWorld
from engine.answering.truncated import Floats, Interval
from engine.network.nodes import Category, Node, Number
from engine.network.regression import Coefficients

Places = NDArray[np.intp]

_POINT = 1e-9  # sds that a sampled value is spread over


@dataclass(frozen=True)
class Batch:
    """`size` particles in each of `draws` draws from `first` on.

    key: tells the batches of a reading apart; the same in every world, so that a column meets the same chances.
    """

    first: int
    draws: int
    size: int
    key: tuple[int, ...]

    @property
    def slots(self) -> slice:
        return slice(self.first, self.first + self.draws)

    def uniform(self, name: str, seed: int) -> Floats:
        """(draws, size) numbers in 0 < u < 1 that belong to one column."""
        digest = hashlib.blake2b(name.encode("utf-8", "surrogatepass"), digest_size=8).digest()
        rng = np.random.default_rng([seed, int.from_bytes(digest, "little"), *self.key])
        return rng.random((self.draws, self.size)) + 2.0**-54


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
        return np.bincount(at, weight.ravel(), len(weight) * self.per_draw).reshape(len(weight), -1)


class Sampler:
    """What sampling a world needs to know before any number is looked at.

    Only columns that are watched, or seen, or lead to such a column are sampled: the others cannot change anything.
    """

    def __init__(self, world: MixedWorld, drawn: Drawn, seed: int) -> None:
        self.world = world
        self.drawn = drawn
        self.seed = seed
        self.node: dict[str, Node] = {node.name: node for node in world.nodes}
        self.pins = {name: at for name, at in world.pins.items() if len(at) < len(self.node[name].levels)}
        needed = {*self.seen, *world.watch}
        for node in reversed(world.nodes):
            if node.name in needed:
                needed.update(node.parents)
        self.nodes = tuple(node for node in world.nodes if node.name in needed)
        self.leading = {parent for node in self.nodes for parent in node.parents}
        following: dict[str, list[str]] = {}
        for node in self.nodes:
            for parent in node.parents:
                following.setdefault(parent, []).append(node.name)
        self.only_leads_to = {parent: names[0] for parent, names in following.items() if len(names) == 1}
        self.told_by_later: set[str] = set()  # columns with something seen downstream
        for node in reversed(self.nodes):
            if node.name in self.told_by_later or node.name in self.seen:
                self.told_by_later.update(node.parents)

    @cached_property
    def seen(self) -> frozenset[str]:
        return frozenset(self.pins) | frozenset(self.world.values) | frozenset(self.intervals)

    @cached_property
    def intervals(self) -> dict[str, tuple[Interval, ...]]:
        """Numbers kept inside intervals, ascending and apart."""
        found = {}
        for name, interval in self.world.ranges.items():
            if interval != (-np.inf, np.inf):
                found[name] = (interval,)
        for name, kept in self.pins.items():
            node = self.node[name]
            if isinstance(node, Number):
                found[name] = _joined_bands(node.bands, kept)
        return found

    def sample(self, batch: Batch) -> Case:
        """A case for every particle of the batch."""
        return Case(self, batch)


class Case:
    """The particles of a batch. Every array is (draws, size), or has 1 on an axis where all are the same.

    log_weight: natural log of the probability of what was seen, given what was sampled.
    values: number -> its values.  positions: column -> its levels or bands; both for columns that lead to others or
    are sampled within what was seen.
    rows: column -> where its parameters are.  tables: category -> (rows, levels) shares given parents and its own pin.
    mean, sd: number -> what it follows given its parents, before its own pin: one per row when it has no number
    parent, else one per particle.
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
        elif node.name in self.sampler.leading:
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
            self._followed(node.name, mean[at.at], steep, numbers)
        self._value(node, middle, spread)

    def _followed(self, name: str, intercept: Floats, slopes: list[Floats], numbers: list[str]) -> None:
        """What a number that follows others exactly, such as a set copy, is told by: what they follow themselves.

        Where they cannot be looked through, the sampled values are told as very narrow normals, for sd 0 is kept for
        a value that is certain.
        """
        mean: Floats = intercept
        variance: Floats = np.zeros((1, 1))
        for slope, parent in zip(slopes, numbers, strict=True):
            at, sd = self.told(parent, look_through=self.sampler.only_leads_to.get(parent) == name)
            mean, variance = mean + slope * at, variance + (slope * sd) ** 2
        self.mean[name], self.sd[name] = mean, np.sqrt(variance)

    def told(self, name: str, look_through: bool = True) -> tuple[Floats, Floats]:
        """(draws, size or 1) means and sds of normals that tell a number, sd 0 for a certain value.

        Given its parents a number still follows its regression when nothing is seen of it or downstream of it: no
        weight depends on the value sampled, and its normals have less noise than single values (Rao-Blackwell).
        Otherwise the weights belong to the value that was sampled.
        """
        if name in self.sampler.world.values:
            return self.values[name], np.zeros((1, 1))
        mean, sd = self.mean[name], self.sd[name]
        if sd.ndim == 1:
            mean, sd = mean[self.rows[name].at], sd[self.rows[name].at]
        if look_through and name not in self.sampler.told_by_later and name not in self.sampler.seen:
            return mean, sd
        return self.values[name], _POINT * sd

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
        elif node.name in sampler.leading:
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


def _joined_bands(cuts: tuple[float, ...], kept: frozenset[int]) -> tuple[Interval, ...]:
    """The bands kept, neighbours as one."""
    edges = (-np.inf, *cuts, np.inf)
    found: list[Interval] = []
    for place, (low, high) in enumerate(pairwise(edges)):
        if place not in kept:
            continue
        if found and found[-1][1] == low:
            found[-1] = (found[-1][0], high)
        else:
            found.append((low, high))
    return tuple(found)


def _kept_inside(intervals: tuple[Interval, ...], mean: Floats, sd: Floats, uniform: Floats) -> tuple[Floats, Floats]:
    """A value inside the intervals for every particle, and the log of how much of the normal is inside.

    One uniform number picks the interval and, by what is left of it, the place inside.
    """
    ends = [truncated.bounds(interval, mean, sd) for interval in intervals]
    logs = np.stack([truncated.log_mass(low, high) for low, high in ends])
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
