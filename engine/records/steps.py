"""What a number was recorded to: whole minutes, tenths of a degree, or finely."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

FINE = 1e-4  # of the standard deviation: a smaller step changes no score of fewer than 10^8 records
_TRIES = 40  # each shortens the step at least by half


def recording_step(values: NDArray[np.float64], still: Callable[[], None] = lambda: None) -> float:
    """The largest step of which all differences between `values` are multiples, in their own unit; 0.0 below FINE.

    values: (rows,) finite. Euclid's algorithm on all differences to the smallest value at once, so that the step
    changes with the unit and not with the origin.  still: called often, a chance to cancel.
    """
    distinct = np.unique(values)
    spread = float(values.std())
    if distinct.size < 2 or spread == 0.0:
        return 0.0
    rises = distinct[1:] - distinct[0]
    exact = 4.0 * float(np.spacing(np.abs(distinct).max()))  # how far a difference may be off
    step, off = float(np.diff(distinct).min()), exact
    for _ in range(_TRIES):
        still()
        if step < FINE * spread:
            return 0.0
        times = np.rint(rises / step)
        rest = np.abs(rises - times * step)
        tolerated = exact + times * off
        if tolerated[-1] > 0.1 * step:
            return 0.0  # too fine to be told from rounding in floats
        left = np.flatnonzero(rest > tolerated)
        if left.size == 0:
            return float(rises[-1] / times[-1])
        least = int(left[rest[left].argmin()])
        step, off = float(rest[least]), float(tolerated[least])
    return 0.0
