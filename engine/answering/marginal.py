"""What one world says of one column: the shares of its levels, and of a number its distribution, with draws."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from numbers import Real

import numpy as np

from engine.answering.mixture import Mixture
from engine.refusal import Refusal, quoted

Wanted = str | Iterable[str]


@dataclass(frozen=True, eq=False)
class Marginal:
    """Shares of one column's levels, or of a number's bands, in one world; of a number also its distribution.

    point: (levels,) the posterior predictive shares.  draws: (levels, draws), draws >= 0; common across worlds.
    number: a number's distribution at the posterior mean; None for a category, and for a number taken as bands.
    mean_draws: (draws,) a number's mean in each draw; None as above.
    """

    levels: tuple[str, ...]
    point: np.ndarray
    draws: np.ndarray
    number: Mixture | None = None
    mean_draws: np.ndarray | None = None

    @property
    def shares(self) -> dict[str, float]:
        return {level: float(share) for level, share in zip(self.levels, self.point, strict=True)}

    def share(self, wanted: Wanted) -> float:
        """Share of one level, or of several together."""
        return float(self.point[self._rows(wanted)].sum())

    def share_draws(self, wanted: Wanted) -> np.ndarray:
        """(draws,) share of one level, or of several together, in each draw."""
        return np.asarray(self.draws[self._rows(wanted)].sum(axis=0))

    @property
    def mean(self) -> float:
        """Mean of a number. Raises Refusal for a category, as `sd`, `quantile` and `density` do."""
        return float(self._number.means[0])

    @property
    def sd(self) -> float:
        """Standard deviation of a number."""
        return float(self._number.sds[0])

    def quantile(self, share: float) -> float:
        """The value below which this share of a number lies. Raises Refusal unless 0 < share < 1."""
        number = self._number
        if isinstance(share, bool) or not isinstance(share, Real) or not 0.0 < share < 1.0:
            raise Refusal(
                f"There is no quantile at {quoted(share)}.", where="share", do="Give a share above 0 and below 1."
            )
        return float(number.quantile(float(share))[0])

    def density(self, grid: Iterable[float]) -> np.ndarray:
        """(values,) density of a number at each value of `grid`."""
        return np.asarray(self._number.density(_values(grid))[:, 0])

    def below(self, grid: Iterable[float]) -> np.ndarray:
        """(values,) share of a number below each value of `grid`."""
        return np.asarray(self._number.below(_values(grid))[:, 0])

    @property
    def _number(self) -> Mixture:
        if self.number is None:
            raise Refusal(
                "Only a number has a mean, a standard deviation, quantiles and a density.",
                do=f"Ask for the shares of its levels: {', '.join(self.levels)}.",
            )
        return self.number

    def interval(self, wanted: Wanted | None, coverage: float = 0.90) -> tuple[float, float]:
        """Equal-tailed credible interval of a share, or of a number's mean when `wanted` is None, over draws.

        A point when the parameters are known exactly.
        """
        if wanted is None:
            mean = self.mean
            assert self.mean_draws is not None
            return spread(self.mean_draws, mean, coverage)
        return spread(self.share_draws(wanted), self.share(wanted), coverage)

    def _rows(self, wanted: Wanted) -> list[int]:
        if not isinstance(wanted, Iterable):
            raise Refusal(f"There is no level {quoted(wanted)} here.", do=f"The levels are {', '.join(self.levels)}.")
        names = [wanted] if isinstance(wanted, str) else list(dict.fromkeys(wanted))
        for name in names:
            if name not in self.levels:
                raise Refusal(f"There is no level {quoted(name)} here.", do=f"The levels are {', '.join(self.levels)}.")
        return [self.levels.index(name) for name in names]


def _values(grid: Iterable[float]) -> np.ndarray:
    """Values as an array. Raises Refusal for what are no finite numbers."""
    try:
        found = np.asarray(list(grid), dtype=np.float64)
    except (TypeError, ValueError):
        found = np.array([np.nan])
    if found.ndim != 1 or not np.isfinite(found).all():
        raise Refusal("These are no values of a number.", where="grid", do="Give a list of finite numbers.")
    return found


def spread(draws: np.ndarray, point: float, coverage: float) -> tuple[float, float]:
    """Equal-tailed interval of `draws`; (point, point) when there are none.

    Raises Refusal when `coverage` is no share between 0 and 1.
    """
    if isinstance(coverage, bool) or not isinstance(coverage, Real) or not 0.0 < coverage < 1.0:
        raise Refusal(
            f"An interval cannot cover {quoted(coverage)}.",
            where="coverage",
            do="Give a share above 0 and below 1, such as 0.90.",
        )
    if draws.size == 0:
        return point, point
    tail = (1.0 - coverage) / 2.0
    low, high = np.quantile(draws, [tail, 1.0 - tail])
    return float(low), float(high)
