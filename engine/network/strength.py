"""How far a link moves its child."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from engine.network.network import Network
from engine.network.typical import Typical

Floats = NDArray[np.float64]
Joint = Callable[[tuple[str, ...]], Floats]


def category_strength(network: Network, source: str, target: str, better: Sequence[int], joint: Joint) -> float:
    """The largest change in the share of the levels at `better`, 0 to 1, between two levels, or bands, of `source`.

    Averaged over the child's other parents as they are usual. joint: columns -> their joint shares.
    """
    node = network.category(target)
    shares = np.asarray(node.table)[..., list(better)].sum(axis=-1)
    others = tuple(parent for parent in node.parents if parent != source)
    return _spread(_averaged(np.moveaxis(shares, node.parents.index(source), 0), joint(others)))


def number_strength(network: Network, source: str, target: str, joint: Joint, typical: Callable[[], Typical]) -> float:
    """The largest change in the mean of a number, in its own unit, between two values of `source`.

    Between two levels of a category; over the reach of a number, as Typical.reach says. Averaged over the child's
    other parents as they are usual. typical: asked for only where a parent is a number.
    """
    node = network.number(target)
    categories, numbers = network.category_parents(target), network.number_parents(target)
    intercept, slopes = np.asarray(node.intercept), np.asarray(node.slopes)
    if source in numbers:
        low, high = typical().reach(source)
        slope = float((joint(categories) * slopes[..., numbers.index(source)]).sum())
        return abs(slope) * (high - low)
    place = categories.index(source)
    others = categories[:place] + categories[place + 1 :]
    means = np.moveaxis(intercept, place, 0)
    if numbers:
        beside = typical().means(network, numbers, others)  # (levels of the others..., numbers)
        means = means + (np.moveaxis(slopes, place, 0) * beside).sum(axis=-1)
    return _spread(_averaged(means, joint(others)))


def _averaged(values: Floats, common: Floats) -> Floats:
    """(levels of the source,) from (those, levels of the other parents...)."""
    return np.asarray((values * common).reshape(len(values), -1).sum(axis=1))


def _spread(values: Floats) -> float:
    return float(values.max() - values.min())
