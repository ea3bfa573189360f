"""The interval of a counted share."""

from __future__ import annotations

import math

from scipy.special import ndtri


def wilson(held: float, rows: float, coverage: float = 0.90) -> tuple[float, float]:
    """The score interval of a share counted as `held` of `rows` (Wilson 1927); 0 to 1 without rows."""
    if rows <= 0.0:
        return 0.0, 1.0
    z = float(ndtri(0.5 + 0.5 * coverage))
    share = held / rows
    middle = (share + z * z / (2.0 * rows)) / (1.0 + z * z / rows)
    half = z / (1.0 + z * z / rows) * math.sqrt(share * (1.0 - share) / rows + z * z / (4.0 * rows * rows))
    low = 0.0 if held <= 0.0 else max(0.0, middle - half)
    high = 1.0 if held >= rows else min(1.0, middle + half)
    return low, high
