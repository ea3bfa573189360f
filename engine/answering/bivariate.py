"""Two numbers that are normal together, each inside an interval: probability and moments, good in the tails."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, owens_t

from engine.answering.normal import HALF_LOG_TWO_PI, log_between

Floats = NDArray[np.float64]

SURE = 1e-4  # a probability above this is a difference of sums of about 1 and right to twelve digits
FALLS = 40.0  # natural logs below its peak at which an integrand is taken as over
NOTHING = 1e-11  # a probability that as a difference has no digits left
WIDE = 0.1  # standard deviations; the moments in a narrower interval are summed, not taken as a difference
AT_ONCE = 4_000  # rectangles summed by quadrature at once
REACH = 40.0  # standard deviations that are looked at
SEARCH, HALVINGS = 90, 30  # steps of golden section, and of halving
STEPS = (-7.0, -3.0, 0.0, 3.0, 7.0)  # standard deviations around a crossing at which panels end
GOLDEN = 0.5 * (float(np.sqrt(5.0)) - 1.0)
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(20)


@dataclass(frozen=True, eq=False)
class Rectangle:
    """Standard normals Y and X with correlation `lean`, start <= Y < end and low <= X < high; arrays that broadcast.

    rest: sqrt(1 - lean^2), given by itself since it may be too small to come out of `lean`; above 0.
    """

    start: Floats
    end: Floats
    low: Floats
    high: Floats
    lean: Floats
    rest: Floats

    def log_mass(self, needed: NDArray[np.bool_] | None = None) -> Floats:
        """Natural log of the probability, -inf where an interval is empty.

        To twelve digits; where it is not `needed` only as a difference from 1, and -inf where that is nothing.
        """
        box = self._full()
        mass = (
            _below(box.end, box.high, box.lean, box.rest)
            - _below(box.start, box.high, box.lean, box.rest)
            - _below(box.end, box.low, box.lean, box.rest)
            + _below(box.start, box.low, box.lean, box.rest)
        )
        real = (box.end > box.start) & (box.high > box.low)
        with np.errstate(divide="ignore"):
            found = np.log(np.where(real, np.maximum(mass, 0.0), 0.0))
        thin = real & (mass < SURE)
        if needed is not None:
            thin &= needed
        if np.any(thin):
            found[thin] = box._some(thin)._summed()[0]
        return found

    def moments(self, needed: NDArray[np.bool_], weighty: NDArray[np.bool_]) -> tuple[Floats, Floats]:
        """Mean and variance of Y (Rosenbaum 1961, for intervals), 0 and 1 where nothing is left.

        By quadrature where small probabilities are `needed` and where the interval is narrow and `weighty`, since a
        difference would lose digits there.
        """
        box = self._full()
        log_mass = box.log_mass(np.zeros(box.start.shape, dtype=bool))
        narrow = box.end - box.start < WIDE
        small = log_mass < np.log(SURE)
        rest = (needed & small) | (weighty & (narrow | small))
        wide = ~rest & (log_mass > np.log(NOTHING))
        mean, variance = np.zeros(box.start.shape), np.ones(box.start.shape)
        if np.any(wide):
            mean[wide], variance[wide] = box._some(wide)._closed(np.exp(log_mass[wide]))
            variance = np.maximum(variance, 0.0)
        rest &= (box.end > box.start) & (box.high > box.low)
        if np.any(rest):
            _, mean[rest], variance[rest] = box._some(rest)._summed()
        return mean, variance

    def _full(self) -> Rectangle:
        return Rectangle(*np.broadcast_arrays(self.start, self.end, self.low, self.high, self.lean, self.rest))

    def _some(self, chosen: NDArray[np.bool_] | slice) -> Rectangle:
        return Rectangle(
            self.start[chosen],
            self.end[chosen],
            self.low[chosen],
            self.high[chosen],
            self.lean[chosen],
            self.rest[chosen],
        )

    def _summed(self) -> tuple[Floats, Floats, Floats]:
        """Log mass, mean and variance of Y by quadrature, so many at once."""
        parts = [
            _by_quadrature(self._some(slice(first, first + AT_ONCE))) for first in range(0, len(self.start), AT_ONCE)
        ]
        return tuple(np.concatenate(sides) for sides in zip(*parts, strict=True))  # type: ignore[return-value]

    def _closed(self, mass: Floats) -> tuple[Floats, Floats]:
        """Mean and variance of Y, where the mass is not small."""
        first: Floats = np.zeros(1)
        second: Floats = np.ones(1) * mass
        for end, sign in ((self.start, 1.0), (self.end, -1.0)):
            edge = sign * _density(end) * self._between(self.low, self.high, end)
            first = first + edge
            second = second + np.where(np.isfinite(end), end, 0.0) * edge
        for end, sign in ((self.low, 1.0), (self.high, -1.0)):
            density = sign * _density(end)
            edge = density * self._between(self.start, self.end, end)
            first = first + self.lean * edge
            second = second + self.lean**2 * np.where(np.isfinite(end), end, 0.0) * edge
            centre = self.lean * np.where(np.isfinite(end), end, 0.0)
            inner = _density((self.start - centre) / self.rest) - _density((self.end - centre) / self.rest)
            second = second + self.lean * self.rest * density * inner
        mean = first / mass
        return mean, second / mass - mean * mean

    def _between(self, low: Floats, high: Floats, at: Floats) -> Floats:
        """Probability that one lies between, given where the other is."""
        centre = self.lean * np.where(np.isfinite(at), at, 0.0)
        return np.exp(log_between((low - centre) / self.rest, (high - centre) / self.rest))


def _density(x: Floats) -> Floats:
    finite = np.isfinite(x)
    z = np.where(finite, x, 0.0)
    with np.errstate(over="ignore"):
        return np.where(finite, np.exp(-0.5 * z * z - HALF_LOG_TWO_PI), 0.0)


def _below(h: Floats, k: Floats, lean: Floats, rest: Floats) -> Floats:
    """P(Y < h, X < k) by Owen's T function (Owen 1956, eq. 3.1), to about 1e-16."""
    finite = np.isfinite(h) & np.isfinite(k)
    found = np.where((h == -np.inf) | (k == -np.inf), 0.0, ndtr(np.minimum(h, k)))
    if np.any(finite):
        y, x, lean, rest = h[finite], k[finite], lean[finite], rest[finite]
        inner = 0.5 * (ndtr(y) + ndtr(x)) - _owen(y, x, lean, rest) - _owen(x, y, lean, rest)
        opposite = (np.sign(y) * np.sign(x) < 0.0) | (((y == 0.0) | (x == 0.0)) & (np.minimum(y, x) < 0.0))
        inner = np.where(opposite, inner - 0.5, inner)
        nothing = (y == 0.0) & (x == 0.0)
        found[finite] = np.where(nothing, 0.25 + np.arctan2(lean, rest) / (2.0 * np.pi), inner)
    return found


