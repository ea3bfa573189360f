"""What weighted particles say of one world."""

from __future__ import annotations

import numpy as np
from scipy.special import ndtr, stdtrit

from engine.answering.mixed import MixedRead
from engine.answering.mixture import Mixture
from engine.answering.particles import Batch, Case, Rows, Sampler
from engine.answering.tallies import Blend, Floats, Tally, calmed
from engine.answering.truncated import band_shares
from engine.network.nodes import Number

ENOUGH = 0.2  # of half an interval's width is what a standard error may be
FINE = 0.002  # and what it may be where nothing is drawn, so that there is no interval
ROUNDING = 1e-12  # an error below this is what summing leaves
_TAILS = [0.05, 0.95]


class Weighed:
    """Sums over the particles so far, and what they tell.

    Weights of each draw are summed in a unit of their own, that of the largest so far, so that none underflows.
    """

    def __init__(self, sampler: Sampler, draws: int) -> None:
        self._sampler = sampler
        self._scale = np.full(draws, -np.inf)  # log of the unit in which weights are summed
        self._size = np.zeros(draws)
        self._weight = np.zeros(draws)
        self._square = np.zeros(draws)
        self._fourth = np.zeros(draws)
        watched = [sampler.node[name] for name in dict.fromkeys(sampler.world.watch)]
        self._shares = {node.name: Tally(draws, len(node.levels)) for node in watched}
        self._moments = {node.name: Tally(draws, 1) for node in watched if isinstance(node, Number)}
        self._blends = {name: Blend(draws) for name in self._moments}

    def add(self, batch: Batch) -> None:
        """Sample a batch and sum it up."""
        case = self._sampler.sample(batch)
        slots = batch.slots
        log_weight = np.broadcast_to(case.log_weight, (batch.draws, batch.size))
        self._rescale(slots, np.maximum(self._scale[slots], log_weight.max(axis=1)))
        unit = self._scale[slots]
        weight = np.exp(log_weight - np.where(np.isfinite(unit), unit, 0.0)[:, None])
        square = weight * weight
        self._size[slots] += batch.size
        self._weight[slots] += weight.sum(axis=1)
        self._square[slots] += square.sum(axis=1)
        self._fourth[slots] += np.einsum("de,de->d", square, square)
        for name in self._shares:
            if name in self._moments:
                self._add_number(name, case, weight, square)
            else:
                self._add_category(name, case, weight, square)

    def settled(self) -> bool:
        """Whether the point answer of every watched column is as exact as its interval asks for."""
        if self._weight[0] == 0.0:
            return False
        found = [(tally, self._means(tally)[1]) for tally in self._shares.values()]
        found += [(tally, self._means(tally)[1]) for tally in self._moments.values()]
        for tally, draws in found:
            error = self._stretch * np.sqrt(tally.variances(self._weight, self._square)[0])
            if draws.shape[1] > 1:
                low, high = np.quantile(draws[:, 1:], _TAILS, axis=1)
                enough = ENOUGH * 0.5 * (high - low)
            else:
                enough = np.full(error.shape, FINE)
            if np.any(error > enough + ROUNDING):
                return False
        return True

    def _rescale(self, slots: slice, to: Floats) -> None:
        """Weigh from now on in a unit whose log is `to`, so that the largest weight of a draw is 1."""
        with np.errstate(invalid="ignore"):
            factor = np.exp(self._scale[slots] - to)
        factor = np.where(np.isnan(factor), 1.0, factor)  # nothing has had any weight yet
        self._scale[slots] = to
        self._weight[slots] *= factor
        self._square[slots] *= factor**2
        self._fourth[slots] *= factor**4
        for tally in (*self._shares.values(), *self._moments.values(), *self._blends.values()):
            tally.rescale(slots, factor)

    def _add_category(self, name: str, case: Case, weight: Floats, square: Floats) -> None:
        # Given its parents and its own pin a column still follows its table when nothing is seen downstream of it:
        # no weight depends on the level sampled, and the mean of its rows has less noise than a count of sampled
        # levels (Rao-Blackwell). With something seen downstream the weights belong to the level that was sampled.
        if name in self._sampler.told_by_later:
            self._count(name, case, weight, square)
        else:
            rows = case.rows[name]
            table = case.tables[name].reshape(len(weight), rows.per_draw, -1)
            self._shares[name].add(case.batch.slots, rows.summed(weight), rows.summed(square), table)

    def _add_number(self, name: str, case: Case, weight: Floats, square: Floats) -> None:
        slots = case.batch.slots
        if name in self._sampler.told_by_later or name in self._sampler.seen:
            self._count(name, case, weight, square)
            mean, sd = case.told(name)
        else:
            mean, sd = case.mean[name], case.sd[name]
            if mean.ndim == 1:  # no number parent: one normal per row
                rows = case.rows[name]
                weight, square = rows.summed(weight), rows.summed(square)
                mean, sd = mean.reshape(weight.shape), sd.reshape(weight.shape)
            bands = np.asarray(self._sampler.node[name].cuts)
            self._shares[name].add(slots, weight, square, band_shares(bands, *np.broadcast_arrays(mean, sd)))
        mean, sd = np.broadcast_to(mean, weight.shape), np.broadcast_to(sd, weight.shape)
        self._blends[name].add(slots, weight, mean, sd)
        self._moments[name].add(slots, weight, square, (mean - self._blends[name].centre)[..., None])

    def _count(self, name: str, case: Case, weight: Floats, square: Floats) -> None:
        """Weigh the levels or bands that were sampled."""
        levels = len(self._sampler.node[name].levels)
        at = np.arange(len(weight))[:, None] * levels + case.positions[name]
        rows = Rows(at, levels)
        each = np.broadcast_to(np.eye(levels), (len(weight), levels, levels))
        self._shares[name].add(case.batch.slots, rows.summed(weight), rows.summed(square), each)

    @property
    def _stretch(self) -> float:
        """What a standard error of the point answer is multiplied by, for it is itself estimated.

        Student's t, so that two of them hold 95 % of the time, with as many degrees of freedom as squared weights are
        effective (Owen 2013, Monte Carlo theory, methods and examples, chapter 9): few carry a wide error.
        """
        if self._fourth[0] == 0.0:
            return np.nan
        effective = float(self._square[0] ** 2 / self._fourth[0])
        return float(stdtrit(max(effective - 1.0, 1.0), ndtr(2.0))) / 2.0

    def _variances(self, tally: Tally) -> Floats:
        """(draws, places) squared standard errors; nan where no particle fits."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return tally.variances(self._weight, self._square)

    def _means(self, tally: Tally) -> tuple[Floats, Floats]:
        """(places, draws) means, as they are and calmed; where no particle fits, those of the point answer."""
        with np.errstate(divide="ignore", invalid="ignore"):
            means = tally.means(self._weight).T
        variances = self._variances(tally).T
        empty = self._weight == 0.0
        means[:, empty] = means[:, :1]
        return means, np.concatenate([means[:, :1], calmed(means[:, 1:], variances[:, 1:][:, ~empty[1:]])], axis=1)

    def read(self) -> MixedRead:
        """All that was read so far; see `weighting.weigh_together` for what is told where no particle fits."""
        shares = {name: self._means(tally)[1] for name, tally in self._shares.items()}
        numbers, error = {}, {}
        for name, tally in self._shares.items():
            if name in self._blends:
                numbers[name], error[name] = self._number(name)
            else:
                error[name] = self._stretch * float(np.sqrt(self._variances(tally)[0].max()))
        with np.errstate(divide="ignore", invalid="ignore"):
            log_evidence = self._scale + np.log(self._weight / self._size)
        effective = float(self._weight[0] ** 2 / self._square[0]) if self._square[0] > 0.0 else 0.0
        return MixedRead(log_evidence, shares, numbers, error, effective)

    def _number(self, name: str) -> tuple[Mixture, float]:
        """The distribution of a number, and the standard error of its mean in sds of its own."""
        blend = self._blends[name].mixture()
        means, calm = self._means(self._moments[name])
        moved = calm - means
        if np.all(blend.sd[blend.weight > 0.0] > 0.0):  # a value that is certain, such as one set, must stay
            blend = Mixture(blend.weight, blend.mean + moved, blend.sd)
        weight, mean = blend.weight[:, 0], blend.mean[:, 0]
        sd = float(np.sqrt(weight @ (blend.sd[:, 0] ** 2 + (mean - weight @ mean) ** 2)))
        error = self._stretch * float(np.sqrt(self._variances(self._moments[name])[0, 0]))
        return blend, error / sd if sd > 0.0 else 0.0
