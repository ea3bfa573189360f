"""The table of a column given its parents: its rows, and its intervals against draws."""

import numpy as np
import pytest

from engine.network.conditional import rows
from engine.network.network import Category, network

DIRICHLET = np.array([[3.0, 1.0, 0.0], [40.0, 10.0, 50.0], [0.2, 0.3, 0.5]])
NET = network(
    [
        Category("shift", ["days", "nights", "mixed"], [], [0.5, 0.3, 0.2]),
        Category(
            "mark", ["low", "middle", "high"], ["shift"], DIRICHLET / DIRICHLET.sum(axis=1, keepdims=True), DIRICHLET
        ),
    ]
)
COMMON = np.array([0.5, 0.3, 0.2])


def test_intervals_hold_nine_of_ten_draws_with_a_twentieth_on_each_side():
    draws = NET.draws(40_000, seed=3)[1][..., 1:]
    for place, row in enumerate(rows(NET, "mark", COMMON, 24)):
        for level in range(3):
            if DIRICHLET[place, level] == 0.0:
                continue
            # Standard error of a share of 40,000 draws at .05: .0011
            assert (draws[place, level] < row.low[level]).mean() == pytest.approx(0.05, abs=0.006)
            assert (draws[place, level] > row.high[level]).mean() == pytest.approx(0.05, abs=0.006)


def test_what_cannot_be_has_no_interval_and_a_known_table_has_points():
    first = rows(NET, "mark", COMMON, 24)[0]
    assert first.shares[2] == first.low[2] == first.high[2] == 0.0
    (only,) = rows(NET, "shift", np.ones(()), 24)
    np.testing.assert_array_equal(only.low, only.high)
    assert only.given == () and only.weight == 1.0
    sure = network([Category("a", ["x"], [], [1.0], np.array([5.0]))])
    (row,) = rows(sure, "a", np.ones(()), 24)
    assert row.low[0] == row.high[0] == 1.0


def test_only_the_commonest_rows_are_given_in_the_order_of_their_levels():
    assert [row.given for row in rows(NET, "mark", COMMON, 2)] == [("days",), ("nights",)]
    assert [row.given for row in rows(NET, "mark", COMMON[::-1], 2)] == [("nights",), ("mixed",)]
    assert [row.weight for row in rows(NET, "mark", COMMON, 3)] == [0.5, 0.3, 0.2]