def _owen(h: Floats, k: Floats, lean: Floats, rest: Floats) -> Floats:
    """T(h, (k - lean h) / (h rest)); at h = 0 the slope is infinite, with the sign of its numerator."""
    sign = np.where(lean < 0.0, -1.0, 1.0)
    zero = h == 0.0
    with np.errstate(over="ignore"):
        numerator = (k - sign * h) + sign * h * (
            rest * rest / (1.0 + np.abs(lean))
        )  # keeps digits where lean is near 1
        slope = np.where(zero, np.copysign(np.inf, numerator), numerator / np.where(zero, 1.0, h * rest))
    return np.asarray(owens_t(h, slope))


def _likely(box: Rectangle, left: Floats, right: Floats) -> tuple[Floats, Floats]:
    """The part of [left, right] where X has a chance that is above 1e-340; all of it if there is none."""
    flat = box.lean == 0.0
    lean = np.where(flat, 1.0, box.lean)
    with np.errstate(over="ignore"):
        one, other = (box.low - REACH * box.rest) / lean, (box.high + REACH * box.rest) / lean
    start, end = np.minimum(one, other), np.maximum(one, other)
    start, end = np.where(flat, left, start), np.where(flat, right, end)
    some = (start < right) & (end > left)
    return np.where(some, np.clip(start, left, right), left), np.where(some, np.clip(end, left, right), right)


