"""The slow truth of worlds with numbers: every configuration of the categories, one dense normal for the numbers.

Numbers that act through bands, or lie in a range, are integrated by Gauss-Legendre quadrature in short panels, good to
about 1e-12; all else is closed. Nothing here knows of trees, messages or the order of links.
"""

import itertools
from dataclasses import dataclass, replace

import numpy as np
from scipy.stats import norm

from engine.network.nodes import Category, Number

NODES, WEIGHTS = np.polynomial.legendre.leggauss(24)
FAR = 12.0  # standard deviations beyond which a normal is taken to be nowhere
STEPS = np.array([-7.0, -4.0, -2.0, -1.0, 0.0, 1.0, 2.0, 4.0, 7.0])  # panels around a step of a smooth curve
TINY = 1e-12  # a standard deviation, against the largest coefficient, that is taken as none


@dataclass(frozen=True)
class Truth:
    """What reading a world must give, for one draw.

    shares: name -> (levels or bands,).  parts: number -> (weights, means, sds) of normals, as many as quadrature made.
    asked: the world, its parameters, and which draw of them.
    """

    log_evidence: float
    shares: dict
    parts: dict
    asked: tuple

    def mean(self, name):
        weights, means, _ = self.parts[name]
        return float(weights @ means)

    def sd(self, name):
        weights, means, sds = self.parts[name]
        return float(np.sqrt(weights @ (sds**2 + (means - self.mean(name)) ** 2)))

    def below(self, name, value):
        world, drawn, draw = self.asked
        weights, means, sds = self.parts[name]
        if name in world.values or not in_boxes(world):
            return float(weights @ _below(value, means, sds))
        low, high = world.ranges.get(name, (-np.inf, np.inf))  # not as a sum of steps, but kept in a range as well
        if value <= low:
            return 0.0
        kept = replace(world, ranges={**world.ranges, name: (low, min(high, value))}, watch=())
        return float(np.exp(truth(kept, drawn, draw).log_evidence - self.log_evidence))

    def _bands(self, name):
        """Shares of a number's bands."""
        (node,) = (node for node in self.asked[0].nodes if node.name == name)
        return np.diff([0.0, *(self.below(name, cut) for cut in node.bands), 1.0])

    def density(self, name, value):
        weights, means, sds = self.parts[name]
        return float(weights @ norm.pdf(value, means, sds))


def in_boxes(world):
    """Numbers that are integrated over: three of them take seconds."""
    numbers = {node.name for node in world.nodes if isinstance(node, Number)} - world.values.keys()
    acting = {parent for node in world.nodes if isinstance(node, Category) for parent in node.parents}
    return numbers & (acting | world.pins.keys() | world.ranges.keys())


def truth(world, drawn=None, draw=0):
    """Read `world` by brute force. drawn: as for the routes; None: the nodes' own tables and coefficients."""
    nodes = world.nodes
    by_name = {node.name: node for node in nodes}
    categories = [node for node in nodes if isinstance(node, Category)]
    numbers = [node for node in nodes if isinstance(node, Number)]
    boxed = [node.name for node in numbers if node.name in in_boxes(world)]
    found = []  # log weight, level of each category and band of each boxed number, parts of each watched number
    for levels in itertools.product(*(_open(world, node) for node in categories)):
        at = {node.name: level for node, level in zip(categories, levels, strict=True)}
        offset, spread = _numbers(numbers, by_name, at, drawn, draw)
        log_density, offset, spread = _given(world.values, numbers, offset, spread)
        for bands in itertools.product(*(range(len(by_name[name].bands) + 1) for name in boxed)):
            inside = {name: _box(world, by_name[name], band) for name, band in zip(boxed, bands, strict=True)}
            if any(low >= high for low, high in inside.values()):
                continue
            full = at | dict(zip(boxed, bands, strict=True))
            full |= {name: band_of(by_name[name], value) for name, value in world.values.items()}
            chance = np.prod([_row(node, full, drawn, draw)[full[node.name]] for node in categories])
            if chance <= 0.0 or log_density == -np.inf:
                continue
            places = [place for place, node in enumerate(numbers) if node.name in inside]
            sides = [inside[numbers[place].name] for place in places]
            points, weights = _points(offset[places], spread[places], sides)
            if not weights.sum() > 0.0:
                continue
            parts = {
                numbers[place].name: _through(offset, spread, places, points, place)
                for place, node in enumerate(numbers)
                if node.name in world.watch
            }
            found.append((log_density + np.log(chance), weights, full, parts))
    if not found:
        return Truth(-np.inf, {}, {}, (world, drawn, draw))
    largest = max(log for log, *_ in found)
    weights = [np.exp(log - largest) * inner for log, inner, *_ in found]
    total = sum(inner.sum() for inner in weights)
    shares, mixtures = {}, {}
    for name in world.watch:
        node = by_name[name]
        if isinstance(node, Category):
            shares[name] = np.zeros(len(node.levels))
            for inner, (_, _, full, _) in zip(weights, found, strict=True):
                shares[name][full[name]] += inner.sum() / total
            continue
        mixtures[name] = tuple(
            np.concatenate(pieces)
            for pieces in zip(
                *((inner / total, *parts[name]) for inner, (_, _, _, parts) in zip(weights, found, strict=True)),
                strict=True,
            )
        )
    found = Truth(float(largest + np.log(total)), shares, mixtures, (world, drawn, draw))
    shares.update((name, found._bands(name)) for name in mixtures if len({*boxed, name}) < 3)
    return found


