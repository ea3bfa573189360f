"""Draws of the parameters of one column given its parents, from their posterior."""

from __future__ import annotations

import zlib

import numpy as np

from engine.network.nodes import Category, Node, Number
from engine.network.regression import Coefficients

SMALLEST = 1e-300  # a drawn share that rounds to 0 although its cell is possible is taken as this
AT_ONCE = 1_000_000  # cells times draws that are drawn at once; a larger table is drawn in parts


def drawn(node: Node, count: int, seed: int) -> np.ndarray | Coefficients:
    """The table of a category, or the coefficients of a number: read-only arrays, 1 + count draws on the last axis.

    The first draw is the posterior mean. A family (column and parents) draws the same numbers in every network that
    holds it, so that answers from different networks are compared on common draws. What is known exactly is the same
    in every draw and takes no more room than once.
    """
    return drawn_table(node, count, seed) if isinstance(node, Category) else drawn_coefficients(node, count, seed)


def drawn_table(node: Category, count: int, seed: int) -> np.ndarray:
    """`drawn` of a category: (parent levels..., own levels, 1 + count)."""
    if node.dirichlet is None or count == 0:
        return _same(node.table, count)
    mean = np.asarray(node.table)[..., None]
    rng = _generator(node, seed)
    # ln Gamma(a) draws through Gamma(a + 1) and a uniform: a prior cell of 0.001 would underflow to 0 otherwise.
    alpha = node.dirichlet.reshape(-1, node.dirichlet.shape[-1], 1)  # (configurations, own levels, 1)
    drawn = np.empty((*alpha.shape[:2], 1 + count))
    drawn[..., :1] = mean.reshape(alpha.shape)
    rows = max(1, AT_ONCE // (alpha.shape[1] * count))
    parts = [slice(start, start + rows) for start in range(0, len(alpha), rows)]
    for part in parts:
        shape = (*alpha[part].shape[:2], count)
        drawn[part, :, 1:] = rng.standard_gamma(np.broadcast_to(alpha[part] + 1.0, shape))
    with np.errstate(divide="ignore"):  # a parameter of 0 is a level that cannot be: its share is 0 in every draw
        for part in parts:
            shape = (*alpha[part].shape[:2], count)
            log_gamma = np.log(drawn[part, :, 1:]) - rng.standard_exponential(shape) / alpha[part]
            log_gamma -= log_gamma.max(axis=-2, keepdims=True)
            shares = np.exp(log_gamma, out=log_gamma)
            shares /= shares.sum(axis=-2, keepdims=True)
            drawn[part, :, 1:] = np.where(alpha[part] > 0.0, np.maximum(shares, SMALLEST), 0.0)
    drawn.flags.writeable = False
    return drawn.reshape(*node.dirichlet.shape, 1 + count)


def drawn_coefficients(node: Number, count: int, seed: int) -> Coefficients:
    """`drawn` of a number: intercept, variance (category parents' levels..., 1 + count), slopes with an axis of number
    parents before the last."""
    if node.regression is None or count == 0:
        return Coefficients(*(_same(array, count) for array in (node.intercept, node.slopes, node.variance)))
    found = node.regression.draws(count, _generator(node, seed))
    means: tuple[tuple[np.ndarray, object], ...] = (
        (found.intercept, node.intercept),
        (found.slopes, node.slopes),
        (found.variance, node.variance),
    )
    for array, mean in means:
        array[..., 0] = np.asarray(mean)
        array.flags.writeable = False
    return found


def _generator(node: Node, seed: int) -> np.random.Generator:
    return np.random.default_rng([seed, zlib.crc32("\x1f".join((node.name, *node.parents)).encode())])


def _same(mean: object, count: int) -> np.ndarray:
    once = np.asarray(mean, dtype=np.float64)[..., None]
    return np.broadcast_to(once, (*once.shape[:-1], 1 + count))
