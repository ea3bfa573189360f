"""Weighted sums over particles, draw by draw, and the standard errors of their ratios."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from engine.answering.mixture import Mixture
from engine.answering.truncated import WHOLE, Floats, Interval

Places = NDArray[np.intp]

ALL = slice(None)
CELLS = 256  # normals that the particles of a number are put together into in each draw
_CLASSES = 4  # at most so many classes of sds, apart so that a narrow and a wide normal at one place stay two
_EACH = 64  # cells of a box, at least


class Tally:
    """What the weighted mean of some figures needs: figures (places,) in every draw.

    plain: sum of w f.  square: of w^2 f.  squares: of w^2 f^2; each (draws, places).
    """

    def __init__(self, draws: int, places: int) -> None:
        self.plain = np.zeros((draws, places))
        self.square = np.zeros((draws, places))
        self.squares = np.zeros((draws, places))

    def rescale(self, slots: slice, factor: Floats) -> None:
        """Weights of (draws of the slots,) are from now on told in another unit."""
        self.plain[slots] *= factor[:, None]
        self.square[slots] *= factor[:, None] ** 2
        self.squares[slots] *= factor[:, None] ** 2

    def add(self, slots: slice, weight: Floats, square: Floats, figures: Floats) -> None:
        """weight, square: (draws, elements) sums of weights, of squares; figures: (draws, elements, places)."""
        self.plain[slots] += np.einsum("de,dep->dp", weight, figures)
        self.square[slots] += np.einsum("de,dep->dp", square, figures)
        self.squares[slots] += np.einsum("de,dep->dp", square, figures * figures)

    def means(self, weight: Floats, slots: slice = ALL) -> Floats:
        """(draws, places), given the (draws,) sums of weights."""
        return np.asarray(self.plain[slots] / weight[slots, None])

    def variances(self, weight: Floats, square: Floats, slots: slice = ALL) -> Floats:
        """(draws, places) squared standard errors of the means, given the (draws,) sums of weights and their squares.

        The delta method for a ratio of sums (Owen 2013, Monte Carlo theory, methods and examples, chapter 9).
        """
        means = self.means(weight, slots)
        spread = self.squares[slots] - 2.0 * means * self.square[slots] + means**2 * square[slots, None]
        return np.asarray(np.maximum(spread, 0.0) / weight[slots, None] ** 2)

    def biases(self, weight: Floats, square: Floats, slots: slice = ALL) -> Floats:
        """(draws, places) what the means are off by on average, by the delta method."""
        off = self.square[slots] - self.means(weight, slots) * square[slots, None]
        return np.asarray(-off / weight[slots, None] ** 2)


class Blend:
    """Normals of many particles put together into few, draw by draw.

    Those that lie close and are equally wide become one of the same mean and variance, so that the mean and the sd
    of the whole are kept as they are. The cells are narrow in the middle and wider outwards; they are laid by the
    first normals added.
    """

    def __init__(self, draws: int, boxes: Sequence[Interval] = (WHOLE,)) -> None:
        """boxes: intervals that a number is kept in, each with cells of its own."""
        self._draws = draws
        self._boxes = boxes
        self._per_box = max(_EACH, CELLS // len(boxes))
        self._laid = False
        self.centre, self._width = 0.0, 1.0
        self._edges: Floats = np.zeros(0)
        # of w, w d, w (d^2 + sd^2), d from the middle of the cell
        self._sums = np.zeros((3, draws, self._per_box * len(boxes)))

    def rescale(self, slots: slice, factor: Floats) -> None:
        """Weights of (draws of the slots,) are from now on told in another unit."""
        self._sums[:, slots] *= factor[:, None]

    def add(self, slots: slice, weight: Floats, mean: Floats, sd: Floats, box: Places | int = 0) -> None:
        """All (draws, elements): normals before any cut, sd 0 a single value; the box each is kept in."""
        if not self._laid:
            self._lay(weight, mean, sd)
        per_class = self._per_class
        away = (mean - self.centre) / self._width
        ranked = (0.5 * per_class) * (1.0 + away / (1.0 + np.abs(away)))
        place = np.clip(ranked.astype(np.intp), 0, per_class - 1)
        from_middle = mean - self._middles()[place]
        cells = self._sums.shape[-1]
        draws = len(weight)
        cell = place + np.arange(draws)[:, None] * cells + box * self._per_box
        if self._edges.size:
            cell += np.searchsorted(self._edges, sd, side="right") * per_class
        cell = cell.ravel()
        moved = weight * from_middle
        for sums, figures in zip(self._sums, (weight, moved, moved * from_middle + weight * sd**2), strict=True):
            sums[slots] += np.bincount(cell, figures.ravel(), draws * cells).reshape(draws, cells)

    def mixture(self) -> Mixture:
        """The parts that hold any weight, in every draw. A draw without any weight is told like the first."""
        weight, first, second = self._sums
        used = weight.any(axis=0)
        if not used.any():
            nothing = np.full((1, self._draws), np.nan)
            return Mixture(nothing, nothing, nothing)
        weight, first, second = weight[:, used], first[:, used], second[:, used]
        empty = ~weight.any(axis=1)
        for sums in (weight, first, second):
            sums[empty] = sums[0]
        box, place = np.divmod(np.flatnonzero(used), self._per_box)
        middles = self._middles()[place % self._per_class]
        held = weight > 0.0
        some = np.where(held, weight, 1.0)
        mean = middles + first / some
        variance = second / some - (first / some) ** 2
        rounding = 1e-14 * self._width**2  # what is left of the variance of one value
        sd = np.sqrt(np.where(variance > rounding, variance, np.where(held, 0.0, self._width**2)))
        with np.errstate(invalid="ignore"):  # nan where not even the first draw has any weight
            shares = weight / weight.sum(axis=1, keepdims=True)
        if tuple(self._boxes) == (WHOLE,):
            return Mixture(shares.T, mean.T, sd.T)
        low, high = (np.broadcast_to(side[box], sd.shape) for side in np.array(self._boxes).T)
        mean = np.where(sd > 0.0, mean, np.clip(mean, low, np.nextafter(high, -np.inf)))  # rounding keeps out of no box
        return Mixture(shares.T, mean.T, sd.T, low=low.T, high=high.T)

    def _lay(self, weight: Floats, mean: Floats, sd: Floats) -> None:
        trusted = weight if weight.any() else np.ones_like(weight)
        trusted = trusted / trusted.sum()
        self.centre = float((trusted * mean).sum())
        width = float(np.sqrt((trusted * ((mean - self.centre) ** 2 + sd**2)).sum()))
        self._width = width if width > 0.0 else max(abs(self.centre), 1.0)
        wide = sd[sd > 0.0]
        edges = []
        if wide.size:
            classes = np.quantile(wide, np.linspace(0.0, 1.0, _CLASSES))
            apart = classes[1:] > 1.2 * classes[:-1]
            edges = list(np.sqrt(classes[1:] * classes[:-1])[apart])
            if wide.size < sd.size:
                edges.insert(0, np.nextafter(0.0, 1.0))
        self._edges = np.array(edges)
        self._laid = True

    @property
    def _per_class(self) -> int:
        return self._per_box // (len(self._edges) + 1)

    def _middles(self) -> Floats:
        """(cells of a class,) the values in their middles."""
        rank = (2.0 * np.arange(self._per_class) + 1.0) / self._per_class - 1.0
        return np.asarray(self.centre + self._width * rank / (1.0 - np.abs(rank)))


def calmed(draws: Floats, variances: Floats) -> Floats:
    """Draws (places, draws) pulled towards their mean, so that the noise of sampling is not counted as doubt.

    variances: (places, draws) squared standard errors of each. Their mean over draws is what noise adds to the
    variance between draws; the factor, one for all places so that shares go on summing to 1, is the root of the part
    of the variance that is left: 0 when noise accounts for all of it.
    """
    if draws.shape[-1] < 2 or not variances.size:
        return draws
    noise = float(variances.mean(axis=-1).sum())
    between = float(draws.var(axis=-1, ddof=1).sum())
    if noise <= 0.0 or between <= 0.0:
        return draws
    centre = draws.mean(axis=-1, keepdims=True)
    return np.asarray(centre + np.sqrt(max(1.0 - noise / between, 0.0)) * (draws - centre))
