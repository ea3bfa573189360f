"""Models of numbers and categories against what general-purpose libraries tell of the same fits (scikit-learn).

The records are Fisher's irises (Fisher 1936, The use of multiple measurements in taxonomic problems, Annals of
Eugenics 7), which come with the library.
"""

import math

import numpy as np
import pandas as pd
import pytest
from sklearn.datasets import load_iris
from sklearn.discriminant_analysis import LinearDiscriminantAnalysis, QuadraticDiscriminantAnalysis
from sklearn.linear_model import LinearRegression
from sklearn.mixture import GaussianMixture
from sklearn.naive_bayes import GaussianNB

import engine

MEASURES = ["sepal length", "sepal width", "petal length", "petal width"]
SPECIES = ["setosa", "versicolor", "virginica"]


@pytest.fixture(scope="module")
def irises():
    """(measures, species as positions)"""
    data, target = load_iris(return_X_y=True)
    return pd.DataFrame(data, columns=MEASURES), target


def chain(means, covariances, within=()):
    """Numbers, each given all before it: (classes, 4) means and (classes, 4, 4) covariances as regressions."""
    nodes = []
    for place, measure in enumerate(MEASURES):
        before = covariances[:, :place, :place]
        slopes = np.linalg.solve(before, covariances[:, :place, place, None])[..., 0]
        intercept = means[:, place] - (slopes * means[:, :place]).sum(axis=1)
        variance = covariances[:, place, place] - (slopes * covariances[:, :place, place]).sum(axis=1)
        if not within:
            intercept, slopes, variance = intercept[0], slopes[0], variance[0]
        nodes.append(engine.Number(measure, [*within, *MEASURES[:place]], intercept, slopes, variance))
    return nodes


def by_species(target, means, covariances):
    shares = np.bincount(target) / len(target)
    return engine.Model.from_network(
        [engine.Category("species", SPECIES, [], shares), *chain(means, covariances, ["species"])]
    )


def means_of(measures, target):
    return np.array([measures[target == each].mean().to_numpy() for each in range(len(SPECIES))])


def covariances_of(measures, target):
    return np.array([np.cov(measures[target == each].T, ddof=0) for each in range(len(SPECIES))])


def assert_tells(model, measures, shares):
    """All rows at once, and a few asked one by one."""
    told = model.predict(measures, "species")
    assert list(told.columns) == SPECIES
    assert told.to_numpy() == pytest.approx(shares, abs=1e-9)
    for row in (0, 70, 106, 133):
        among = model.ask(dict(measures.iloc[row]), watch=["species"], exact=True)["species"].among
        assert among.point == pytest.approx(shares[row], abs=1e-9)


def test_numbers_that_differ_by_a_category_tell_it_as_quadratic_discriminants_do(irises):
    measures, target = irises
    machine = QuadraticDiscriminantAnalysis(store_covariance=True).fit(measures, target)
    model = by_species(target, means_of(measures, target), np.array(machine.covariance_))
    assert_tells(model, measures, machine.predict_proba(measures))


def test_numbers_with_the_same_slopes_tell_a_category_as_linear_discriminants_do(irises):
    measures, target = irises
    pooled = np.average(covariances_of(measures, target), axis=0, weights=np.bincount(target))
    model = by_species(target, means_of(measures, target), np.stack([pooled] * len(SPECIES)))
    machine = LinearDiscriminantAnalysis(solver="lsqr").fit(measures, target)
    assert_tells(model, measures, machine.predict_proba(measures))


def test_numbers_apart_from_each_other_tell_a_category_as_naive_bayes_does(irises):
    measures, target = irises
    each = covariances_of(measures, target)
    model = by_species(target, means_of(measures, target), each * np.eye(len(MEASURES)))
    assert_tells(model, measures, GaussianNB(var_smoothing=0.0).fit(measures, target).predict_proba(measures))


def test_numbers_summed_over_a_category_are_the_mixture_of_normals(irises):
    measures, target = irises
    means, covariances = means_of(measures, target), covariances_of(measures, target)
    model = by_species(target, means, covariances)
    mixture = GaussianMixture(len(SPECIES), covariance_type="full")
    mixture.weights_, mixture.means_ = np.bincount(target) / len(target), means
    mixture.covariances_ = covariances
    mixture.precisions_cholesky_ = np.array([np.linalg.cholesky(np.linalg.inv(each)) for each in covariances])
    logs = mixture.score_samples(measures.to_numpy())
    for row in (0, 70, 106, 133):
        answer = model.ask(dict(measures.iloc[row]), watch=["species"], exact=True)
        assert answer.log_evidence == pytest.approx(logs[row], abs=1e-9)

    one = GaussianMixture(len(SPECIES), covariance_type="spherical")
    one.weights_, one.means_ = mixture.weights_, means[:, 2:3]
    one.covariances_ = covariances[:, 2, 2]
    one.precisions_cholesky_ = 1.0 / np.sqrt(one.covariances_)
    grid = np.linspace(0.5, 8.0, 40)
    recorded = model.ask(watch=["petal length"])["petal length"].recorded
    assert recorded.density(grid) == pytest.approx(np.exp(one.score_samples(grid[:, None])), abs=1e-9)


@pytest.mark.parametrize("child", MEASURES)
def test_any_number_of_a_chain_is_told_from_the_others_as_by_its_own_regression(irises, child):
    """Whichever way the links run: the chain has all second moments."""
    measures, _ = irises
    moments = measures.mean().to_numpy()[None], np.cov(measures.T, ddof=0)[None]
    told = engine.Model.from_network(chain(*moments)).predict(measures.drop(columns=child), child)
    others = measures.drop(columns=child)
    line = LinearRegression().fit(others, measures[child])
    away = measures[child] - line.predict(others)
    assert told["mean"].to_numpy() == pytest.approx(line.predict(others), abs=1e-9)
    assert told["sd"].to_numpy() == pytest.approx(math.sqrt((away**2).mean()), abs=1e-9)
