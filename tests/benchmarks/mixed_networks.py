"""Generated networks of categories and numbers whose every parameter is known, for measuring what learning finds."""

from dataclasses import dataclass

import numpy as np
import pandas as pd
from scipy.special import log_softmax

from engine.order import Order


@dataclass(frozen=True)
class Member:
    """One column: a category with a table, or with slopes on number parents (logistic); or a linear number.

    levels: of a category, 0 for a number.  categories, numbers: positions of its parents.
    base: a category's log shares (parent configurations, levels), a number's intercepts (configurations,).
    slopes: (configurations, number parents) of a number, (levels, number parents) of a category.
    spread: (configurations,) standard deviation of a number.
    """

    levels: int
    categories: tuple[int, ...]
    numbers: tuple[int, ...]
    base: np.ndarray
    slopes: np.ndarray
    spread: np.ndarray


@dataclass(frozen=True)
class Truth:
    """Columns, parents before children, and the stages that they stand in.  skewed: noise is exponential."""

    members: tuple[Member, ...]
    order: Order
    skewed: bool

    @property
    def links(self) -> set[tuple[str, str]]:
        names = self.order.columns
        return {
            (names[parent], names[place])
            for place, member in enumerate(self.members)
            for parent in (*member.categories, *member.numbers)
        }

    def sample(self, rows: int, rng: np.random.Generator) -> np.ndarray:
        """(rows, columns) values, level positions for categories."""
        cells = np.zeros((rows, len(self.members)))
        for place in range(len(self.members)):
            self.draw(place, cells, rng)
        return cells

    def draw(self, place: int, cells: np.ndarray, rng: np.random.Generator) -> None:
        """Fill in one column of `cells` given those before it."""
        member, rows = self.members[place], len(cells)
        if member.levels:
            shares = np.exp(self._log_shares(member, cells))
            cells[:, place] = (rng.random((rows, 1)) > shares.cumsum(axis=1)[:, :-1]).sum(axis=1)
        else:
            noise = rng.exponential(size=rows) - 1.0 if self.skewed else rng.normal(size=rows)
            mean, spread = self._moments(member, cells)
            cells[:, place] = mean + spread * noise

    def log_score(self, cells: np.ndarray) -> np.ndarray:
        """(rows,) log density of each row."""
        total = np.zeros(len(cells))
        for place, member in enumerate(self.members):
            if member.levels:
                shares = self._log_shares(member, cells)
                total += np.take_along_axis(shares, cells[:, place, None].astype(int), axis=1)[:, 0]
            else:
                mean, spread = self._moments(member, cells)
                away = (cells[:, place] - mean) / spread
                total += (-away - 1.0 if self.skewed else -0.5 * (np.log(2 * np.pi) + away**2)) - np.log(spread)
        return total

    def frame(self, cells: np.ndarray) -> pd.DataFrame:
        names = self.order.columns
        return pd.DataFrame(
            {
                name: np.asarray([f"{name} {level}" for level in range(member.levels)])[cells[:, place].astype(int)]
                if member.levels
                else cells[:, place]
                for place, (name, member) in enumerate(zip(names, self.members, strict=True))
            }
        )

    def _at(self, member: Member, cells: np.ndarray) -> np.ndarray:
        at = np.zeros(len(cells), dtype=int)
        for parent in member.categories:
            at = at * self.members[parent].levels + cells[:, parent].astype(int)
        return at

    def _log_shares(self, member: Member, cells: np.ndarray) -> np.ndarray:
        pull = cells[:, list(member.numbers)] @ member.slopes.T
        return np.asarray(log_softmax(member.base[self._at(member, cells)] + pull, axis=1))

    def _moments(self, member: Member, cells: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        at = self._at(member, cells)
        mean = member.base[at] + (member.slopes[at] * cells[:, list(member.numbers)]).sum(axis=1)
        return mean, member.spread[at]


def generated(columns: int, seed: int, skewed: bool = False, logistic: bool = False) -> Truth:
    """Half categories of 2 to 4 levels, half numbers; up to three parents each, at most two of a kind.

    logistic: a category may have a number parent, on whose value its log odds are linear; else categories alone.
    """
    rng = np.random.default_rng([columns, seed])
    levels = np.where(rng.permutation(columns) < columns // 2, rng.integers(2, 5, columns), 0)
    members: list[Member] = []
    pilot = np.zeros((1_000, columns))  # rows by which slopes on numbers are scaled
    for place in range(columns):
        categories = _some(rng, [p for p in range(place) if levels[p]])
        numbers = _some(rng, [p for p in range(place) if not levels[p]])
        if len(categories) + len(numbers) > 3:
            numbers = numbers[:1]
        configurations = int(np.prod(levels[list(categories)], dtype=int))
        if levels[place]:
            numbers = numbers[:1] if logistic else ()
            base = np.log(rng.dirichlet(np.ones(levels[place]), configurations) * 0.98 + 0.02 / levels[place])
            beside = pilot[:, list(numbers)]
            slopes = rng.normal(size=(levels[place], len(numbers))) / beside.std(axis=0)
            base = base - slopes @ beside.mean(axis=0)
            spread = np.ones(configurations)
        else:
            base = rng.normal(size=configurations)
            shared = rng.uniform(0.3, 0.8, len(numbers)) * rng.choice([-1.0, 1.0], len(numbers))
            slopes = shared + 0.2 * rng.normal(size=(configurations, len(numbers)))
            spread = rng.uniform(0.5, 1.5, configurations)
        members.append(Member(int(levels[place]), categories, numbers, base, slopes, spread))
        Truth(tuple(members), Order([]), skewed).draw(place, pilot, rng)
    names = [f"{'category' if count else 'number'} {place}" for place, count in enumerate(levels)]
    lanes = np.array_split(np.arange(columns), 3 if columns < 20 else 5)
    order = Order([(f"stage {at}", [names[place] for place in lane]) for at, lane in enumerate(lanes)])
    return Truth(tuple(members), order, skewed)


def _some(rng: np.random.Generator, earlier: list[int]) -> tuple[int, ...]:
    count = min(len(earlier), int(rng.choice(3, p=[0.3, 0.45, 0.25])))
    return tuple(sorted(int(p) for p in rng.choice(earlier, count, replace=False))) if count else ()
