"""Normals cut far out in the tails, where sizes come near the largest float: no warning, and no made-up digit."""

import numpy as np
import pytest

from engine.answering.bivariate import Rectangle
from engine.answering.normal import log_between, moments_between, standardised

FAR = np.array([-1e308, -1e200, -5.0, 0.0, 5e-324, 1e-300, 1e200, 1e308, np.inf, -np.inf])
LOW, HIGH = (side.ravel() for side in np.meshgrid(FAR, FAR))


def test_one_interval_far_out_is_told_without_warnings():
    start, end = standardised(LOW, HIGH, np.zeros(1), np.full(1, 1e-200))
    for low, high in ((start, end), (LOW, HIGH)):
        found = log_between(low, high)
        assert np.all(found <= 0.0)
        assert np.all(np.isneginf(found[high <= low]))
        mean, variance = moments_between(low, high)
        assert np.all((variance >= 0.0) & (variance <= 1.0 + 1e-12))
        assert not np.any(np.isnan(mean))


@pytest.mark.parametrize("lean", [1e-320, 1e-200, 1e-9, 0.5])
def test_two_numbers_that_hardly_lean_on_each_other_are_cut_each_by_itself(lean):
    ends = np.array([-1e200, -3.0, 0.0, 2.0, 1e200])
    low, high = (side.ravel() for side in np.meshgrid(ends, ends))
    some = low < high
    low, high = low[some], high[some]
    leans = np.full(low.shape, lean)
    found = Rectangle(low, high, low, high, leans, np.sqrt(1.0 - leans**2)).log_mass()
    assert not np.any(np.isnan(found))
    if lean < 1e-8:
        np.testing.assert_allclose(found, 2.0 * log_between(low, high), rtol=1e-8, atol=1e-12)