def band_of(node, value):
    return int(np.searchsorted(node.bands, value, side="right"))


def _below(value, means, sds):
    """P(x < value)."""
    certain = sds == 0.0
    return np.where(certain, means < value, norm.cdf((value - means) / np.where(certain, 1.0, sds)))


def _open(world, node):
    return sorted(world.pins.get(node.name, range(len(node.levels))))


def _box(world, node, band):
    """(low, high) of a band of a number, cut to its range and pins; low >= high when nothing is left."""
    low, high = world.ranges.get(node.name, (-np.inf, np.inf))
    if node.name in world.pins and band not in world.pins[node.name]:
        return 0.0, 0.0
    return max((-np.inf, *node.bands)[band], low), min((*node.bands, np.inf)[band], high)


def _row(node, at, drawn, draw):
    """(levels,) of a category where `at` says the level or band of every column."""
    table = node.table if drawn is None else drawn[node.name][..., min(draw, drawn[node.name].shape[-1] - 1)]
    return table[tuple(at[parent] for parent in node.parents)]


def _coefficients(node, drawn, draw):
    if drawn is None:
        return node.intercept, node.slopes, node.variance
    found = drawn[node.name]
    return tuple(
        np.asarray(array)[..., min(draw, np.shape(array)[-1] - 1)]
        for array in (found.intercept, found.slopes, found.variance)
    )


def _numbers(numbers, by_name, at, drawn, draw):
    """(numbers,) means and (numbers, numbers) coefficients on independent standard normals, one for each number."""
    place = {node.name: position for position, node in enumerate(numbers)}
    offset, spread = np.zeros(len(numbers)), np.zeros((len(numbers), len(numbers)))
    for own, node in enumerate(numbers):
        intercept, slopes, variance = _coefficients(node, drawn, draw)
        where = tuple(at[parent] for parent in node.parents if isinstance(by_name[parent], Category))
        leading = [place[parent] for parent in node.parents if parent in place]
        offset[own] = intercept[where] + slopes[where] @ offset[leading]
        spread[own] = slopes[where] @ spread[leading]
        spread[own, own] = np.sqrt(variance[where])
    return offset, spread


