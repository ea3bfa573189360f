"""Numbers against figures from outside; the source of each stands in number_figures.json."""

import json
from itertools import combinations
from pathlib import Path

import numpy as np
import pytest

from engine.learning.gaussian import SCATTER, number_scores
from engine.network.conjugate import conjugate
from engine.network.parameters import predictive
from engine.network.regression import regression
from engine.order import Order
from engine.records.counts import rank
from engine.records.moments import ArrayMoments, Numbers
from tests.learning import numbers_plainly, plainly

CASES = json.loads((Path(__file__).parent / "number_figures.json").read_text(encoding="utf-8"))


def figures(case, *, starting=""):
    found = [each for each in CASES[case]["figures"] if each["name"].startswith(starting)]
    assert found, f"{case} has no figure {starting}"
    return found


def figure(case, name):
    (found,) = (each for each in CASES[case]["figures"] if each["name"] == name)
    return found["value"] if found["tolerance"] is None else pytest.approx(found["value"], abs=found["tolerance"])


def table(data):
    """(columns, values) with a row repeated where it has a count."""
    rows = np.asarray(data["rows"], dtype=np.float64)
    if "count" not in data:
        return data["columns"], rows
    return data["columns"][:-1], np.repeat(rows[:, :-1], rows[:, -1].astype(int), axis=0)


def fitted(values):
    """(means of the last column's regression on the others, its residual variance with divisor n)."""
    rows, columns = values.shape
    numbers = Numbers.standardised(range(columns), values)
    made = ArrayMoments(np.zeros((rows, columns)), [2] * columns, numbers)
    sums = made.family((), range(columns - 1), columns - 1)
    means = regression(sums.part(0), (), numbers.centre, numbers.scale).means
    return means, float(means.variance) * (rows - columns) / rows


# A Gaussian network is a set of regressions.


def test_the_regression_of_employment_has_its_certified_coefficients():
    """Longley 1967: six digits survive a badly conditioned table."""
    columns, values = table(CASES["regression"]["data"]["longley"])
    means, variance = fitted(values)
    assert means.intercept == figure("regression", "coefficient of const")
    for column, slope in zip(columns[:-1], means.slopes, strict=True):
        assert slope == figure("regression", f"coefficient of {column}")
    assert np.sqrt(means.variance) == figure("regression", "residual standard deviation, divisor n - p")
    assert variance == figure("regression", "residual variance, divisor n")


def test_spending_on_food_is_regressed_on_income_as_by_least_squares():
    """Koenker & Bassett 1982 (the data); Schwarz 1978 (the criterion)."""
    _, values = table(CASES["likelihood"]["data"]["engel"])
    means, variance = fitted(values)
    rows = len(values)
    assert means.intercept == figure("regression", "engel: intercept of foodexp on income")
    assert means.slopes[0] == figure("regression", "engel: slope")
    assert variance == figure("regression", "engel: residual variance, divisor n")
    assert means.intercept + 1_000 * means.slopes[0] == figure("regression", "engel: mean of foodexp at income 1000")
    log = -0.5 * rows * (np.log(2 * np.pi * variance) + 1)
    assert log == figure("regression", "engel: log-likelihood")
    assert log == figure("likelihood", "engel regression: log-likelihood")
    told = figure("likelihood", "engel regression: -2 logL + 3 log n")
    assert -2 * log + 3 * np.log(rows) == told
    told = figure("likelihood", "engel regression: the library's bic (variance not counted)")
    assert -2 * log + 2 * np.log(rows) == told


def test_shares_of_a_category_have_the_likelihood_of_the_saturated_logistic_fit():
    _, values = table(CASES["likelihood"]["data"]["fair"])
    counts = np.zeros((2, 2, 2))
    np.add.at(counts, tuple(values.astype(int).T), 1.0)
    log = (counts * np.log(predictive(counts))).sum()
    assert log == figure("likelihood", "affair given children, happy: log-likelihood")
    told = figure("likelihood", "affair given children, happy: BIC as -2 logL + 4 log n")
    assert -2 * log + 4 * np.log(len(values)) == told


