"""What the records say of a lever with no assumption at all."""

from __future__ import annotations

import numpy as np


def no_assumption_bounds(joint: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(lever levels, outcome levels, draws) twice: the least and the most that each share can be when each is set.

    joint: (lever levels, outcome levels, draws) shares of those asked about, in all 1; several levers, or outcome
    levels that count alike, as one axis.
    Those who had the level show what it does for them; the others could all come to an outcome, or none (Manski 1990).
    """
    others = 1.0 - joint.sum(axis=1, keepdims=True)
    return joint.copy(), joint + np.maximum(others, 0.0)


def reached(bound: np.ndarray, among: np.ndarray, reach: float) -> np.ndarray:
    """A bound for a lever that takes for a share of them only, whoever they are; the others stay as they are.

    bound, among: (outcome levels, draws).
    """
    return reach * bound + (1.0 - reach) * among