def _by_quadrature(box: Rectangle) -> tuple[Floats, Floats, Floats]:
    """Natural log of the integral of phi(y) P(low <= X < high | y): positive throughout, so that no digits cancel;
    mean and variance of y under it.

    The integrand's log is concave: its peak is found by golden section, where it has fallen far enough by halving,
    and what lies between is summed by Gauss-Legendre in panels that end where it bends.
    """
    left, right = np.clip(box.start, -REACH, REACH), np.clip(box.end, -REACH, REACH)
    beyond = left >= right  # the interval is so far out that the peak is at its nearer end
    left = np.where(beyond & (box.start > 0.0), box.start, left)
    right = np.where(beyond & (box.start > 0.0), np.minimum(box.end, box.start + 1.0), right)
    left = np.where(beyond & (box.end < 0.0), np.maximum(box.start, box.end - 1.0), left)
    right = np.where(beyond & (box.end < 0.0), box.end, right)

    def log_integrand(y: Floats) -> Floats:
        extra = (None,) * (y.ndim - 1)
        lean, rest = box.lean[(..., *extra)], box.rest[(..., *extra)]
        with np.errstate(over="ignore"):
            low, high = (box.low[(..., *extra)] - lean * y) / rest, (box.high[(..., *extra)] - lean * y) / rest
            return np.asarray(-0.5 * y * y - HALF_LOG_TWO_PI + log_between(low, high))

    low, high = _likely(box, left, right)
    inner, outer = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
    at_inner, at_outer = log_integrand(inner), log_integrand(outer)
    for _ in range(SEARCH):
        up = at_outer > at_inner
        low, high = np.where(up, inner, low), np.where(up, high, outer)
        inner, outer = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
        at_inner, at_outer = log_integrand(inner), log_integrand(outer)
    peak = 0.5 * (low + high)
    top = log_integrand(peak)
    real = top > -np.inf
    sides = []
    for edge in (left, right):
        near, far = peak, edge
        over = log_integrand(edge) < top - FALLS
        for _ in range(HALVINGS):
            middle = 0.5 * (near + far)
            fallen = log_integrand(middle) < top - FALLS
            near, far = np.where(fallen, near, middle), np.where(fallen, middle, far)
        sides.append(np.where(over, far, edge))
    lowest, highest = sides
    lean = np.where(box.lean == 0.0, np.inf, box.lean)
    crossings = [0.5 * (lowest + peak), peak, 0.5 * (highest + peak)]
    for end in (box.low, box.high):  # where X is as likely on one side of this end as on the other, and about there
        crossing = np.where(np.isfinite(end), end, 0.0)
        with np.errstate(over="ignore"):
            crossings += [(crossing + step * box.rest) / lean for step in STEPS]
    edges = np.sort(np.stack([lowest, *(np.clip(each, lowest, highest) for each in crossings), highest], axis=-1))
    half = 0.5 * np.diff(edges)
    y = 0.5 * (edges[:, 1:] + edges[:, :-1])[..., None] + half[..., None] * _NODES
    values = np.exp(np.minimum(log_integrand(y) - np.where(real, top, 0.0)[:, None, None], 1.0))
    weights = values * _WEIGHTS * half[..., None]
    total = weights.sum(axis=(-2, -1))
    divisor = np.where(total > 0.0, total, 1.0)
    mean = peak + (weights * (y - peak[:, None, None])).sum(axis=(-2, -1)) / divisor
    variance = (weights * (y - mean[:, None, None]) ** 2).sum(axis=(-2, -1)) / divisor
    with np.errstate(divide="ignore"):
        return np.where(real, top + np.log(total), -np.inf), mean, variance
