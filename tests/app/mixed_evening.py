"""An evening school with numbers, and a model of it, for the tests of Ask about numbers."""

from __future__ import annotations

import numpy as np
import pandas as pd

from app.store import Plan
from engine import MORE


def mixed_evening(rows: int = 500, seed: int = 5) -> pd.DataFrame:
    """Invented learners. A mentor gives hours, hours raise the mark, and a mark is needed to pass."""
    rng = np.random.default_rng(seed)
    shift = rng.choice(["days", "nights", "mixed"], rows, p=[0.5, 0.3, 0.2])
    travel = np.round(rng.normal(30.0, 8.0, rows), 1)
    mentor = np.where(rng.random(rows) < np.where(shift == "nights", 0.6, 0.3), "yes", "no")
    hours = np.round(np.where(mentor == "yes", 11.0, 5.0) + rng.normal(0.0, 2.0, rows), 1)
    mark = np.round(35.0 + 2.0 * hours - 0.3 * travel + rng.normal(0.0, 5.0, rows), 1)
    passed = np.where(rng.random(rows) < 1 / (1 + np.exp(-(mark - 42.0) / 4)), "yes", "no")
    names = ["shift work", "travel time", "mentor", "mentor hours", "mark", "passed"]
    return pd.DataFrame(dict(zip(names, [shift, travel, mentor, hours, mark, passed], strict=True)))


MIXED_PLAN = Plan(
    stages=(
        ("Before", ("shift work", "travel time")),
        ("Offered", ("mentor",)),
        ("During", ("mentor hours",)),
        ("After", ("mark",)),
        ("Later", ("passed",)),
    ),
    insist=(("mentor", "mentor hours"), ("mentor hours", "mark"), ("mark", "passed")),
    changeable=("mentor", "mentor hours"),
    outcomes={"mark": MORE, "passed": ("yes",)},
)
