"""A world of a network with numbers, and what reading it gives, by whichever route."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from engine.answering.mixture import Mixture
from engine.network.nodes import Node
from engine.network.regression import Coefficients

Drawn = Mapping[str, np.ndarray | Coefficients]  # column -> its table or coefficients, the draws on the last axis


@dataclass(frozen=True, eq=False)
class MixedWorld:
    """The columns of one world, every lever split into the natural column and its set copy, and what was seen.

    nodes: parents before children. A set copy is a node of its own, after the natural column.
    pins: category, or a number through its bands -> positions of the levels or bands it is in.
    values: number -> the value it has.  ranges: number -> (low, high), low <= x < high, either end may be infinite.
    A number is in one of the three at most.
    watch: names of the nodes to read.
    """

    nodes: tuple[Node, ...]
    pins: Mapping[str, frozenset[int]]
    values: Mapping[str, float]
    ranges: Mapping[str, tuple[float, float]]
    watch: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class MixedRead:
    """What a route made of a world.

    log_evidence: (draws,) natural log of the probability of what was seen, a density where a number has a value; -inf
    where it cannot be.
    shares: name -> (levels or bands, draws), each draw sums to 1.  numbers: name -> the distribution of a number.
    error: name -> Monte Carlo standard error of the point answer, the largest of its shares, and for a number in units
    of its own standard deviation; empty when exact.  effective: effective number of particles, infinite when exact.
    """

    log_evidence: np.ndarray
    shares: Mapping[str, np.ndarray]
    numbers: Mapping[str, Mixture]
    error: Mapping[str, float] = field(default_factory=dict)
    effective: float = np.inf
