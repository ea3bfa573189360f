"""Generated records of many columns in stages, for measuring."""

import numpy as np

from engine.order import Order
from engine.records.table import Coded
from tests.learning.plainly import coded_columns


def staged_records(columns: int, rows: int, stages: int, seed: int = 0) -> tuple[Coded, Order]:
    """Columns of 2 to 5 levels, each led to by up to two earlier ones, spread evenly over the stages."""
    rng = np.random.default_rng(seed)
    levels = rng.integers(2, 6, columns)
    codes = np.empty((rows, columns), dtype=np.int64)
    for place in range(columns):
        codes[:, place] = np.minimum(rng.geometric(0.45, rows) - 1, levels[place] - 1)
        for parent in rng.choice(place, min(place, int(rng.integers(0, 3))), replace=False):
            copied = rng.random(rows) < 0.35
            codes[copied, place] = codes[copied, parent] % levels[place]
    names = tuple(f"column {place}" for place in range(columns))
    lanes = np.array_split(np.arange(columns), stages)
    order = Order([(f"stage {place}", [names[column] for column in lane]) for place, lane in enumerate(lanes)])
    return coded_columns(names, levels.tolist(), codes), order