def test_a_chain_of_regressions_reproduces_the_moments_of_its_columns():
    """Fair 1978: what the chain implies, and conditioning it backwards."""
    columns, values = table(CASES["regression"]["data"]["fair"])
    mean, spread = np.zeros(4), np.zeros((4, 4))
    for place in range(4):
        means, variance = fitted(values[:, : place + 1])
        slopes, intercept = means.slopes, float(means.intercept)
        mean[place] = intercept + slopes @ mean[:place]
        spread[place, :place] = spread[:place, place] = spread[:place, :place] @ slopes
        spread[place, place] = variance + slopes @ spread[:place, :place] @ slopes
    for column, implied in zip(columns, np.sqrt(np.diag(spread)), strict=True):
        assert implied == figure("regression", f"fair: sd of {column} implied by the chain of regressions")
    back = np.linalg.solve(spread[1:, 1:], spread[1:, 0])
    given = mean[0] + back @ (np.asarray([9.0, 1.0, 3.0]) - mean[1:])
    assert given == figure("regression", "fair: mean of age given the three others")
    left = np.sqrt(spread[0, 0] - back @ spread[1:, 0])
    assert left == figure("regression", "fair: sd of age given the three others")


# The marginal likelihood of a regression (O'Hagan & Forster 2004).


@pytest.mark.parametrize("told", figures("regression-evidence"), ids=lambda told: told["name"])
def test_a_regression_has_the_evidence_of_the_closed_form(told):
    _, values = table(CASES["regression-evidence"]["data"])
    which, _, prior = told["name"].partition("; ")
    weight, shape, rate = (float(each.partition(" = ")[2]) for each in prior.split(", "))
    terms = {"intercept": 1, "intercept and first": 2, "all three": 3}[which]
    row = np.column_stack([np.ones(len(values)), values[:, : terms - 1], values[:, 2]])
    found = conjugate((row.T @ row)[None], np.zeros((1, terms)), weight * np.eye(terms), shape, rate)
    assert found.evidence[0] == pytest.approx(told["value"], abs=told["tolerance"])


# The marginal likelihood of Gaussian networks (Geiger & Heckerman 2002; Kuipers, Moffa & Heckerman 2014).


@pytest.fixture(scope="module")
def three():
    """A family's score among x, y, z, taken as they stand."""
    names, values = table(CASES["gaussian-evidence"]["data"])
    made = ArrayMoments(np.zeros(values.shape), [2] * 3, numbers_plainly.as_given(range(3), values))
    found = number_scores(made, 3)

    def score(child, parents):
        both = sorted((*parents, child))
        return found.by_size[len(both)][0, rank(both)] - found.by_size[len(parents)][0, rank(sorted(parents))]

    return names, score


def test_the_prior_scatter_is_the_published_one():
    assert figure("gaussian-evidence", "t") == SCATTER


@pytest.mark.parametrize("told", figures("gaussian-evidence", starting="local score"), ids=lambda told: told["name"])
def test_a_family_of_numbers_scores_as_published(three, told):
    names, score = three
    child, _, parents = told["name"].partition("local score of ")[2].partition(" given ")
    places = [names.index(name.strip("' ")) for name in parents.strip("[]").split(",") if name]
    assert score(names.index(child), places) == pytest.approx(told["value"], abs=told["tolerance"])


def test_networks_of_numbers_score_as_published_and_equivalent_ones_the_same(three):
    names, score = three

    def total(graph):
        return sum(score(child, parents) for child, parents in enumerate(graph))

    assert total([(), (0,), (0, 1)]) == figure("gaussian-evidence", "complete network")
    for graph in ([(), (0,), (1,)], [(1,), (), (1,)], [(1,), (2,), ()]):
        assert total(graph) == figure("gaussian-evidence", "chain x -> y -> z")
    every = list(plainly.graphs(Order([("All", names)]), 2))
    assert len(every) == 25
    assert len({total(graph) for graph in every}) == figure(
        "gaussian-evidence", "distinct scores among the 25 networks"
    )
    best = max(every, key=total)
    told = {(names.index(a), names.index(b)) for a, b in figure("gaussian-evidence", "links of a best network")}
    skeleton = {frozenset((parent, child)) for child, parents in enumerate(best) for parent in parents}
    assert skeleton == {frozenset(link) for link in told}
    assert not any(
        frozenset(pair) not in skeleton for parents in best for pair in combinations(parents, 2)
    )  # nor has the published one two parents that are not linked
