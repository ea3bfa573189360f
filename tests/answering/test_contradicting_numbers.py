"""Numbers that contradict each other by more than any float holds still tell how likely what was seen is."""

import numpy as np
import pytest

import engine
from engine.network.nodes import Category, Number


def told_apart(apart, also=()):
    """A category of two levels, and two numbers of sd 1 that lie `apart` between the levels, each by itself."""
    nodes = [Category("c", ["low", "high"], (), np.array([0.25, 0.75])), *also]
    for name in ("one", "other"):
        nodes.append(Number(name, ("c",), np.array([0.0, apart]), np.zeros((2, 0)), np.ones(2)))
    return engine.Model.from_network(nodes)


@pytest.mark.parametrize("apart", [3.0, 30.0, 60.0, 1000.0])
def test_two_numbers_that_pull_as_hard_in_opposite_ways_leave_the_category_as_it_was(apart):
    answer = told_apart(apart).ask({"one": 0.0, "other": apart}, watch=["c"], exact=True)
    np.testing.assert_allclose(answer["c"].among.point, [0.25, 0.75], rtol=1e-9)
    np.testing.assert_allclose(answer.log_evidence, -0.5 * apart**2 - np.log(2.0 * np.pi), rtol=1e-12)


def test_what_one_of_them_is_further_away_decides():
    answer = told_apart(60.0).ask({"one": 0.0, "other": 60.0 - 1e-1}, watch=["c"], exact=True)
    odds = 0.25 * np.exp(0.5 * 60.0**2 - 0.5 * (59.9**2 - 0.1**2))
    low = odds / (odds + 0.75)
    np.testing.assert_allclose(answer["c"].among.point, [low, 1.0 - low], rtol=1e-9)


def test_numbers_that_meet_in_one_of_several_categories_do_not_underflow():
    rng = np.random.default_rng(0)
    shape = (2, 3)
    c, d, e = (
        Category("c", ["low", "high"], (), np.array([0.25, 0.75])),
        Category("d", ["a", "b", "c"], ("c",), rng.dirichlet(np.ones(3), 2)),
        Category("e", ["a", "b"], (), np.array([0.5, 0.5])),
    )
    one = Number("one", ("c", "d"), np.array([[0.0] * 3, [60.0] * 3]), np.zeros((*shape, 0)), np.ones(shape))
    other = Number("other", ("e", "c"), np.array([[0.0, 60.0]] * 2), np.zeros((2, 2, 0)), np.ones((2, 2)))
    answer = engine.Model.from_network([c, d, e, one, other]).ask(
        {"one": 0.0, "other": 60.0}, watch=["c", "d"], exact=True
    )
    np.testing.assert_allclose(answer["c"].among.point, [0.25, 0.75], rtol=1e-9)
    np.testing.assert_allclose(answer["d"].among.point, np.array([0.25, 0.75]) @ d.table, rtol=1e-9)
    np.testing.assert_allclose(answer.log_evidence, -1800.0 - np.log(2.0 * np.pi), rtol=1e-12)
