"""The slow truth of a network with numbers: one row at a time, one column at a time, as defined."""

import math

import numpy as np
from scipy.stats import norm
from scipy.stats import t as student_t

import engine


def band(node, value):
    """The band of a value: band i holds bands[i - 1] <= value < bands[i]."""
    return sum(value >= cut for cut in node.bands)


def place(network, name, row):
    """The level of a column in `row`, column -> text or number; of a number its band."""
    node = network.node(name)
    return band(node, row[name]) if isinstance(node, engine.Number) else node.levels.index(row[name])


def log_score(network, row):
    """Natural log of the probability or density of one row."""
    return sum(log_factor(network, node, row) for node in network.nodes)


def log_factor(network, node, row):
    if isinstance(node, engine.Category):
        share = np.asarray(node.table)
        for parent in node.parents:
            share = share[place(network, parent, row)]
        share = float(share[node.levels.index(row[node.name])])
        return math.log(share) if share > 0.0 else -math.inf
    mean, variance = conditional(network, node, row)
    value = row[node.name]
    if node.regression is not None:
        return predictive(network, node, row, mean).logpdf(value)
    if variance == 0.0:
        return 0.0 if math.isclose(value, mean, rel_tol=1e-9, abs_tol=1e-9) else -math.inf
    return norm.logpdf(value, mean, math.sqrt(variance))


def conditional(network, node, row):
    """(mean, variance) of a number given the rest of the row."""
    mean, variance, slopes = np.asarray(node.intercept), np.asarray(node.variance), np.asarray(node.slopes)
    numbers = []
    for parent in node.parents:
        if isinstance(network.node(parent), engine.Category):
            at = place(network, parent, row)
            mean, variance, slopes = mean[at], variance[at], slopes[at]
        else:
            numbers.append(row[parent])
    return float(mean) + sum(slope * x for slope, x in zip(slopes.tolist(), numbers, strict=True)), float(variance)


def predictive(network, node, row, mean):
    """Student's t of a number with a posterior: its spread is that of one more record and of what is not known."""
    found = node.regression
    codes = [place(network, parent, row) for parent in network.category_parents(node.name)]
    beside = [row[parent] for parent in network.number_parents(node.name)]
    at = int(np.ravel_multi_index(codes, found.levels)) if codes else 0
    terms = [1.0, *((x - c) / s for x, c, s in zip(beside, found.centre, found.scale, strict=False))]
    own = found.root[at].T @ terms
    pulled = found.pull[at].T @ terms
    unknowns = list(pulled)
    for code, levels in zip(codes, found.levels, strict=True):
        unknowns += [pulled[0] if level == code else 0.0 for level in range(levels)]
    shared = found.shared_root.T @ unknowns
    square = found.rate[at] / found.shape[at] * (1.0 + own @ own) + shared @ shared
    return student_t(2.0 * found.shape[at], mean, math.sqrt(square) * found.scale[-1])
