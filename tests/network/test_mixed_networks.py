"""A network of categories and numbers: what is checked, and draws of its parameters."""

import numpy as np
import pytest

import engine
from engine.network.drawn import drawn
from engine.network.network import network
from engine.network.regression import regression
from engine.refusal import Refusal

RAIN = engine.Category("rain", ["no", "yes"], [], [0.8, 0.2])
FLOW = engine.Number("flow", ["rain"], [1.0, 5.0], [[], []], [1.0, 2.0], bands=[2.0, 4.0])
WET = engine.Category(
    "wet", ["no", "yes"], ["rain", "flow"], [[[0.9, 0.1], [0.8, 0.2], [0.5, 0.5]], [[0.4, 0.6], [0.3, 0.7], [0.2, 0.8]]]
)
DEPTH = engine.Number("depth", ["flow", "rain"], [0.5, 1.0], [[2.0], [3.0]], [1.0, 0.0])


def refused(nodes, message):
    with pytest.raises(Refusal, match=message) as refusal:
        network(nodes)
    assert refusal.value.message.endswith(".") and refusal.value.where and refusal.value.do


def test_categories_and_numbers_stand_together_parents_first():
    found = engine.Model.from_network([WET, DEPTH, FLOW, RAIN]).network
    assert found.names == ("rain", "flow", "wet", "depth") and found.numbers == ("flow", "depth")
    assert found.links == (("rain", "flow"), ("rain", "wet"), ("flow", "wet"), ("flow", "depth"), ("rain", "depth"))
    assert found.descendants(["rain"]) == {"flow", "wet", "depth"} and found.descendants(["depth"]) == frozenset()
    assert found.category_parents("depth") == ("rain",) and found.number_parents("depth") == ("flow",)
    assert not found.drawable


@pytest.mark.parametrize(
    ("changed", "message"),
    [
        ({"intercept": [0.5]}, "intercept of “depth” has the shape .1,.; its parents ask for .2,."),
        ({"intercept": [[0.5, 1.0]]}, "intercept of “depth” has the shape"),
        ({"slopes": [2.0, 3.0]}, "slopes of “depth” have the shape .2,.; its parents ask for .2, 1."),
        ({"slopes": []}, "slopes of “depth” have the shape .2, 0."),
        ({"variance": 1.0}, "variance of “depth” has the shape"),
        ({"variance": [1.0, -1e-9]}, "variance of “depth” is below 0"),
        ({"variance": [1.0, np.inf]}, "variance of “depth” holds an entry that is no finite number"),
        ({"intercept": [np.nan, 0.0]}, "intercept of “depth” holds an entry that is no finite number"),
        ({"slopes": [[np.inf], [0.0]]}, "slopes of “depth” hold an entry that is no finite number"),
        ({"parents": ["flow", "snow"]}, "parent “snow”, which is no column"),
    ],
)
def test_parameters_that_do_not_fit_a_number_are_refused(changed, message):
    asked = {"parents": ["flow", "rain"], "intercept": [0.5, 1.0], "slopes": [[2.0], [3.0]], "variance": [1.0, 0.0]}
    refused([RAIN, FLOW, engine.Number("depth", **(asked | changed))], message)


def test_a_number_without_bands_cannot_lead_to_a_category():
    uncut = engine.Number("flow", ["rain"], [1.0, 5.0], [[], []], [1.0, 2.0])
    refused([RAIN, uncut, WET], "“flow” leads to the category “wet” and has no bands")
    assert network([RAIN, uncut, DEPTH]).names == ("rain", "flow", "depth")


def test_a_table_has_an_entry_for_each_band_of_a_number():
    four = engine.Number("flow", ["rain"], [1.0, 5.0], [[], []], [1.0, 2.0], bands=[2.0, 4.0, 6.0])
    refused([RAIN, four, WET], "table of “wet” has the shape .2, 3, 2.; its parents and levels ask for .2, 4, 2.")


def learned(seed=0, rows=200):
    """A number learned from records under one category of two levels and one number."""
    rng = np.random.default_rng(seed)
    site, hours = rng.integers(2, size=rows), rng.normal(size=rows)
    score = site + 0.5 * hours + rng.normal(size=rows)
    products = np.zeros((2, 3, 3))
    for at, row in zip(site, np.column_stack([np.ones(rows), hours, score]), strict=True):
        products[at] += np.outer(row, row)
    posterior = regression(products, (2,), np.array([30.0, 50.0]), np.array([5.0, 10.0]))
    mean = posterior.means
    return engine.Number("score", ["site", "hours"], mean.intercept, mean.slopes, mean.variance, regression=posterior)


SITE = engine.Category("site", ["north", "south"], [], [0.5, 0.5])
WORKED = engine.Number("hours", [], 30.0, [], 25.0)


def test_coefficients_are_drawn_around_the_posterior_mean_and_repeat_with_the_seed():
    node = learned()
    net = network([SITE, WORKED, node])
    assert net.drawable
    found = net.draws(4000, seed=3)[2]
    assert found.intercept.shape == found.variance.shape == (2, 4001) and found.slopes.shape == (2, 1, 4001)
    for array, mean in (
        (found.intercept, node.intercept),
        (found.slopes, node.slopes),
        (found.variance, node.variance),
    ):
        np.testing.assert_array_equal(array[..., 0], mean)
        spread = array[..., 1:].std(axis=-1)
        assert np.all(spread > 0.0)
        assert np.all(np.abs(array[..., 1:].mean(axis=-1) - mean) < 5.0 * spread / np.sqrt(4000))
        with pytest.raises(ValueError, match="read-only"):
            array[..., 0] = 0.0
    np.testing.assert_array_equal(found.slopes, drawn(node, 4000, 3).slopes)  # by itself as in a network
    assert not np.array_equal(found.slopes, drawn(node, 4000, 4).slopes)
    np.testing.assert_array_equal(drawn(node, 0, 3).slopes[..., 0], node.slopes)


def test_a_number_known_exactly_is_the_same_in_every_draw_and_takes_no_room():
    found = drawn(DEPTH, 200, 0)
    assert found.intercept.shape == found.variance.shape == (2, 201) and found.slopes.shape == (2, 1, 201)
    assert np.all(found.slopes == np.array([[[2.0]], [[3.0]]]))
    assert found.slopes.strides[-1] == found.intercept.strides[-1] == found.variance.strides[-1] == 0


def test_a_posterior_that_does_not_fit_the_parents_is_refused():
    node = learned()
    wrong = engine.Number("score", ["hours"], 0.0, [1.0], 1.0, regression=node.regression)
    with pytest.raises(Refusal, match="regression of “score” does not fit"):
        network([WORKED, wrong])