def _given(values, numbers, offset, spread):
    """Log density of the values, and the numbers' normal given them."""
    seen = [place for place, node in enumerate(numbers) if node.name in values]
    if not seen:
        return 0.0, offset, spread
    away = np.array([values[numbers[place].name] for place in seen]) - offset[seen]
    left, sizes, right = np.linalg.svd(spread[seen])
    rounding = TINY * np.abs(spread).max()
    sizes, right = np.where(sizes > rounding, sizes, 0.0), right[: len(seen)]
    in_noise = left.T @ away
    if np.any(np.abs(in_noise[sizes == 0.0]) > 1e-9 * (1.0 + np.abs(away).max())):
        return -np.inf, offset, spread
    kept = sizes > 0.0
    noise = in_noise[kept] / sizes[kept]
    log_density = norm.logpdf(noise).sum() - np.log(sizes[kept]).sum()
    offset = offset + spread @ (right[kept].T @ noise)
    spread = spread - spread @ right[kept].T @ right[kept]
    spread[np.linalg.norm(spread, axis=1) <= rounding] = 0.0
    for place in seen:
        offset[place], spread[place] = values[numbers[place].name], 0.0
    return float(log_density), offset, spread


def _conditional(offset, spread, given, place):
    """Number `place` given those in `given`: (constant, (given,) slopes, sd), by least squares in the noise."""
    slopes = np.linalg.lstsq(spread[given].T, spread[place], rcond=1e-11)[0] if given else np.zeros(0)
    left = np.linalg.norm(spread[place] - slopes @ spread[given])
    sd = left if left > TINY * np.abs(spread).max() else 0.0
    return offset[place] - slopes @ offset[given], slopes, sd


def _points(offset, spread, sides):
    """(points, numbers) and (points,) weights that sum to the probability of the box; numbers one after another."""
    points, weights = np.zeros((1, 0)), np.ones(1)
    for place, (low, high) in enumerate(sides):
        constant, slopes, sd = _conditional(offset, spread, list(range(place)), place)
        centre = constant + points @ slopes
        if sd == 0.0:
            own, shares = centre[:, None], ((low <= centre) & (centre < high)).astype(float)[:, None]
        else:
            own, shares = _panels(centre, sd, low, high, _steps(offset, spread, sides, place, points))
        shares = (shares * weights[:, None]).ravel()
        kept = shares > 0.0
        points = np.column_stack([np.repeat(points, own.shape[1], axis=0), own.ravel()])[kept]
        weights = shares[kept]
        if not weights.size:
            return np.zeros((0, len(sides))), weights
    return points, weights


def _panels(centre, sd, low, high, steps):
    """(points, nodes) and their weights, which integrate over a normal about each centre between low and high."""
    start, end = np.maximum(low, centre - FAR * sd), np.minimum(high, centre + FAR * sd)
    tail = ~(start < end)  # all of it lies beyond: what there is, is near the nearer end
    above = tail & (low > centre)
    start, end = np.where(above, low, start), np.where(above, np.minimum(high, low + sd), end)
    below = tail & ~above
    start, end = np.where(below, np.maximum(low, high - sd), start), np.where(below, high, end)
    even = start[:, None] + (end - start)[:, None] * np.linspace(0.0, 1.0, 13)
    edges = np.sort(np.concatenate([even, np.clip(steps, start[:, None], end[:, None])], axis=1), axis=1)
    middle, half = (edges[:, 1:] + edges[:, :-1]) / 2.0, np.diff(edges, axis=1) / 2.0
    own = (middle[..., None] + half[..., None] * NODES).reshape(len(centre), -1)
    shares = (half[..., None] * WEIGHTS).reshape(len(centre), -1) * norm.pdf(own, centre[:, None], sd)
    return own, shares


def _steps(offset, spread, sides, place, points):
    """(points, steps): where the chance that a later number lies in its box rises or falls, as this one moves."""
    found = [np.zeros((len(points), 0))]
    for later in range(place + 1, len(sides)):
        constant, slopes, sd = _conditional(offset, spread, list(range(place + 1)), later)
        if abs(slopes[-1]) > 0.0:
            for end in sides[later]:
                if np.isfinite(end):
                    crossing = (end - constant - points @ slopes[:-1]) / slopes[-1]
                    found.append(crossing[:, None] + STEPS * sd / abs(slopes[-1]))
    return np.concatenate(found, axis=1)


def _through(offset, spread, given, points, place):
    """(means, sds) of a number at each point."""
    if place in given:
        return points[:, given.index(place)], np.zeros(len(points))
    constant, slopes, sd = _conditional(offset, spread, given, place)
    return constant + points @ slopes, np.full(len(points), sd)
