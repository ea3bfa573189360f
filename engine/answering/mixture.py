"""The distribution of a number in an answer: a mixture of normals, some of them cut by what another number was in."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Gate:
    """Another number X of each part, kept where low <= X < high: X given the value y ~ N(at + slope y, sd^2).

    slope, at, sd: (parts, draws).  low, high: (parts,).  A number cut itself has slope 1, at 0 and sd 0.
    """

    slope: Floats
    at: Floats
    sd: Floats
    low: Floats
    high: Floats


@dataclass(frozen=True, eq=False)
class Mixture:
    """Parts of a mixture in every draw.

    weight: (parts, draws), each draw sums to 1.  mean, sd: (parts, draws) of the normal before any cut; sd 0 is a
    single value.  gate: what cuts it; None when nothing does.
    """

    weight: Floats
    mean: Floats
    sd: Floats
    gate: Gate | None = None
