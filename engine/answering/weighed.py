"""What weighted particles say of one world."""

from __future__ import annotations

import numpy as np
from scipy.special import ndtr, stdtrit

from engine.answering import truncated
from engine.answering.mixed import MixedRead
from engine.answering.mixture import Mixture
from engine.answering.particles import Case, Rows
from engine.answering.sampling import Batch, Sampler
from engine.answering.tallies import Blend, Tally, calmed
from engine.answering.truncated import Floats
from engine.network.nodes import Number

ENOUGH = 0.2  # of half an interval's width is what a standard error may be
FINE = 0.002  # and what it may be where nothing is drawn, so that there is no interval
ROUNDING = 1e-12  # an error below this is what summing leaves
FEW = 50.0  # effective particles below which an answer is told with a caution, and sampling goes on
FEWEST = 10.0  # and below which they cannot tell how far off they are
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
        self._squares = {name: Tally(draws, 1) for name in self._moments}
        self._boxes = {name: sampler.boxes(name) for name in self._moments}
        self._blends = {name: Blend(draws, self._boxes[name]) for name in self._moments}

    def add(self, batch: Batch) -> None:
        """Sample a batch and sum it up."""
        case = Case(self._sampler, batch)
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
        if self._effective() < FEW:
            return False
        for name, tally in self._shares.items():
            if not self._enough(tally, 1.0):
                return False
            if name in self._moments and not self._enough(self._moments[name], self._sd(name)):
                return False
        return True

    def _enough(self, tally: Tally, unit: float) -> bool:
        error = self._errors(tally)
        draws = self._means(tally)[1][:, 1:]
        if draws.shape[1] == 0:
            return bool(np.all(error <= FINE * unit + ROUNDING))
        low, high = np.quantile(draws, _TAILS, axis=1)
        return bool(np.all(error <= ENOUGH * 0.5 * (high - low) + ROUNDING))

    def _rescale(self, slots: slice, to: Floats) -> None:
        """Weigh from now on in a unit whose log is `to`, so that the largest weight of a draw is 1."""
        with np.errstate(invalid="ignore"):
            factor = np.exp(self._scale[slots] - to)
        factor = np.where(np.isnan(factor), 1.0, factor)  # nothing has had any weight yet
        self._scale[slots] = to
        self._weight[slots] *= factor
        self._square[slots] *= factor**2
        self._fourth[slots] *= factor**4
        for sums in (self._shares, self._moments, self._squares, self._blends):
            for tally in sums.values():
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
        if self._boxes[name] != (truncated.WHOLE,):
            self._add_kept(name, case, weight, square)
            return
        if name in self._sampler.telling or case.mean[name].ndim > 1:
            mean, sd = (np.broadcast_to(part, weight.shape) for part in case.told(name))
        else:  # no number parent, and nothing told from downstream: one normal per row
            rows = case.rows[name]
            weight, square = rows.summed(weight), rows.summed(square)
            mean, sd = (part.reshape(weight.shape) for part in (case.mean[name], case.sd[name]))
        self._blends[name].add(case.batch.slots, weight, mean, sd)
        bands = np.asarray(self._sampler.node[name].cuts)
        self._shares[name].add(case.batch.slots, weight, square, truncated.band_shares(bands, mean, sd))
        self._add_moments(name, case.batch.slots, weight, square, mean, sd)

    def _add_kept(self, name: str, case: Case, weight: Floats, square: Floats) -> None:
        """A number that is kept in boxes: its moments and bands by the sampled values, with a little more noise."""
        self._count(name, case, weight, square)
        box = case.positions[name] if len(self._boxes[name]) > 1 else 0
        mean, sd = (np.broadcast_to(part, weight.shape) for part in case.told(name))
        self._blends[name].add(case.batch.slots, weight, mean, sd, box)
        values = np.broadcast_to(case.values[name], weight.shape)
        self._add_moments(name, case.batch.slots, weight, square, values, np.zeros((1, 1)))

    def _add_moments(self, name: str, slots: slice, weight: Floats, square: Floats, mean: Floats, sd: Floats) -> None:
        away = mean - self._blends[name].centre
        self._moments[name].add(slots, weight, square, away[..., None])
        self._squares[name].add(slots, weight, square, (away**2 + sd**2)[..., None])

    def _count(self, name: str, case: Case, weight: Floats, square: Floats) -> None:
        """Weigh the levels or bands that were sampled."""
        levels = len(self._sampler.node[name].levels)
        at = np.arange(len(weight))[:, None] * levels + case.positions[name]
        rows = Rows(at, levels)
        each = np.broadcast_to(np.eye(levels), (len(weight), levels, levels))
        self._shares[name].add(case.batch.slots, rows.summed(weight), rows.summed(square), each)

    def _errors(self, tally: Tally) -> Floats:
        """(places,) standard errors of the point answer, nan where no particle fits.

        A ratio of sums is also off in the mean, which matters when few particles carry the weight; and its error is
        itself estimated: by Student's t, with as many degrees of freedom as squared weights are effective, two of
        them hold 95 % of the time (Owen 2013, Monte Carlo theory, methods and examples, chapter 9).
        """
        if self._weight[0] == 0.0:
            return np.full(tally.plain.shape[1], np.nan)
        effective = float(self._square[0] ** 2 / self._fourth[0])
        stretch = float(stdtrit(max(effective - 1.0, 1.0), ndtr(2.0))) / 2.0
        point = slice(0, 1)
        bias = tally.biases(self._weight, self._square, point)[0]
        mean_square = tally.variances(self._weight, self._square, point)[0] + bias**2
        return np.asarray(stretch * np.sqrt(mean_square))

    def _means(self, tally: Tally) -> tuple[Floats, Floats]:
        """(places, draws) means, as they are and calmed; where no particle fits, those of the point answer."""
        with np.errstate(divide="ignore", invalid="ignore"):
            means = tally.means(self._weight).T
            variances = tally.variances(self._weight, self._square).T
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
                error[name] = float(self._errors(tally).max())
        effective = self._effective()
        if effective < FEWEST:  # so few cannot tell their own error: it is that of not knowing
            error = {name: max(each, 1.0 if name in numbers else 0.5) for name, each in error.items()}
        with np.errstate(divide="ignore", invalid="ignore"):
            log_evidence = self._scale + np.log(self._weight / self._size)
        return MixedRead(log_evidence, shares, numbers, error, effective)

    def _effective(self) -> float:
        """Kish's effective number of the particles of the point answer."""
        return float(self._weight[0] ** 2 / self._square[0]) if self._square[0] > 0.0 else 0.0

    def _number(self, name: str) -> tuple[Mixture, float]:
        """The distribution of a number, and the standard error of its mean in sds of its own."""
        mixture = self._blends[name].mixture()
        means, calm = self._means(self._moments[name])
        # a certain value, such as one set, must stay, and so must the ends of what a number is kept in
        if mixture.low is None and np.all(mixture.sd[mixture.weight > 0.0] > 0.0):
            mixture = Mixture(mixture.weight, mixture.mean + (calm - means)[0], mixture.sd)
        sd = self._sd(name)
        error = float(self._errors(self._moments[name])[0])
        return mixture, error / sd if sd > 0.0 else 0.0 * error

    def _sd(self, name: str) -> float:
        """Of a number, in the point answer."""
        mean, square = (self._means(sums[name])[0][0, 0] for sums in (self._moments, self._squares))
        return float(np.sqrt(max(square - mean**2, 0.0)))
