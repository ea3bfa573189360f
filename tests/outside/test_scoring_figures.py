"""How likely rows are, against figures from outside; the source of each stands in number_figures.json."""

import numpy as np
import pandas as pd

import engine
from engine.network.parameters import predictive
from tests.outside.test_number_figures import CASES, figure, fitted, table


def test_rows_of_a_fitted_regression_score_as_its_likelihood():
    """Koenker & Bassett 1982: spending on food given income, by least squares."""
    columns, values = table(CASES["likelihood"]["data"]["engel"])
    means, variance = fitted(values)
    income, food = columns
    nodes = [
        engine.Number(income, [], 0.0, [], 1.0),
        engine.Number(food, [income], means.intercept, means.slopes, variance),
    ]
    frame = pd.DataFrame(values, columns=columns)
    both = engine.Model.from_network(nodes).log_score(frame)
    alone = engine.Model.from_network(nodes[:1]).log_score(frame[[income]])
    assert (both - alone).sum() == figure("likelihood", "engel regression: log-likelihood")


def test_rows_of_a_saturated_table_score_as_the_logistic_fit():
    """Fair 1978: an affair given children and a happy marriage."""
    columns, values = table(CASES["likelihood"]["data"]["fair"])
    counts = np.zeros((2, 2, 2))
    np.add.at(counts, tuple(values.astype(int).T), 1.0)
    parents = [engine.Category(name, ["0", "1"], [], [0.5, 0.5]) for name in columns[:2]]
    child = engine.Category(columns[2], ["0", "1"], columns[:2], predictive(counts))
    frame = pd.DataFrame(values, columns=columns)
    both = engine.Model.from_network([*parents, child]).log_score(frame)
    alone = engine.Model.from_network(parents).log_score(frame[columns[:2]])
    assert (both - alone).sum() == figure("likelihood", "affair given children, happy: log-likelihood")
