"""Generated records of a school whose truth is known, for judging."""

import numpy as np
import pandas as pd

import engine

STAGES = [("Before", ["shift", "distance"]), ("Offer", ["mentor"]), ("After", ["passed"])]


def school(rows, seed, interaction=False, order=None):
    """A table and an order.  interaction: the mentor helps by day and harms by night, so that on average it does
    nothing; else it helps everywhere alike."""
    rng = np.random.default_rng(seed)
    night = rng.random(rows) < 0.5
    far = rng.random(rows) < 0.4
    mentor = rng.random(rows) < 0.5
    helped = np.where(night, -1.2, 1.2) * mentor if interaction else 1.2 * mentor
    passed = rng.random(rows) < 1.0 / (
        1.0 + np.exp(-(0.2 - 0.9 * far + helped - (0.0 if interaction else 0.8 * night)))
    )
    frame = pd.DataFrame(
        {
            "shift": np.where(night, "night", "day"),
            "distance": np.where(far, "far", "near"),
            "mentor": np.where(mentor, "yes", "no"),
            "passed": np.where(passed, "yes", "no"),
        }
    )
    made = engine.Order(STAGES, changeable=["mentor"], outcomes={"passed": "yes"}, **(order or {}))
    return engine.Table.from_frame(frame), made
